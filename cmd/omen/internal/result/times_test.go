package result

import (
	"math"
	"testing"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/job/jobtest"
	"omen/cmd/omen/internal/outlook"
	"omen/model"
)

// In a family of w alone the time to a rip is a function of w that grows towards -1, and
// so its quantiles are those of w, however long its tail.
func TestTimeWithLongTail(t *testing.T) {
	j := jobtest.Committed(t, "bao-flat.toml", "universe.dark-energy=w", "prior.w0={ flat = [-3, 0] }", "prior.Om=0.3", "prior.hrd=101.5")
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
