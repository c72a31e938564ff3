package job

import (
	"math"
	"path/filepath"
	"testing"

	"omen/likelihood"
	"omen/sampler"
)

// Every run of the repository gives the same result condensed and directly, within
// Monte Carlo error. The seeds differ: chains that follow each other step by step
// would agree whatever their densities are.
func TestRunsCondensedAndDirect(t *testing.T) {
	files, err := filepath.Glob(filepath.Join("..", "..", "..", "..", "testdata", "runs", "*.toml"))
	if err != nil || len(files) < 8 {
		t.Fatalf("found %d run files, %v", len(files), err)
	}
	for _, file := range files {
		t.Run(filepath.Base(file), func(t *testing.T) {
			t.Parallel()
			j := fit(t, parse(t, file), nil)
			a, b := explored(t, j, j.Posterior, 1), explored(t, j, j.Posterior.Direct(), 2)
			for i, p := range j.Space.Free() {
				if d := math.Abs(a[i].Mean - b[i].Mean); d > 5*math.Hypot(a[i].MCSE, b[i].MCSE) {
					t.Errorf("%s: %v ± %v condensed, %v ± %v directly", p.Name, a[i].Mean, a[i].MCSE, b[i].Mean, b[i].MCSE)
				}
				if d := math.Abs(a[i].SD/b[i].SD - 1); d > 5/math.Sqrt(math.Min(a[i].ESS, b[i].ESS)) {
					t.Errorf("%s: width %v condensed, %v directly", p.Name, a[i].SD, b[i].SD)
				}
			}
		})
	}
}

// explored is the summary of every parameter after a short run.
func explored(t *testing.T, j *Job, p *likelihood.Posterior, seed uint64) (out []sampler.Summary) {
	t.Helper()
	lo, hi := j.Space.Box()
	best, _, err := sampler.Maximise(p.Evaluator().LogDensity, lo, hi, seed)
	if err != nil {
		t.Fatal(err)
	}
	var densities []sampler.Density
	var starts [][]float64
	for m := range 4 {
		d := p.Evaluator().LogDensity
		start, err := sampler.Scatter(d, best, lo, hi, sampler.DefaultWalkers(j.Space.Dim()), seed, m)
		if err != nil {
			t.Fatal(err)
		}
		densities, starts = append(densities, d), append(starts, start)
	}
	chain, err := sampler.NewChain(j.Space.Dim(), starts, 1, sampler.DefaultRecord)
	if err != nil {
		t.Fatal(err)
	}
	outcome, err := sampler.Run(t.Context(), densities, chain, sampler.Settings{Seed: seed, MaxSteps: 500}, nil)
	if err != nil {
		t.Fatal(err)
	}
	view := chain.View().After(outcome.Check.BurnIn)
	for i := range j.Space.Dim() {
		out = append(out, sampler.Summarize(view.Coordinate(i)))
	}
	return out
}
