package result

import (
	"math"
	"sync"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/model"
	"omen/sampler"
)

// fewestForTimes is how many effective draws must meet a condition before anything is
// said of when: the ends of a 95% interval then rest on one draw each.
const fewestForTimes = 40

// hardlyEver is the probability of a condition below which nobody asks when.
const hardlyEver = 1e-6

// timeDraws is how many draws the times are computed at, about.
const timeDraws = 20_000

// times fills in when things happen.
func (s *Summary) times(r Run, drawn *outlook.Drawn) {
	space := r.Job.Space
	events := outlook.Events(space.Family().DarkEnergy == likelihood.W0Wa)
	switch {
	case r.Exact != nil && (r.Exact.Fine() || drawn == nil):
		out := make([]Time, len(events))
		var wait sync.WaitGroup
		for i, e := range events {
			wait.Go(func() { out[i] = exactTime(e, r.Exact, space.KnowsH0()) })
		}
		wait.Wait()
		for _, t := range out {
			s.add(t)
		}
	case drawn != nil:
		point := func() func(x []float64) model.Universe {
			var p likelihood.Point
			return func(x []float64) model.Universe {
				space.Point(x, &p)
				return p.Universe
			}
		}
		for _, t := range drawnTimes(events, drawn, point, space.KnowsH0(), r.Threads) {
			s.add(t)
		}
	}
}

// add leaves out what never happens.
func (s *Summary) add(t Time) {
	if t.Probability > 0 {
		s.Times = append(s.Times, t)
	}
}

func newTime(e outlook.Event, gyr bool) Time {
	none := Number(math.NaN())
	t := Time{Name: e.Name, Words: e.Words, Given: e.Given, Median: none, Interval68: [2]Number{none, none},
		Interval95: [2]Number{none, none}, MCSE: none, ESS: none}
	switch {
	case e.Plain:
	case gyr:
		t.Unit = "Gyr"
	default:
		t.Unit = "1/H0"
	}
	return t
}

func exactTime(e outlook.Event, p *exact.Posterior, gyr bool) Time {
	t := newTime(e, gyr)
	if p.Probability(e.Holds).P < hardlyEver {
		return t
	}
	to, back := func(x float64) float64 { return x }, func(x float64) Number { return Number(x) }
	if e.Long {
		to, back = math.Log, func(x float64) Number { return Number(math.Exp(x)) }
	}
	m, err := p.OfUniverse(func(u model.Universe) float64 { return to(e.At(u, gyr)) })
	if err != nil {
		return t
	}
	interval := func(lo, hi float64) [2]Number { return [2]Number{back(lo), back(hi)} }
	t.Probability, t.Median = Number(m.Defined), back(m.Median())
	t.Interval68, t.Interval95 = interval(m.Interval(0.68)), interval(m.Interval(0.95))
	return t
}

// drawnTimes are the times along a chain, of the draws in which they come to be.
func drawnTimes(events []outlook.Event, drawn *outlook.Drawn, point func() func(x []float64) model.Universe, gyr bool, threads int) []Time {
	v := drawn.View
	v = v.Thin(max(1, v.Steps()*v.Ensembles()*v.Walkers()/timeDraws))
	draws := v.MapAll(len(events), threads, func() func(x, y []float64) {
		at := point()
		return func(x, y []float64) {
			u := at(x)
			for i, e := range events {
				y[i] = e.At(u, gyr)
			}
		}
	})
	var out []Time
	for i, e := range events {
		out = append(out, drawnTime(newTime(e, gyr), draws[i]))
	}
	return out
}

func drawnTime(t Time, d sampler.Draws) Time {
	known := d.Map(func(x float64) float64 { return indicator(!math.IsNaN(x)) })
	t.Probability = Number(sampler.Proportion(known, 0).P)
	if t.Probability == 0 {
		return t
	}
	s := sampler.Summarize(d.Weighted(known))
	t.ESS = Number(s.ESS)
	if s.ESS < fewestForTimes {
		return t
	}
	t.Median, t.Interval68, t.Interval95, t.MCSE = Number(s.Median), pair(s.Interval68), pair(s.Interval95), Number(s.MCSEMedian)
	return t
}

func indicator(yes bool) float64 {
	if yes {
		return 1
	}
	return 0
}
