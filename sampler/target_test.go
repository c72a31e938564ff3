package sampler

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
)

// target is a density with known moments.
type target struct {
	name   string
	new    func() Density
	lo, hi []float64

	walkers int // 0 for the default

	mean []float64
	sd   []float64
	corr [][3]float64 // i, j, correlation
}

// gaussian has standard deviations 1e-3, 1, 1e3 and strong correlations.
func gaussian() target {
	sd := []float64{1e-3, 1, 1e3}
	mean := []float64{0.3, -5, 2e4}
	// x1 = a, x2 = r a + √(1−r²) b, x3 = s a + √(1−s²) c.
	const r, s = 0.95, -0.6
	cr, cs := math.Sqrt(1-r*r), math.Sqrt(1-s*s)
	return target{
		name: "gaussian",
		new: func() Density {
			return func(x []float64) float64 {
				a := (x[0] - mean[0]) / sd[0]
				b := ((x[1]-mean[1])/sd[1] - r*a) / cr
				c := ((x[2]-mean[2])/sd[2] - s*a) / cs
				return -(a*a + b*b + c*c) / 2
			}
		},
		lo:   []float64{0, -100, -1e5},
		hi:   []float64{1, 100, 1e5},
		mean: mean,
		sd:   sd,
		corr: [][3]float64{{0, 1, r}, {0, 2, s}, {1, 2, r * s}},
	}
}

// small is a gaussian with few walkers, for tests of how a run goes.
func small() target {
	g := gaussian()
	g.walkers = 8
	return g
}

// ridge is curved: x ~ N(0, 1), y = x² + N(0, 0.3²).
func ridge() target {
	return target{
		name: "ridge",
		new: func() Density {
			return func(x []float64) float64 {
				r := (x[1] - x[0]*x[0]) / 0.3
				return -(x[0]*x[0] + r*r) / 2
			}
		},
		lo:   []float64{-20, -20},
		hi:   []float64{20, 400},
		mean: []float64{0, 1},
		sd:   []float64{1, math.Sqrt(2 + 0.09)}, // Var x² = 2 for a normal x
		corr: [][3]float64{{0, 1, 0}},           // E x³ = 0
	}
}

// truncated is a half normal beside an exponential: edges at zero.
func truncated() target {
	return target{
		name: "truncated",
		new: func() Density {
			return func(x []float64) float64 {
				if x[0] < 0 || x[1] < 0 {
					return math.Inf(-1)
				}
				return -x[0]*x[0]/2 - x[1]
			}
		},
		lo:   []float64{0, 0},
		hi:   []float64{30, 200},
		mean: []float64{math.Sqrt(2 / math.Pi), 1},
		sd:   []float64{math.Sqrt(1 - 2/math.Pi), 1},
		corr: [][3]float64{{0, 1, 0}},
	}
}

// newChain starts ensembles of a target the way a program would.
func (g target) newChain(tb testing.TB, ensembles int, seed uint64, every, record int) (*Chain, []Density) {
	tb.Helper()
	best, _, err := Maximise(g.new(), g.lo, g.hi, seed)
	if err != nil {
		tb.Fatal(err)
	}
	walkers := g.walkers
	if walkers == 0 {
		walkers = DefaultWalkers(len(best))
	}
	densities := make([]Density, ensembles)
	start := make([][]float64, ensembles)
	for m := range start {
		densities[m] = g.new()
		start[m], err = Scatter(densities[m], best, g.lo, g.hi, walkers, seed, m)
		if err != nil {
			tb.Fatal(err)
		}
	}
	c, err := NewChain(len(best), start, every, record)
	if err != nil {
		tb.Fatal(err)
	}
	return c, densities
}

// run samples a target to its goal.
func (g target) run(tb testing.TB, s Settings) (*Chain, Outcome) {
	tb.Helper()
	c, densities := g.newChain(tb, 4, s.Seed, 1, DefaultRecord)
	out, err := Run(context.Background(), densities, c, s, nil)
	if err != nil {
		tb.Fatal(err)
	}
	return c, out
}

// ar1 returns stationary series x(t) = ρ x(t−1) + √(1−ρ²) e(t) of variance 1.
func ar1(rng *rand.Rand, rho float64, series, n int) [][]float64 {
	all := make([][]float64, series)
	for m := range all {
		all[m] = make([]float64, n)
		x := rng.NormFloat64()
		for t := range all[m] {
			all[m][t] = x
			x = rho*x + math.Sqrt(1-rho*rho)*rng.NormFloat64()
		}
	}
	return all
}
