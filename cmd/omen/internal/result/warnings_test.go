package result

import (
	"strings"
	"testing"

	"omen/cmd/omen/internal/job/jobtest"
	"omen/sampler"
)

// Ensembles that disagree are told of once, with what they disagree about.
func TestWarningOfStuckWalkers(t *testing.T) {
	r := Run{Job: jobtest.Committed(t, "bao-flat.toml")}
	good := sampler.Convergence{ESS: 5000, RHat: 1.001, Tau: 10}
	check := &r.Outcome.Check
	check.Times, check.Parameters = 500, []sampler.Convergence{good, good}
	if w := chainWarnings(r); len(w) != 0 {
		t.Errorf("warnings %q", w)
	}
	check.Times, check.Parameters[1].ESS = 0, 0
	if w := chainWarnings(r); len(w) != 1 || !strings.Contains(w[0], "too short for its autocorrelation to be known") {
		t.Errorf("short: warnings %q", w)
	}
	check.Sample = long(t, 6000)
	if w := chainWarnings(r); len(w) != 1 || !strings.Contains(w[0], "see hrd; most likely there is a second region") {
		t.Errorf("long: warnings %q", w)
	}
	check.Times, check.Parameters[1].ESS = 350, 3000
	if w := chainWarnings(r); len(w) != 2 || !strings.Contains(w[0], "below the goal of 4000") || !strings.Contains(w[1], "350 autocorrelation times long, below 400") {
		t.Errorf("warnings %q", w)
	}
}

// A table condensed for Λ is no table for w.
func TestWarningOfCondensedTables(t *testing.T) {
	if w := condensedWarnings(jobtest.Committed(t, "fate.toml")); len(w) != 0 {
		t.Errorf("warnings %q", w)
	}
	w := condensedWarnings(jobtest.Committed(t, "fate.toml", "universe.dark-energy=w", "prior.w0={ flat = [-2, 0] }"))
	if len(w) != 1 || !strings.Contains(w[0], "Pantheon+ stands for 1590 rows") {
		t.Errorf("warnings %q", w)
	}
}

// Data that lie far out in a normal prior contradict it.
func TestWarningOfContradiction(t *testing.T) {
	r := Run{Job: jobtest.Committed(t, "bao-flat.toml", "prior.Om={ normal = [0.3, 0.001] }", "prior.hrd=101.5", "sampling.engine=quadrature")}
	if err := r.Investigate(t.Context(), nil); err != nil {
		t.Fatal(err)
	}
	if w := Build(r).Warnings; len(w) != 1 || !strings.Contains(w[0], "decided by its prior") {
		t.Errorf("in agreement: warnings %q", w)
	}
	r = Run{Job: jobtest.Committed(t, "bao-flat.toml", "prior.Om={ normal = [0.4, 0.01] }", "prior.hrd={ flat = [60, 140] }", "sampling.engine=quadrature")}
	if err := r.Investigate(t.Context(), nil); err != nil {
		t.Fatal(err)
	}
	if w := strings.Join(Build(r).Warnings, "; "); !strings.Contains(w, "standard deviations from the mean of its normal prior: data and prior contradict each other") {
		t.Errorf("in contradiction: warnings %q", w)
	}
}

// long is a view of so many steps.
func long(t *testing.T, steps int) sampler.View {
	t.Helper()
	start := [][]float64{{0, 1, 2, 3}}
	c, err := sampler.NewChain(1, start, 1, sampler.DefaultRecord)
	if err != nil {
		t.Fatal(err)
	}
	for i := range steps {
		if err := c.Append(i+1, start, start, 0); err != nil {
			t.Fatal(err)
		}
	}
	return c.View()
}
