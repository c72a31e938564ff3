package sampler

import "testing"

// A glance misjudges no chain by so much that a run would go past its goal, and
// sees that half of a chain is not enough.
func TestGlanceAgreesWithAssessment(t *testing.T) {
	g := gaussian()
	for _, goal := range []float64{9000, 15000} {
		s := Settings{Seed: 5, Effective: goal, MaxSteps: 1e5}
		c, densities := g.newChain(t, 4, 5, 1, DefaultRecord)
		out := mustRun(t, t.Context(), densities, c, s, nil)
		if out.Stop != Converged {
			t.Fatal(out.Stop)
		}
		quick := glance(c, s)
		if ratio := quick.ESS() / out.Check.ESS(); ratio < 0.75 || ratio > 1.1 || quick.hopeless(s) {
			t.Errorf("goal %g: a glance at ESS %.0f sees %.0f", goal, out.Check.ESS(), quick.ESS())
		}
		short, densities := g.newChain(t, 4, 5, 1, DefaultRecord)
		out = mustRun(t, t.Context(), densities, short, Settings{Seed: 5, MaxSteps: c.Steps() / 2}, nil)
		if !glance(short, s).hopeless(s) {
			t.Errorf("goal %g: half the chain, ESS %.0f, does not look hopeless", goal, out.Check.ESS())
		}
	}
}
