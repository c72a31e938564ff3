package nested

import (
	"context"
	"math"
	"testing"

	"omen/cmd/omen/internal/exact"
	"omen/likelihood"
	"omen/model"

	"github.com/google/go-cmp/cmp"
)

func names(models []Model) (out []string) {
	for _, m := range models {
		name := m.Name
		if m.Own {
			name += " *"
		}
		out = append(out, name)
	}
	return out
}

// What a family contains, and what the models keep of it.
func TestModels(t *testing.T) {
	om := likelihood.Parameter{Name: "Om", Prior: flat(t, 0, 1)}
	ol := likelihood.Parameter{Name: "OL", Prior: flat(t, 0, 1)}
	w0 := likelihood.Parameter{Name: "w0", Prior: flat(t, -2, 0)}
	wa := likelihood.Parameter{Name: "wa", Prior: flat(t, -2, 2)}
	hrd := likelihood.Parameter{Name: "hrd", Prior: flat(t, 60, 140)}
	free := func(p ...likelihood.Parameter) []likelihood.Parameter { return p }
	for _, c := range []struct {
		name   string
		family likelihood.Family
		want   []string
	}{
		{"curved", likelihood.Family{Free: free(om, ol, hrd)}, []string{"coasting", "critical", "matter-only", "flat-lambda", "curved-lambda *"}},
		{"flat", likelihood.Family{Flat: true, Free: free(om)}, []string{"critical", "flat-lambda *"}},
		{"flat w", likelihood.Family{Flat: true, DarkEnergy: likelihood.W, Free: free(om, w0)}, []string{"critical", "flat-lambda", "flat-w *"}},
		{"curved w0-wa", likelihood.Family{DarkEnergy: likelihood.W0Wa, Free: free(om, ol, w0, wa)},
			[]string{"coasting", "critical", "matter-only", "flat-lambda", "curved-lambda", "flat-w", "curved-w", "flat-w0-wa", "curved-w0-wa *"}},
		{"w held elsewhere", likelihood.Family{DarkEnergy: likelihood.W, Free: free(om, ol), Fixed: map[string]float64{"w0": -0.9}},
			[]string{"coasting", "critical", "matter-only", "flat-w", "curved-w *"}},
		{"Om held", likelihood.Family{Free: free(ol), Fixed: map[string]float64{"Om": 0.3}}, []string{"matter-only", "flat-lambda", "curved-lambda *"}},
		{"matter only", likelihood.Family{Free: free(om), Fixed: map[string]float64{"OL": 0}}, []string{"coasting", "critical", "matter-only *"}},
		{"OL held", likelihood.Family{Free: free(om), Fixed: map[string]float64{"OL": 0.7}}, []string{"curved-lambda *"}},
	} {
		got := Models(c.family)
		if diff := cmp.Diff(c.want, names(got)); diff != "" {
			t.Errorf("%s: (-want +got)\n%s", c.name, diff)
		}
		for _, m := range got {
			if _, err := likelihood.NewSpace(m.Family); err != nil {
				t.Errorf("%s: %s: %v", c.name, m.Name, err)
			}
		}
	}
}

// A critical universe with radiation is critical, an empty one empty.
func TestModelsAreWhatTheySay(t *testing.T) {
	f := curved(t)
	f.Radiation = 1e-4
	want := map[string]model.Fate{"coasting": model.Coasting, "critical": model.Critical}
	for _, m := range Models(f) {
		fate, ok := want[m.Name]
		if !ok {
			continue
		}
		space, err := likelihood.NewSpace(m.Family)
		if err != nil {
			t.Fatal(err)
		}
		var p likelihood.Point
		space.Point(nil, &p)
		if got := p.Universe.Fate(); got != fate {
			t.Errorf("%s: %+v is %v", m.Name, p.Universe, got)
		}
	}
}

