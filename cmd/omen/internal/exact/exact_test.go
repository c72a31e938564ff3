package exact

import (
	"context"
	"math"
	"os"
	"path/filepath"
	"testing"

	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/outlook"
	"omen/cmd/omen/internal/runfile"
	"omen/likelihood"
	"omen/model"
)

// load reads a committed run with settings on top.
func load(t *testing.T, name string, sets ...string) *job.Job {
	t.Helper()
	file := filepath.Join("..", "..", "..", "..", "testdata", "runs", name)
	text, err := os.ReadFile(file)
	if err != nil {
		t.Fatal(err)
	}
	run, err := runfile.Parse(file, text, sets)
	if err != nil {
		t.Fatal(err)
	}
	j, err := job.Load(run)
	if err != nil {
		t.Fatal(err)
	}
	return j
}

func integrate(t *testing.T, j *job.Job) *Posterior {
	t.Helper()
	e, err := Integrate(context.Background(), j.Posterior, nil, 0)
	if err != nil {
		t.Fatal(err)
	}
	return e
}

func closed(l outlook.Label) bool { return l.Curvature < 0 }

// grid sums the density over an even grid of (Om, Ok, hrd), on which Ok = 0 is a line of nodes, and returns ln of
// the integral and the probability of a closed universe. The trapezoidal sum of a smooth function that
// vanishes at the ends converges faster than any power of the step; a border counts by Simpson's rule along Ok.
func grid(j *job.Job, om, ok, hrd [3]float64) (logZ, pClosed float64) {
	density := j.Posterior.Evaluator().LogDensity
	n := func(r [3]float64) int { return int(math.Round((r[1] - r[0]) / r[2])) }
	peak := math.Inf(-1)
	rows := make([]float64, n(ok)+1) // ∫ dOm dhrd at each Ok, in units of exp(peak)
	for pass := range 2 {
		for i := range rows {
			o := ok[0] + float64(i)*ok[2]
			for a := range n(om) + 1 {
				m := om[0] + float64(a)*om[2]
				for h := range n(hrd) + 1 {
					lp := density([]float64{m, 1 - m - o, hrd[0] + float64(h)*hrd[2]})
					if pass == 0 {
						peak = math.Max(peak, lp)
					} else {
						rows[i] += math.Exp(lp - peak)
					}
				}
			}
		}
	}
	zero := int(math.Round(-ok[0] / ok[2]))
	all := simpson(rows)
	below := simpson(rows[:zero+1])
	return peak + math.Log(all*ok[2]*om[2]*hrd[2]), below / all
}

// simpson sums over an even number of intervals, in units of the step.
func simpson(y []float64) float64 {
	if len(y)%2 == 0 {
		panic("odd number of intervals")
	}
	sum := 0.0
	for i, v := range y {
		w := 4.0
		if i%2 == 0 {
			w = 2
		}
		if i == 0 || i == len(y)-1 {
			w = 1
		}
		sum += w * v / 3
	}
	return sum
}

// BAO and supernovae, curved: against a sum over a fine grid.
func TestFateRunAgainstGrid(t *testing.T) {
	j := load(t, "fate.toml")
	e := integrate(t, j)
	logZ, want := grid(j, [3]float64{0.22, 0.37, 0.0015}, [3]float64{-0.24, 0.336, 0.006}, [3]float64{95.5, 106, 0.15})
	got := e.Probability(closed)
	t.Logf("ln Z %.7f, grid %.7f; P(closed) %.6f ± %.1g, grid %.6f", e.LogEvidence.Value, logZ, got.P, got.Err, want)
	if d := math.Abs(e.LogEvidence.Value - logZ); !(d < 1e-4) {
		t.Errorf("ln evidence differs from the grid by %.2g", d)
	}
	if d := math.Abs(got.P - want); !(d < 1e-4) {
		t.Errorf("P(closed) %.6f, grid %.6f", got.P, want)
	}
	_ = model.C
	_ = likelihood.Names
}
