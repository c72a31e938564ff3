package draft

import (
	"bytes"
	"fmt"
	"math"
	"strconv"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

// Numbers writes numbers.tex: a macro for every number. Their names begin with
// omen, or with what the document gives as \omenprefix, so that the numbers of
// several runs can stand in one text.
func Numbers(r *gather.Run) []byte {
	m := &macros{}
	heading(&m.Buffer, r, "One macro for every number. In the preamble: \\input{numbers}",
		"Several runs in one text: \\def\\omenprefix{flat}\\input{flat/numbers} makes \\flatOm and so on.",
		"They work in text and in math mode. A quantity is mean and standard deviation, or",
		"median with errors to the central 68% interval where these differ; a time has a median.")
	m.WriteString("\\providecommand{\\omenprefix}{omen}\n")
	m.WriteString("\\providecommand{\\omendefine}[2]{\\expandafter\\newcommand\\csname\\omenprefix#1\\endcsname{\\ensuremath{#2}}}\n")
	s := r.Summary
	for _, q := range s.Parameters {
		m.quantity(q)
		if at, ok := s.Fit.Best[q.Name]; ok {
			m.define(letters(q.Name)+"Best", report.Best(q, at))
		}
	}
	for _, q := range s.Derived {
		m.quantity(q)
	}
	m.fates(s)
	m.fit(s)
	return m.Bytes()
}

type macros struct{ bytes.Buffer }

func (m *macros) define(name, value string) { fmt.Fprintf(m, "\\omendefine{%s}{%s}\n", name, value) }

func (m *macros) quantity(q result.Quantity) {
	name := letters(q.Name)
	if !q.Constrained {
		m.define(name, `\mbox{not constrained}`)
		return
	}
	place := digits.Place(float64(q.SD), float64(q.MCSE))
	m.define(name, newEstimate(q).tex())
	m.define(name+"Mean", number(float64(q.Mean), place))
	m.define(name+"Sd", digits.Width(float64(q.SD), place))
	m.define(name+"Median", number(float64(q.Median), place))
	ends := func(of string, v, mcse [2]result.Number) {
		lo, hi := report.Ends(v, mcse, q)
		m.define(name+"Low"+of, inMath(lo))
		m.define(name+"High"+of, inMath(hi))
	}
	ends("SixtyEight", q.Interval68, q.MCSE68)
	ends("NinetyFive", q.Interval95, q.MCSE95)
}

// fates defines every probability, and what the nested universes and times are.
func (m *macros) fates(s *result.Summary) {
	series := func(fates []result.Fate, suffix string) {
		for _, f := range fates {
			m.define("P"+letters(event(f.Name))+suffix, probability(f))
		}
	}
	series(s.Fates, "")
	series(s.FatesHeldW, "HeldW")
	series(s.Today, "")
	if s.Averaged != nil {
		series(s.Averaged.Fates, "Averaged")
		series(s.Averaged.FatesHeldW, "HeldWAveraged")
		series(s.Averaged.Today, "Averaged")
	}
	for _, n := range s.Nested {
		if n.Ruled == "" {
			m.define("LnBayes"+letters(n.Name), inMath(report.Bayes(n)))
			m.define("PModel"+letters(n.Name), inMath(report.ModelProbability(n)))
		}
	}
	for _, t := range s.Times {
		if median, _, _ := report.When(t); median != "" {
			m.define("Time"+letters(t.Name), when(t))
		}
	}
}

// when is a time as a median with errors.
func when(t result.Time) string {
	up, down := float64(t.Interval68[1]-t.Median), float64(t.Median-t.Interval68[0])
	half := (up + down) / 2
	e := estimate{float64(t.Median), up, down, false, digits.Place(half, float64(t.MCSE))}
	if math.Abs(up-down) <= lopsided*half || digits.Format(up, e.place) == digits.Format(down, e.place) {
		e.symmetric, e.up = true, half
	}
	return e.tex()
}

// fit defines the goodness of the best fit and the chain's own numbers.
func (m *macros) fit(s *result.Summary) {
	m.define("ChiSquared", number(float64(s.Fit.Chi2), -2))
	m.define("Dof", strconv.Itoa(s.Fit.DoF))
	m.define("Rows", strconv.Itoa(s.Fit.Rows))
	if p := float64(s.Fit.Probability); !math.IsNaN(p) {
		m.define("FitProbability", chance(p))
	}
	m.define("Version", `\mbox{`+Escape(s.Version)+"}")
	c := s.Sampling
	if c.Ensembles == 0 {
		return
	}
	m.define("EffectiveSamples", strconv.Itoa(int(math.Floor(float64(c.MinESS)))))
	m.define("Rhat", digits.Format(float64(c.MaxRHat), -4))
	m.define("Ensembles", strconv.Itoa(c.Ensembles))
	m.define("Walkers", strconv.Itoa(c.Walkers))
	m.define("Steps", strconv.Itoa(c.Steps))
	m.define("BurnIn", strconv.Itoa(c.BurnIn))
	m.define("Seed", strconv.FormatUint(c.Seed, 10))
}

// chance is the probability of a chi-squared in math mode.
func chance(p float64) string {
	switch {
	case p < 0.0005:
		return "< 0.001"
	case p > 0.9995:
		return "> 0.999"
	}
	return fmt.Sprintf("%.3f", p)
}