// The admitted fraction of a prior against the area above the line without a big bang,
// Om ≥ 0, OL ≥ 4 Om coss³(arccoss((1-Om)/Om)/3) (Carroll, Press & Turner 1992).
func TestVolume(t *testing.T) {
	space, err := likelihood.NewSpace(curved(t)) // Om 0–2, OL -0.5–1.8
	if err != nil {
		t.Fatal(err)
	}
	const n = 400_000
	excluded := 0.0
	for i := range n {
		om := 2 * (float64(i) + 0.5) / n
		line := 0.0
		if x := (1 - om) / om; om < 0.5 {
			line = 4 * om * math.Pow(math.Cosh(math.Acosh(x)/3), 3)
		} else {
			line = 4 * om * math.Pow(math.Cos(math.Acos(x)/3), 3)
		}
		excluded += math.Max(0, 1.8-line) / 2.3 / n
	}
	got, err := Volume(context.Background(), space)
	if err != nil {
		t.Fatal(err)
	}
	if d := math.Abs(math.Exp(got.Value) - (1 - excluded)); !(d < 1e-5) {
		t.Errorf("admitted %.7f, want %.7f", math.Exp(got.Value), 1-excluded)
	}
	counted, err := (&volume{space: space}).count()
	if err != nil {
		t.Fatal(err)
	}
	if d := math.Abs(counted.Value - got.Value); !(d < 3*counted.Err) {
		t.Errorf("counted %.6f ± %.1g, integrated %.6f", counted.Value, counted.Err, got.Value)
	}
}

// Bridge sampling against the integral, where both can be had.
func TestBridgeAgainstExact(t *testing.T) {
	w := likelihood.Family{Flat: true, DarkEnergy: likelihood.W, RequireBigBang: true, Free: []likelihood.Parameter{
		{Name: "Om", Prior: flat(t, 0, 1)}, {Name: "w0", Prior: flat(t, -3, 1)}}}
	for name, f := range map[string]likelihood.Family{"curved": curved(t), "flat w": w} {
		p := posterior(t, f, supernovae(t, model.Universe{Om: 0.3, OL: 0.7, W0: -1}, 60, 0.05))
		e, err := exact.Integrate(context.Background(), p, nil, 0)
		if err != nil {
			t.Fatal(err)
		}
		drawn, best, err := explore(context.Background(), p, Options{Seed: 3})
		if err != nil {
			t.Fatal(err)
		}
		want, got := compare(t, p, Own{Exact: e}, Options{}), compare(t, p, Own{Drawn: drawn, Best: best}, Options{Seed: 3})
		a, b := want.Models[want.Own()], got.Models[got.Own()]
		if a.Method != "quadrature" || b.Method != "bridge sampling" {
			t.Fatalf("%s: methods %s, %s", name, a.Method, b.Method)
		}
		d := math.Abs(a.LogEvidence.Value - b.LogEvidence.Value)
		t.Logf("%s: ln evidence %.5f, bridge %.5f ± %.4f", name, a.LogEvidence.Value, b.LogEvidence.Value, b.LogEvidence.Err)
		if !(d < 3.5*b.LogEvidence.Err) || !(b.LogEvidence.Err < 0.05) {
			t.Errorf("%s: ln evidence %.5f, bridge %.5f ± %.4f", name, a.LogEvidence.Value, b.LogEvidence.Value, b.LogEvidence.Err)
		}
		if !(math.Abs(a.Chi2-b.Chi2) < 1e-4) {
			t.Errorf("%s: best fits of chi² %.6f and %.6f", name, a.Chi2, b.Chi2)
		}
	}
}

