package result

import (
	"math"
	"os"
	"path/filepath"
	"strings"
	"testing"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/outlook"
	"omen/cmd/omen/internal/runfile"
	"omen/model"
	"omen/sampler"
)

// committed reads a committed run with settings on top.
func committed(t *testing.T, name string, sets ...string) *job.Job {
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

// In a family of w alone the time to a rip is a function of w that grows towards -1, and
// so its quantiles are those of w, however long its tail.
func TestTimeWithLongTail(t *testing.T) {
	j := committed(t, "bao-flat.toml", "universe.dark-energy=w", "prior.w0={ flat = [-3, 0] }", "prior.Om=0.3", "prior.hrd=101.5")
	e, err := exact.Integrate(t.Context(), j.Posterior, nil, 0)
	if err != nil {
		t.Fatal(err)
	}
	var rip outlook.Event
	for _, event := range outlook.Events(false) {
		if event.Name == "rip" {
			rip = event
		}
	}
	got, w := exactTime(rip, e, false), e.Marginal(0)
	at := func(p float64) float64 {
		u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: w.Quantile(p * float64(got.Probability))}
		return u.Rip() / u.HubbleTime()
	}
	if p := float64(got.Probability); !(p > 0.1 && p < 0.9) {
		t.Fatalf("P(rip) = %v: nothing to test", p)
	}
	for _, q := range []struct {
		p, within float64
		got       Number
	}{ // where w is within 0.002 of -1, a thousandth of its own width is a tenth of the time
		{0.025, 0.02, got.Interval95[0]}, {0.16, 0.01, got.Interval68[0]}, {0.5, 0.01, got.Median},
		{0.84, 0.01, got.Interval68[1]}, {0.975, 0.15, got.Interval95[1]},
	} {
		if want := at(q.p); math.Abs(float64(q.got)/want-1) > q.within {
			t.Errorf("quantile %v: %.4f, want %.4f", q.p, float64(q.got), want)
		}
	}
}

// Ensembles that disagree are told of once, with what they disagree about.
func TestWarningOfStuckWalkers(t *testing.T) {
	r := Run{Job: committed(t, "bao-flat.toml")}
	good := sampler.Convergence{ESS: 5000, RHat: 1.001, Tau: 10}
	check := &r.Outcome.Check
	check.Times, check.Parameters = 500, []sampler.Convergence{good, good}
	if w := chainWarnings(r); len(w) != 0 {
		t.Errorf("warnings %q", w)
	}
	check.Times, check.Parameters[1].ESS = 0, 0
	if w := chainWarnings(r); len(w) != 1 || !strings.Contains(w[0], "see hrd; most likely there is a second region") {
		t.Errorf("warnings %q", w)
	}
	check.Times, check.Parameters[1].ESS = 350, 3000
	if w := chainWarnings(r); len(w) != 2 || !strings.Contains(w[0], "below the goal of 4000") || !strings.Contains(w[1], "350 autocorrelation times long, below 400") {
		t.Errorf("warnings %q", w)
	}
}

// A table condensed for Λ is no table for w.
func TestWarningOfCondensedTables(t *testing.T) {
	if w := condensedWarnings(committed(t, "fate.toml")); len(w) != 0 {
		t.Errorf("warnings %q", w)
	}
	w := condensedWarnings(committed(t, "fate.toml", "universe.dark-energy=w", "prior.w0={ flat = [-2, 0] }"))
	if len(w) != 1 || !strings.Contains(w[0], "Pantheon+ stands for 1590 rows") {
		t.Errorf("warnings %q", w)
	}
}
