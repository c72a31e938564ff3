package sampler

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
)

// One step of 32 walkers with a density that costs next to nothing.
func BenchmarkStep(b *testing.B) {
	e := newGaussianEnsemble(b, 1, 0)
	for b.Loop() {
		e.Step()
	}
}

// A whole fit of two parameters to 10,000 effective samples, with a density of
// about 1.5 µs: the evaluations per run, and what the checks cost beside them.
func BenchmarkFit(b *testing.B) {
	g := target{
		new: func() Density {
			return func(x []float64) float64 {
				s := 0.0
				for i := range 330 {
					s += math.Sqrt(float64(i) + x[0]*x[0])
				}
				return -(x[0]*x[0] + x[1]*x[1] + s*1e-9) / 2
			}
		},
		lo: []float64{-20, -20},
		hi: []float64{20, 20},
	}
	var evaluations int
	for b.Loop() {
		c, densities := g.newChain(b, 4, 1, 1, DefaultRecord)
		s := DefaultSettings()
		s.Effective = 10000
		out, err := Run(context.Background(), densities, c, s, nil)
		if err != nil {
			b.Fatal(err)
		}
		SummarizeAll([]Draws{out.Check.Sample.Coordinate(0), out.Check.Sample.Coordinate(1)}, 0)
		evaluations = out.Check.Evaluations
	}
	b.ReportMetric(float64(evaluations), "evaluations/op")
}

// bigChain is 4 ensembles × 20,000 steps × 32 walkers × 2 parameters.
func bigChain(b *testing.B) *Chain {
	b.Helper()
	rng := rand.New(rand.NewPCG(1, 2))
	start := make([][]float64, 4)
	for m := range start {
		start[m] = normals(uint64(m), 64)
	}
	c, err := NewChain(2, start, 1, 1<<24)
	if err != nil {
		b.Fatal(err)
	}
	x, logp := cloneAll(start), make([][]float64, 4)
	for step := 1; step <= 20000; step++ {
		for m := range x {
			for k := range x[m] {
				x[m][k] = 0.9*x[m][k] + 0.4359*rng.NormFloat64()
			}
			logp[m] = x[m][:32]
		}
		if err := c.Append(step, x, logp, 0); err != nil {
			b.Fatal(err)
		}
	}
	return c
}

// One look at whether a long chain has converged.
func BenchmarkAssess(b *testing.B) {
	c := bigChain(b)
	for b.Loop() {
		Assess(c, DefaultSettings())
	}
}

// The summary of one quantity, of every draw of a long chain.
func BenchmarkSummarize(b *testing.B) {
	d := bigChain(b).View().Coordinate(0)
	for b.Loop() {
		Summarize(d)
	}
}
