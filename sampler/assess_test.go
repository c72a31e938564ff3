package sampler

import (
	"math"
	"testing"
)

// Each criterion alone can hold a run up.
func TestWhatAChainMustShow(t *testing.T) {
	good := Convergence{ESS: 5000, RHat: 1.002, Tau: 30}
	s := Settings{Effective: 4000}
	for _, c := range []struct {
		name string
		p    Convergence
		long float64
		s    Settings
		want bool
	}{
		{"all met", good, 400, s, true},
		{"no goal", good, 400, Settings{}, false},
		{"too few", Convergence{ESS: 3999, RHat: 1.002, Tau: 30}, 400, s, false},
		{"unknown ESS", Convergence{ESS: math.NaN(), RHat: 1.002, Tau: 30}, 400, s, false},
		{"R-hat", Convergence{ESS: 5000, RHat: 1.011, Tau: 30}, 400, s, false},
		{"unknown R-hat", Convergence{ESS: 5000, RHat: math.NaN(), Tau: 30}, 400, s, false},
		{"too short for its τ", good, 399, s, false},
		{"unknown τ", good, math.NaN(), s, false},
		{"the caller's own", good, 400, Settings{Effective: 4000, Enough: func(View) bool { return false }}, false},
	} {
		check := Check{Parameters: []Convergence{good, c.p}, Times: c.long}
		if got := check.passes(c.s); got != c.want {
			t.Errorf("%s: %t, want %t", c.name, got, c.want)
		}
	}
}

func TestCheckNamesTheSlowest(t *testing.T) {
	c := Check{Parameters: []Convergence{{ESS: 5000, RHat: 1.002}, {ESS: 700, RHat: 1.03}, {ESS: 900, RHat: 1}}}
	if c.ESS() != 700 || c.RHat() != 1.03 {
		t.Errorf("ESS %v, R-hat %v; want 700 and 1.03", c.ESS(), c.RHat())
	}
	c.Parameters[2] = Convergence{ESS: math.NaN(), RHat: math.NaN()}
	if c.ESS() != 0 || !math.IsInf(c.RHat(), 1) {
		t.Errorf("not known: ESS %v, R-hat %v; want 0 and +Inf", c.ESS(), c.RHat())
	}
}

// A chain of 5000 steps is judged by no more than about 2000 of them, and what
// is said of it in the check is what its sample says.
func TestAssessThinsAndAgreesWithTheSummary(t *testing.T) {
	c, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
	s := Settings{Seed: 3, MaxSteps: 5000}
	out := mustRun(t, t.Context(), densities, c, s, nil)
	v := out.Check.Sample
	if v.Steps() > 2*enoughRows || v.Steps() < enoughRows/2 {
		t.Errorf("a sample of %d steps", v.Steps())
	}
	for i, p := range out.Check.Parameters {
		q := Summarize(v.Coordinate(i))
		if q.ESS != p.ESS || q.RHat != p.RHat || q.Tau != p.Tau {
			t.Errorf("parameter %d: check %+v, summary %+v", i, p, q)
		}
		// Thinning must not have lost anything.
		all := measure(c.View().After(out.Check.BurnIn).Coordinate(i))
		near(t, "ESS of all steps over that of the sample", all.ess()/q.ESS, 1, 0.1)
	}
	if x := v.Number(0); x <= out.Check.BurnIn {
		t.Errorf("the sample begins at step %d, the burn-in ends at %d", x, out.Check.BurnIn)
	}
}
