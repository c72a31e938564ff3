package sampler

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"
	"time"
)

func BenchmarkRunGaussian(b *testing.B) {
	g := gaussian()
	for range b.N {
		c, densities := g.newChain(b, 4, 1, 1, DefaultRecord)
		s := DefaultSettings()
		s.Effective = 10000
		if _, err := Run(context.Background(), densities, c, s, nil); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkSummarize(b *testing.B) {
	rng := rand.New(rand.NewPCG(1, 2))
	d := NewDraws(32, ar1(rng, 0.9, 4, 20000*32)...)
	for b.Loop() {
		Summarize(d)
	}
}

func BenchmarkStep(b *testing.B) {
	g := gaussian()
	start, _ := Scatter(g.new(), g.mean, g.lo, g.hi, 32, 1, 0)
	e, err := NewEnsemble(g.new(), 1, 0, 3, start)
	if err != nil {
		b.Fatal(err)
	}
	for b.Loop() {
		e.Step()
	}
}

// slowDensity costs about 1.5 µs.
func BenchmarkFit(b *testing.B) {
	slow := func() Density {
		return func(x []float64) float64 {
			s := 0.0
			for i := range 260 {
				s += math.Sqrt(float64(i) + x[0]*x[0])
			}
			return -(x[0]*x[0] + x[1]*x[1] + s*1e-9) / 2
		}
	}
	g := target{new: slow, lo: []float64{-20, -20}, hi: []float64{20, 20}}
	d := slow()
	x := []float64{0.3, 0.2}
	t0 := time.Now()
	for range 100000 {
		d(x)
	}
	b.ReportMetric(float64(time.Since(t0).Nanoseconds())/1e5, "ns/eval")
	for b.Loop() {
		c, densities := g.newChain(b, 4, 1, 1, DefaultRecord)
		s := DefaultSettings()
		s.Effective = 10000
		out, err := Run(context.Background(), densities, c, s, nil)
		if err != nil {
			b.Fatal(err)
		}
		SummarizeAll([]Draws{out.Check.Sample.Coordinate(0), out.Check.Sample.Coordinate(1)}, 0)
		b.ReportMetric(float64(out.Check.Evaluations), "evals")
	}
}
