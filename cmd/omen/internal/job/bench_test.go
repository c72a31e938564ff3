package job

import (
	"path/filepath"
	"testing"

	"omen/cmd/omen/internal/cache"
	"omen/sampler"
)

// BenchmarkStep is one step of 32 walkers with the posterior of the quick start.
func BenchmarkStep(b *testing.B) {
	j := fit(b, parse(b, filepath.Join("..", "..", "..", "..", "testdata", "runs", "fate.toml")), nil)
	lo, hi := j.Space.Box()
	d := j.Posterior.Evaluator().LogDensity
	best, _, err := sampler.Maximise(d, lo, hi, 1)
	if err != nil {
		b.Fatal(err)
	}
	start, err := sampler.Scatter(d, best, lo, hi, 32, 1, 0)
	if err != nil {
		b.Fatal(err)
	}
	e, err := sampler.NewEnsemble(d, 1, 0, j.Space.Dim(), start)
	if err != nil {
		b.Fatal(err)
	}
	b.ReportAllocs()
	for b.Loop() {
		e.Step()
	}
}

// BenchmarkLoad is all that comes before a best fit is looked for: 1590 supernovae
// with a full covariance, from the text of the matrix and from the cache.
func BenchmarkLoad(b *testing.B) {
	dir := b.TempDir()
	survey(b, dir, 1590, 1)
	run := parse(b, filepath.Join(dir, "run.toml"))
	c := cache.Open(b.TempDir())
	b.Run("cold", func(b *testing.B) {
		for b.Loop() {
			fit(b, run, nil)
		}
	})
	fit(b, run, c)
	b.Run("cached", func(b *testing.B) {
		for b.Loop() {
			fit(b, run, c)
		}
	})
}
