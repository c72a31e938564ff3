package result

import (
	"math"
	"slices"

	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/sampler"
)

// derivedNames lists the derived quantities that a space has.
func derivedNames(s *likelihood.Space) []string {
	names := []string{"Ok", "q0"}
	if s.Family().Flat {
		names = []string{"OL", "q0"}
	}
	free := func(n string) bool {
		return slices.ContainsFunc(s.Free(), func(p likelihood.Parameter) bool { return p.Name == n })
	}
	if s.KnowsHRd() && !free("hrd") {
		names = append(names, "hrd")
	}
	if free("ob") {
		names = append(names, "rd")
	}
	if s.KnowsH0() {
		names = append(names, "age")
	}
	return append(names, "H0t0")
}

// value computes a derived quantity; age needs AgeToday, handed in because it is
// the costly part.
func value(name string, p *likelihood.Point, age float64) float64 {
	u := p.Universe
	switch name {
	case "Ok":
		return u.Ok()
	case "OL":
		return u.OL
	case "q0":
		return u.Q0()
	case "hrd":
		return p.HRd
	case "rd":
		return p.HRd * 100 / u.H0
	case "age":
		return age
	}
	return age / u.HubbleTime()
}

// derivation is the derived draws of a chain: the named quantities and the labels.
type derivation struct {
	names  []string
	draws  []sampler.Draws
	view   sampler.View
	codes  sampler.Draws // outlook.Label.Code
	family likelihood.Family
}

func derive(space *likelihood.Space, view sampler.View, threads int) derivation {
	d := derivation{names: derivedNames(space), view: view, family: space.Family()}
	n := len(d.names)
	all := view.MapAll(n+1, threads, func() func(x, y []float64) {
		var p likelihood.Point
		return func(x, y []float64) {
			space.Point(x, &p)
			age := p.Universe.AgeToday()
			for i, name := range d.names {
				y[i] = value(name, &p, age)
			}
			y[n] = outlook.LabelOf(p.Universe).Code()
		}
	})
	d.draws, d.codes = all[:n], all[n]
	return d
}

// belief is the chain as far as labels go; ess is the effective sample size of the
// parameters.
func (d derivation) belief(ess float64) *outlook.Drawn {
	return &outlook.Drawn{View: d.view, Codes: d.codes, ESS: ess}
}

// thinForDerived keeps steps a third of the shortest autocorrelation time apart: what
// lies between costs as much and would take 2% off the errors (an AR(1) series).
func thinForDerived(v sampler.View, c sampler.Check) sampler.View {
	shortest := math.Inf(1)
	for _, p := range c.Parameters {
		shortest = math.Min(shortest, p.Tau)
	}
	k := int(shortest / 3 / float64(v.Spacing()))
	return v.Thin(max(k, 1))
}
