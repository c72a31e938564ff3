package result

import (
	"fmt"
	"math"
	"slices"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/model"
	"omen/sampler"
)

// Sample is a posterior sample that someone else made, in the order of its file.
type Sample struct {
	Title     string
	Version   string
	Names     []string // the parameters that it has, in the order of likelihood.Names
	Curved    bool     // OL is not what makes space flat
	Universes []model.Universe
	Weights   []float64 // nil for equal ones
	KnowsH0   bool      // H0 is that of the universes, not a stand-in
	Inputs    []InputFile
	Notes     []string // what was taken for granted
	Warnings  []string // doubts about the file
}

// OfSample makes the summary of a sample: constraints, fates and times. Rows that follow
// each other are taken for correlated as far as they are.
func OfSample(p Sample) *Summary {
	s := &Summary{Schema: Schema, Title: p.Title, Version: p.Version, Complete: true, Inputs: p.Inputs}
	s.Engine.Name = "sample"
	p.Weights = scaled(p.Weights)
	s.Warnings = append(s.Warnings, p.Warnings...)
	f := p.family()
	least := math.Inf(1)
	for _, name := range p.Names {
		q := quantity(name, sampler.Summarize(p.draws(func(u model.Universe) float64 { return parameter(name, u) })))
		if ess := float64(q.ESS); ess < least { // NaN of a parameter that is the same in all rows
			least = ess
		}
		s.Parameters = append(s.Parameters, q)
	}
	if math.IsInf(least, 1) {
		least = math.NaN()
	}
	for _, name := range p.derivedNames(f) {
		d := p.draws(func(u model.Universe) float64 { return ofUniverse(name, u) })
		s.Derived = append(s.Derived, quantity(name, sampler.Summarize(defined(d))))
	}
	codes := p.draws(func(u model.Universe) float64 { return outlook.LabelOf(u).Code() })
	s.Fates, s.FatesHeldW, s.Today = tables(outlook.Drawn{Codes: codes, ESS: least}, f)
	for _, e := range outlook.Events(f.DarkEnergy == likelihood.W0Wa) {
		s.add(drawnTime(newTime(e, p.KnowsH0), p.draws(func(u model.Universe) float64 { return e.At(u, p.KnowsH0) })))
	}
	s.Assumptions = append(p.Notes, p.words()...)
	switch {
	case math.IsNaN(least):
		s.Warnings = append(s.Warnings, "no parameter varies along the sample: nothing can be said of errors; look at what its columns were taken for")
	case least < fewestForSample:
		s.Warnings = append(s.Warnings, fmt.Sprintf("the sample is worth %.0f independent draws: intervals and small probabilities are rough below %d; ask its authors for more rows", math.Floor(least), fewestForSample))
	}
	return s
}

// fewestForSample is the effective number of draws below which tails are noise: 400
// (Vehtari et al. 2021, Bayesian Analysis 16, 667, from memory).
const fewestForSample = 400

// draws is a quantity along the sample.
func (p *Sample) draws(of func(model.Universe) float64) sampler.Draws {
	x := make([]float64, len(p.Universes))
	for i, u := range p.Universes {
		x[i] = of(u)
	}
	d := sampler.NewDraws(1, x)
	if p.Weights != nil {
		d = d.Weighted(sampler.NewDraws(1, p.Weights))
	}
	return d
}

// defined leaves out the draws that are NaN.
func defined(d sampler.Draws) sampler.Draws {
	return d.Weighted(d.Map(func(x float64) float64 { return indicator(!math.IsNaN(x)) }))
}

// scaled divides weights by the largest: their sum, and that of their squares, stay finite.
func scaled(weights []float64) []float64 {
	if weights == nil {
		return nil
	}
	largest := slices.Max(weights)
	out := make([]float64, len(weights))
	for i, w := range weights {
		out[i] = w / largest
	}
	return out
}

// family is the smallest that has all the universes.
func (p *Sample) family() likelihood.Family {
	f := likelihood.Family{Flat: !p.Curved}
	for _, u := range p.Universes {
		switch {
		case u.Wa != 0:
			f.DarkEnergy = likelihood.W0Wa
		case u.W0 != -1:
			f.DarkEnergy = max(f.DarkEnergy, likelihood.W)
		}
	}
	return f
}

func (p *Sample) derivedNames(f likelihood.Family) []string {
	names := []string{"Ok", "q0"}
	if f.Flat {
		names[0] = "OL"
	}
	if p.KnowsH0 {
		names = append(names, "age")
	}
	return append(names, "H0t0")
}

func parameter(name string, u model.Universe) float64 {
	return map[string]float64{"Om": u.Om, "OL": u.OL, "H0": u.H0, "w0": u.W0, "wa": u.Wa}[name]
}

// words says what the sample was taken for.
func (p *Sample) words() []string {
	rows := digits.Count(len(p.Universes), "row") + " in the order of the file, whose correlation from row to row is estimated and allowed for"
	out := []string{rows}
	if p.Weights != nil {
		var sum, squares float64
		for _, w := range p.Weights {
			sum, squares = sum+w, squares+w*w
		}
		out = append(out, fmt.Sprintf("the weights are worth %.0f rows of equal weight (Kish), the correlation apart", sum*sum/squares))
	}
	f := p.family()
	if f.Flat {
		out = append(out, geometryWords(f))
	}
	return append(out, energyWords(f))
}
