package nested

import (
	"context"
	"math"
	"testing"

	"omen/cmd/omen/internal/outlook"
	"omen/data"
	"omen/likelihood"
	"omen/model"
)

// supernovae are n distance moduli between z = 0.02 and 2, evenly in ln(1+z), as a
// universe has them: without noise, of which error tells. Their common offset is free.
func supernovae(t testing.TB, u model.Universe, n int, err float64) likelihood.Term {
	t.Helper()
	u.H0 = 70
	sn := &data.Supernovae{}
	for i := range n {
		z := math.Exp(math.Log(1.02)+(math.Log(3)-math.Log(1.02))*float64(i)/float64(n-1)) - 1
		sn.Z = append(sn.Z, z)
		sn.Value = append(sn.Value, u.DistanceModulus(z, z))
		sn.Err = append(sn.Err, err)
	}
	term, e := likelihood.NewSupernovae(sn, nil, likelihood.Offset{}, likelihood.Standing{})
	if e != nil {
		t.Fatal(e)
	}
	return term
}

func flat(t testing.TB, lo, hi float64) likelihood.Prior {
	t.Helper()
	p, err := likelihood.Flat(lo, hi)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

// curved is the family of Om and OL.
func curved(t testing.TB) likelihood.Family {
	t.Helper()
	return likelihood.Family{RequireBigBang: true, Free: []likelihood.Parameter{
		{Name: "Om", Prior: flat(t, 0, 2)}, {Name: "OL", Prior: flat(t, -0.5, 1.8)}}}
}

func posterior(t testing.TB, f likelihood.Family, terms ...likelihood.Term) *likelihood.Posterior {
	t.Helper()
	space, err := likelihood.NewSpace(f)
	if err != nil {
		t.Fatal(err)
	}
	p, err := likelihood.NewPosterior(space, terms...)
	if err != nil {
		t.Fatal(err)
	}
	return p
}

func compare(t testing.TB, p *likelihood.Posterior, own Own, o Options) *Comparison {
	t.Helper()
	c, err := Compare(context.Background(), p, own, o)
	if err != nil {
		t.Fatal(err)
	}
	return c
}

func fate(f model.Fate) func(outlook.Label) bool {
	return func(l outlook.Label) bool { return l.Fate == f }
}

// Precise distances tell the fate: 50 supernovae of 0.01 mag each to z = 2, which is
// 200 of 0.02 or 5000 of 0.1, give each true fate more than 0.97. The hardest is open, of matter alone, which a
// little dark energy of either sign would turn into something else. The family has a curvature and a constant; for
// the phantom it is flat with w.
func TestFateOfTheTruth(t *testing.T) {
	flatW := likelihood.Family{Flat: true, DarkEnergy: likelihood.W, RequireBigBang: true, Free: []likelihood.Parameter{
		{Name: "Om", Prior: flat(t, 0, 1)}, {Name: "w0", Prior: flat(t, -3, 1)}}}
	for _, c := range []struct {
		name   string
		u      model.Universe
		want   model.Fate
		family likelihood.Family
	}{
		{"coasting", model.Universe{W0: -1}, model.Coasting, curved(t)},
		{"critical", model.Universe{Om: 1, W0: -1}, model.Critical, curved(t)},
		{"open, matter alone", model.Universe{Om: 0.3, W0: -1}, model.Decelerating, curved(t)},
		{"closed, matter alone", model.Universe{Om: 1.4, W0: -1}, model.Recollapse, curved(t)},
		{"flat with a constant", model.Universe{Om: 0.3, OL: 0.7, W0: -1}, model.Accelerating, curved(t)},
		{"closed with a constant, recollapsing", model.Universe{Om: 1.8, OL: 0.01, W0: -1}, model.Recollapse, curved(t)},
		{"phantom", model.Universe{Om: 0.3, OL: 0.7, W0: -1.3}, model.BigRip, flatW},
	} {
		t.Run(c.name, func(t *testing.T) {
			if got := c.u.Fate(); got != c.want {
				t.Fatalf("the truth is %v", got)
			}
			p := posterior(t, c.family, supernovae(t, c.u, 50, 0.01))
			got := compare(t, p, Own{}, Options{Seed: 1}).Average(fate(c.want))
			t.Logf("P(%v) = %.4f", c.want, got.P)
			if !(got.P > 0.97) {
				t.Errorf("P(%v) = %.4f ± %.1g", c.want, got.P, got.Err)
			}
		})
	}
}

// Useless data leave the prior odds, whatever the truth: those of the models, and with
// them the fates that a model is sure of.
func TestUselessData(t *testing.T) {
	odds := map[string]float64{"critical": 2, "coasting": 0.5}
	for _, u := range []model.Universe{{Om: 1, W0: -1}, {Om: 0.3, OL: 0.7, W0: -1}} {
		p := posterior(t, curved(t), supernovae(t, u, 20, 200))
		c := compare(t, p, Own{}, Options{Seed: 1, Odds: odds})
		total := 0.0
		for _, m := range c.Models {
			total += m.Odds
		}
		for _, m := range c.Models {
			if d := math.Abs(m.Probability.Value - m.Odds/total); !(d < 1e-3) {
				t.Errorf("truth %+v: %s has probability %.5f, prior %.5f", u, m.Name, m.Probability.Value, m.Odds/total)
			}
		}
		for f, want := range map[model.Fate]float64{model.Critical: 2 / total, model.Coasting: 0.5 / total} {
			if got := c.Average(fate(f)); math.Abs(got.P-want) > 1e-3 {
				t.Errorf("truth %+v: P(%v) = %.5f, prior %.5f", u, f, got.P, want)
			}
		}
	}
}

// A sum over all fates is one, within a model and averaged, for every prior.
func TestFatesAddUp(t *testing.T) {
	f := likelihood.Family{Flat: true, DarkEnergy: likelihood.W, RequireBigBang: true, Free: []likelihood.Parameter{
		{Name: "Om", Prior: flat(t, 0, 1.2)}, {Name: "w0", Prior: flat(t, -3, 1)}}}
	p := posterior(t, f, supernovae(t, model.Universe{Om: 0.3, OL: 0.7, W0: -1}, 30, 0.1))
	c := compare(t, p, Own{}, Options{})
	all := []*Comparison{c}
	for _, a := range Alternatives(f) {
		u, _, err := c.Under(a)
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, u)
	}
	if len(all) != 2 {
		t.Fatalf("%d priors", len(all))
	}
	for _, c := range all {
		sum := 0.0
		for _, s := range outlook.Fates() {
			sum += c.Average(s.Holds).P
		}
		if math.Abs(sum-1) > 1e-6 {
			t.Errorf("the fates add up to %.8f", sum)
		}
	}
}

// magnitudes are n magnitudes of candles of M = 0, without noise.
func magnitudes(t testing.TB, u model.Universe, n int, err float64) likelihood.Term {
	t.Helper()
	u.H0 = 70
	sn := &data.Supernovae{}
	for i := range n {
		z := 0.02 + float64(i)/float64(n)
		sn.Z, sn.Value, sn.Err = append(sn.Z, z), append(sn.Value, u.DistanceModulus(z, z)), append(sn.Err, err)
	}
	term, e := likelihood.NewSupernovae(sn, nil, likelihood.Offset{Kind: likelihood.AbsoluteOffset}, likelihood.Standing{})
	if e != nil {
		t.Fatal(e)
	}
	return term
}
