package result

import (
	"math"
	"sync"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/model"
	"omen/sampler/quadrature"
)

// fromExact fills in what was integrated: the probabilities, and the constraints
// where there is no chain.
func (s *Summary) fromExact(r Run, drawn *outlook.Drawn) {
	e := r.Exact
	s.Engine.Name = "both"
	s.Engine.LogEvidence, s.Engine.Error = Number(e.LogEvidence.Value), Number(e.LogEvidence.Err)
	s.Engine.Evaluations, s.Engine.Seconds = e.Evaluations, e.Seconds
	fates, held, today := tables(e, e.Space.Family())
	s.Fates, s.FatesHeldW, s.Today = beside(fates, s.Fates), beside(held, s.FatesHeldW), beside(today, s.Today)
	parameters, derived := exactQuantities(r)
	s.Engine.Exact = append(parameters[:len(parameters):len(parameters)], derived...)
	if drawn == nil {
		s.Engine.Name = "quadrature"
		s.Parameters, s.Derived = parameters, derived
		return
	}
	s.Engine.Largest = disagreement(append(s.Parameters[:len(s.Parameters):len(s.Parameters)], s.Derived...), s.Engine.Exact)
}

// exactQuantities are parameters and derived quantities by quadrature. A quantity that is
// the same everywhere is left out, and so are derived ones that a chain knows better.
func exactQuantities(r Run) (parameters, derived []Quantity) {
	e := r.Exact
	for i, p := range e.Space.Free() {
		m := e.Marginal(i)
		q := exactly(p.Name, &m)
		q.Constrained = constrained(p.Prior, q)
		parameters = append(parameters, q)
	}
	if r.Chain != nil && !e.Fine() {
		return parameters, nil
	}
	names := derivedNames(e.Space)
	marginals, errs := make([]quadrature.Marginal, len(names)), make([]error, len(names))
	var wait sync.WaitGroup
	for i, name := range names {
		wait.Go(func() { marginals[i], errs[i] = derivedMarginal(e, name) })
	}
	wait.Wait()
	for i, name := range names {
		if errs[i] == nil {
			derived = append(derived, exactly(name, &marginals[i]))
		}
	}
	return parameters, derived
}

func derivedMarginal(e *exact.Posterior, name string) (quadrature.Marginal, error) {
	if name == "hrd" || name == "rd" {
		return e.Distribution(func(p *likelihood.Point) float64 { return value(name, p, math.NaN()) })
	}
	return e.OfUniverse(func(u model.Universe) float64 { return ofUniverse(name, u) })
}

// ofUniverse is value for what the universe alone decides; the age is computed only
// where it is asked for.
func ofUniverse(name string, u model.Universe) float64 {
	age := math.NaN()
	if name == "age" || name == "H0t0" {
		age = u.AgeToday()
	}
	return value(name, &likelihood.Point{Universe: u}, age)
}

func exactly(name string, m *quadrature.Marginal) Quantity {
	interval := func(lo, hi float64) [2]Number { return [2]Number{Number(lo), Number(hi)} }
	none := Number(math.NaN())
	return Quantity{Name: name, Unit: likelihood.Unit(name), Mean: Number(m.Mean), SD: Number(m.SD), Median: Number(m.Median()),
		Interval68: interval(m.Interval(0.68)), Interval95: interval(m.Interval(0.95)), HDI68: interval(m.HighestDensity(0.68)),
		MCSE: none, MCSE68: [2]Number{none, none}, MCSE95: [2]Number{none, none}, ESS: none, RHat: none, Constrained: true}
}

// statistic is one number that a chain and an integral both give.
type statistic struct {
	name       string
	chain, err float64
	exact      float64
}

func statistics(c, e *Quantity) []statistic {
	f := func(n Number) float64 { return float64(n) }
	return []statistic{
		{"mean", f(c.Mean), f(c.MCSE), f(e.Mean)},
		{"sd", f(c.SD), c.mcseSD, f(e.SD)},
		{"median", f(c.Median), c.mcseMedian, f(e.Median)},
		{"lower end of 68%", f(c.Interval68[0]), f(c.MCSE68[0]), f(e.Interval68[0])},
		{"upper end of 68%", f(c.Interval68[1]), f(c.MCSE68[1]), f(e.Interval68[1])},
		{"lower end of 95%", f(c.Interval95[0]), f(c.MCSE95[0]), f(e.Interval95[0])},
		{"upper end of 95%", f(c.Interval95[1]), f(c.MCSE95[1]), f(e.Interval95[1])},
	}
}

// disagreement finds the largest difference, in widths and in standard errors.
func disagreement(chain, exact []Quantity) *Disagreement {
	d := &Disagreement{}
	for i := range chain {
		for k := range exact {
			if exact[k].Name != chain[i].Name || !(exact[k].SD > 0) {
				continue
			}
			for _, s := range statistics(&chain[i], &exact[k]) {
				off := math.Abs(s.chain-s.exact) / float64(exact[k].SD)
				mc := s.err / float64(exact[k].SD)
				if off > float64(d.Widths) {
					d.Quantity, d.Statistic, d.Widths, d.MonteCarlo = chain[i].Name, s.name, Number(off), Number(mc)
				}
				if off/mc > float64(d.Sigmas) {
					d.Sigmas, d.Of = Number(off/mc), chain[i].Name+", "+s.name
				}
			}
		}
	}
	return d
}
