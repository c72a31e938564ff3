package sampler

import (
	"math"
	"math/rand/v2"
	"testing"
)

// correlationError is the Monte Carlo error of the correlation of coordinates i
// and j: that of the mean of its influence function ab − r(a² + b²)/2 in
// standardised a and b (Devlin, Gnanadesikan & Kettenring 1975, Biometrika 62,
// 531; from memory).
func correlationError(v View, i, j int, si, sj Summary, r float64) float64 {
	return MCSE(v.Map(func(x []float64) float64 {
		a, b := (x[i]-si.Mean)/si.SD, (x[j]-sj.Mean)/sj.SD
		return a*b - r*(a*a+b*b)/2
	}))
}

// Means alone would not do: a move with the wrong acceptance keeps the mean of
// a symmetric density and spoils its width.
func TestMomentsOfKnownTargets(t *testing.T) {
	within := func(t *testing.T, what string, got, want, mcse float64) {
		t.Helper()
		if z := (got - want) / mcse; !(math.Abs(z) < 4.5) {
			t.Errorf("%s = %v, want %v: off by %.1f Monte Carlo errors", what, got, want, z)
		}
	}
	for _, g := range []target{gaussian(), ridge(), truncated()} {
		t.Run(g.name, func(t *testing.T) {
			t.Parallel()
			s := DefaultSettings()
			s.Effective = 12000
			_, out := g.run(t, s)
			if out.Stop != Converged {
				t.Fatalf("stopped with %v: %+v", out.Stop, out.Check.Parameters)
			}
			v := out.Check.Sample
			all := make([]Summary, len(g.mean))
			for i := range all {
				all[i] = Summarize(v.Coordinate(i))
				within(t, "mean", all[i].Mean, g.mean[i], all[i].MCSE)
				within(t, "standard deviation", all[i].SD, g.sd[i], all[i].MCSESD)
				// So that wide errors cannot hide a wrong width.
				if !(all[i].MCSESD < 0.05*g.sd[i]) {
					t.Errorf("error of the standard deviation %v of %v", all[i].MCSESD, g.sd[i])
				}
			}
			for _, c := range g.corr {
				i, j := int(c[0]), int(c[1])
				r := Correlation(v.Coordinate(i), v.Coordinate(j))
				within(t, "correlation", r, c[2], correlationError(v, i, j, all[i], all[j], c[2]))
			}
		})
	}
}

// zScores collects deviations in units of their error.
type zScores map[string][]float64

func (z zScores) add(what string, got, want, mcse float64) {
	z[what] = append(z[what], (got-want)/mcse)
}

// check compares the mean square of the deviations with 1. An error that is
// itself known to a fraction f makes it 1 + f².
func (z zScores) check(t *testing.T, least, most, mean float64) {
	t.Helper()
	for what, all := range z {
		sum, squares := 0.0, 0.0
		for _, v := range all {
			sum += v / float64(len(all))
			squares += v * v / float64(len(all))
		}
		t.Logf("%s: z has mean %.2f and mean square %.2f", what, sum, squares)
		if !(squares > least && squares < most && math.Abs(sum) < mean) {
			t.Errorf("%s: z has mean %.2f and mean square %.2f, want 0 and 1", what, sum, squares)
		}
	}
}

// The errors that are reported must be the errors that are made: over many
// seeds, deviations in units of their error have mean square one.
func TestErrorsCoverAR1(t *testing.T) {
	z := zScores{}
	for seed := range uint64(150) {
		// Five walkers per ensemble, each a series of its own: 300 τ in all.
		rng := rand.New(rand.NewPCG(seed, 5))
		x := make([][]float64, 4)
		for m := range x {
			x[m] = interleave(ar1(rng, 0.8, 5, 700)...)
		}
		s := Summarize(NewDraws(5, x...))
		z.add("mean", s.Mean, 0, s.MCSE)
		z.add("sd", s.SD, 1, s.MCSESD)
		z.add("median", s.Median, 0, s.MCSEMedian)
		z.add("84%", s.Interval68[1], 0.994457883, s.MCSE68[1])
		z.add("2.5%", s.Interval95[0], -1.959963985, s.MCSE95[0])
	}
	// 150 squares of unit normals have a mean of 1 ± 0.12.
	z.check(t, 0.7, 1.5, 0.28)
}

// interleave turns series of single walkers into steps × walkers.
func interleave(series ...[]float64) []float64 {
	x := make([]float64, 0, len(series)*len(series[0]))
	for t := range series[0] {
		for _, s := range series {
			x = append(x, s[t])
		}
	}
	return x
}

// The same for whole runs, which choose burn-in and length by looking at the
// chain.
func TestErrorsCoverRuns(t *testing.T) {
	g := target{
		new: func() Density { // a Gaussian beside an exponential
			return func(x []float64) float64 {
				if x[1] < 0 {
					return math.Inf(-1)
				}
				return -x[0]*x[0]/2 - x[1]
			}
		},
		lo: []float64{-30, 0},
		hi: []float64{30, 200},

		walkers: 8,
	}
	z := zScores{}
	for seed := range uint64(24) {
		s := DefaultSettings()
		s.Seed, s.Effective = seed, 800
		_, out := g.run(t, s)
		a, b := Summarize(out.Check.Sample.Coordinate(0)), Summarize(out.Check.Sample.Coordinate(1))
		z.add("mean", a.Mean, 0, a.MCSE)
		z.add("mean", b.Mean, 1, b.MCSE)
		z.add("sd", a.SD, 1, a.MCSESD)
		z.add("sd", b.SD, 1, b.MCSESD)
		z.add("median", a.Median, 0, a.MCSEMedian)
		z.add("median", b.Median, math.Ln2, b.MCSEMedian)
	}
	z.check(t, 0.45, 2, 0.55)
}
