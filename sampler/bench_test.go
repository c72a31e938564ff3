package sampler

import (
	"context"
	"math/rand/v2"
	"testing"
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
