package sampler

import (
	"math"
	"testing"
)

// curvedTail is a curved ridge that becomes thin on one side, where walkers come
// rarely and stay long: x ~ N(0, 1), y = 0.3 x² + N(0, (0.3 e^(−x/2))²).
func curvedTail() target {
	return target{
		name: "curved tail",
		new: func() Density {
			return func(x []float64) float64 {
				r := (x[1] - 0.3*x[0]*x[0]) / (0.3 * math.Exp(-x[0]/2))
				return -(x[0]*x[0]+r*r)/2 + x[0]/2
			}
		},
		lo:      []float64{-20, -100},
		hi:      []float64{20, 500},
		walkers: 8,
	}
}

// The errors of runs that end as soon as they look good enough are those that are
// made, also where a run can look good because it has not yet seen what is rare.
func TestErrorsCoverACurvedTail(t *testing.T) {
	g := curvedTail()
	z := zScores{}
	for seed := range uint64(48) {
		s := DefaultSettings()
		s.Seed, s.Effective = seed, 500
		_, out := g.run(t, s)
		if out.Stop != Converged {
			t.Fatal(out.Stop)
		}
		d := out.Check.Sample.Coordinate(0)
		a := Summarize(d)
		p := Proportion(d.Map(func(x float64) float64 {
			if x > 2 {
				return 1
			}
			return 0
		}), a.ESS)
		z.add("x", a.Mean, 0, a.MCSE)
		z.add("x", a.SD, 1, a.MCSESD)
		z.add("x", a.Interval95[1], 1.959963985, a.MCSE95[1])
		z.add("x", p.P, 0.022750131948, p.Error)
	}
	// The four are not independent: as over 60 to 100 squares, a mean of 1 ± 0.16.
	z.check(t, 0.6, 1.6, 0.5)
}