// The evidence of nothing free is the likelihood of the point; with a Gaussian
// parameter it is known in closed form: magnitudes with M free have
// ln Z = -chi²/2 + ln(σ_M √2π / range), σ_M = error/√n.
func TestClosedForms(t *testing.T) {
	u := model.Universe{Om: 0.3, OL: 0.7, W0: -1}
	p := posterior(t, curved(t), supernovae(t, u, 40, 0.1))
	for _, m := range compare(t, p, Own{}, Options{}).Models {
		if m.Method == "point" && math.Abs(m.LogEvidence.Value+m.Chi2/2) > 1e-12 {
			t.Errorf("%s: ln evidence %v, chi² %v", m.Name, m.LogEvidence.Value, m.Chi2)
		}
	}
	f := likelihood.Family{Flat: true, RequireBigBang: true, Fixed: map[string]float64{"Om": 0.3, "H0": 70},
		Free: []likelihood.Parameter{{Name: "M", Prior: flat(t, -1, 1)}}}
	const n, err = 25, 0.1
	q := posterior(t, f, magnitudes(t, u, n, err))
	e, e1 := exact.Integrate(context.Background(), q, nil, 0)
	if e1 != nil {
		t.Fatal(e1)
	}
	want := math.Log(err / math.Sqrt(n) * math.Sqrt(2*math.Pi) / 2)
	if d := math.Abs(e.LogEvidence.Value - want); !(d < 1e-6) {
		t.Errorf("ln evidence %.9f, want %.9f", e.LogEvidence.Value, want)
	}
	if d := math.Abs(e.Marginal(0).SD - err/math.Sqrt(n)); !(d < 1e-7) {
		t.Errorf("sd %.9f", e.Marginal(0).SD)
	}
}

// A flat prior on (Om, q0) in a flat universe with w is one with the density
// |∂q0/∂w0| = 3 (1-Om)/2: reweighting must give what a sum over that density does.
func TestPriorByReweighting(t *testing.T) {
	f := likelihood.Family{Flat: true, DarkEnergy: likelihood.W, RequireBigBang: true, Free: []likelihood.Parameter{
		{Name: "Om", Prior: flat(t, 0, 0.9)}, {Name: "w0", Prior: flat(t, -2.5, -0.2)}}}
	p := posterior(t, f, supernovae(t, model.Universe{Om: 0.3, OL: 0.7, W0: -1.05}, 30, 0.08))
	c := compare(t, p, Own{}, Options{Odds: map[string]float64{"critical": 0, "flat-lambda": 0}})
	var q0 Alternative
	for _, a := range Alternatives(f) {
		q0 = a
	}
	under, left, err := c.Under(q0)
	if err != nil {
		t.Fatal(err)
	}
	density := p.Evaluator().LogDensity
	const n, m = 300, 345 // w = -1 lies between two cells of w
	var all, rip, before, oldRip, mean float64
	for i := range n {
		om := 0.9 * (float64(i) + 0.5) / n
		mean += 1.5 * (1 - om) / n // of the ratio over the old prior
		for k := range m {
			w := -2.5 + 2.3*(float64(k)+0.5)/m
			v := math.Exp(density([]float64{om, w}))
			before, all = before+v, all+v*1.5*(1-om)
			if w < -1 {
				oldRip, rip = oldRip+v, rip+v*1.5*(1-om)
			}
		}
	}
	was, is := c.Average(fate(model.BigRip)).P, under.Average(fate(model.BigRip)).P
	if math.Abs(was-oldRip/before) > 1e-4 || math.Abs(is-rip/all) > 1e-4 || math.Abs(was-is) < 0.005 {
		t.Errorf("P(rip) %.5f, want %.5f; %.5f under the other prior, want %.5f", was, oldRip/before, is, rip/all)
	}
	if !(left > 0.5 && left < 1) {
		t.Errorf("%.3f of the sample is left", left)
	}
	own := under.Own()
	gain := under.Models[own].LogEvidence.Value - c.Models[own].LogEvidence.Value
	if want := math.Log(all / before / mean); math.Abs(gain-want) > 1e-3 {
		t.Errorf("ln evidence gains %.5f, want %.5f", gain, want)
	}
}
