package likelihood

import (
	"math"
	"math/rand/v2"
	"testing"

	"omen/data"
)

// defaultFamilies are what a run file that says little allows.
func defaultFamilies(t testing.TB) map[string]Family {
	om, ol := param(t, "Om", 0, 1.5), param(t, "OL", -0.5, 1.8)
	w0, wa := param(t, "w0", -3, 1), param(t, "wa", -3, 2)
	return map[string]Family{
		"constant":            {Free: []Parameter{om, ol}, RequireBigBang: true},
		"constant, radiation": {Free: []Parameter{om, ol}, RequireBigBang: true, FromTemperature: true},
		"w":                   {Free: []Parameter{om, ol, w0}, DarkEnergy: W, RequireBigBang: true},
		"w0-wa":               {Free: []Parameter{om, ol, w0, wa}, DarkEnergy: W0Wa, RequireBigBang: true, RequireMatterEra: true},
	}
}

// universes draws from a box of priors; every fourth universe without evolving
// dark energy is put beside the no-big-bang line.
func universes(s *Space, random *rand.Rand, n int) [][]float64 {
	lo, hi := s.Box()
	var out [][]float64
	for len(out) < n {
		x := make([]float64, len(lo))
		for i := range x {
			x[i] = lo[i] + (hi[i]-lo[i])*random.Float64()
		}
		if len(out)%4 == 0 && s.Family().DarkEnergy == Constant {
			x[1] = noBigBang(x[0]) * (1 - math.Pow(10, -8*random.Float64()))
		}
		var p Point
		s.Point(x, &p)
		if s.allowed(&p.Universe) && x[1] <= hi[1] {
			out = append(out, x)
		}
	}
	return out
}

// noBigBang is the OL from which on there was none (Carroll, Press & Turner 1992,
// ARA&A 30, 499).
func noBigBang(om float64) float64 {
	if om < 0.5 {
		return 4 * om * math.Pow(math.Cosh(math.Acosh((1-om)/om)/3), 3)
	}
	return 4 * om * math.Pow(math.Cos(math.Acos((1-om)/om)/3), 3)
}

// Condensed chi-squared of 1590 supernovae against the evaluation over all rows, in
// 10,000 universes from all over the priors and beside the no-big-bang line. The
// covariance is given by its templates, which makes the reference ten times
// faster; a matrix is compared in fewer places.
func TestCondensedAgainstDirect(t *testing.T) {
	table, templates := survey(1, 1590, 20)
	full := correlate(t, written(table.Err, templates))
	noise := must[Noise](t)(Systematics(table.Err, templates, 20))
	for name, f := range defaultFamilies(t) {
		for _, c := range []struct {
			noise Noise
			n     int
		}{{noise, 2500}, {full, 100}} {
			p := posterior(t, f, must[*Supernovae](t)(NewSupernovae(table, c.noise, Offset{}, Standing{})))
			e, d := p.Evaluator(), p.Direct().Evaluator()
			worst := 0.0
			for _, x := range universes(p.space, rand.New(rand.NewPCG(9, 9)), c.n) {
				got, want := e.Chi2(x), d.Chi2(x)
				switch {
				case math.IsNaN(got) != math.IsNaN(want):
					t.Errorf("%s, %v: chi² %v, want %v", name, x, got, want)
				case !math.IsNaN(want): // it is past the antipode of a closed universe
					worst = math.Max(worst, math.Abs(got-want))
				}
			}
			t.Logf("%s: chi² differs by at most %.2g; %d of %d evaluations were direct", name, worst, p.DirectEvaluations(), c.n)
			if worst > 1e-6 {
				t.Errorf("%s: chi² differs by %.2g", name, worst)
			}
			if n := p.DirectEvaluations(); n > c.n/10 {
				t.Errorf("%s: %d of %d evaluations were direct", name, n, c.n)
			}
		}
	}
}

// The condensed form says itself how wrong it may be. Without the fall-backs the
// error must be within what it would have let pass.
func TestCondensedErrorEstimate(t *testing.T) {
	sn := surveyTerm(t, 2, 300, Offset{})
	p := posterior(t, defaultFamilies(t)["constant"], sn)
	l := p.levels[0].scratch(nil, nil)
	xs := universes(p.space, rand.New(rand.NewPCG(5, 5)), 3000)
	rejected := 0
	d := p.Direct().Evaluator()
	for _, x := range xs {
		want := d.Chi2(x)
		var pt Point
		p.space.Point(x, &pt)
		l.fill(pt.Universe)
		got, ok := l.chi2(&pt)
		if ok && math.Abs(got-want) > 1e-6 {
			t.Errorf("%v: chi² %v let pass, want %v", x, got, want)
		}
		if !ok {
			rejected++
		}
	}
	if rejected == 0 || rejected > len(xs)/2 {
		t.Errorf("%d of %d universes were rejected", rejected, len(xs))
	}
}

// Every kind of offset, several tables each with its own, a table that stands for
// another, moduli beside magnitudes, and BAO that share the nodes: all against
// the direct evaluation.
func TestCondensedCombinations(t *testing.T) {
	one, templates := survey(3, 200, 3)
	two, _ := survey(4, 150, 0)
	moduli, _ := survey(5, 80, 0)
	moduli.Absolute = true
	for i := range moduli.Value {
		moduli.Value[i] += 19.3
	}
	full := correlate(t, written(one.Err, templates))
	sn := func(d *data.Supernovae, n Noise, o Offset, s Standing) Term {
		return must[*Supernovae](t)(NewSupernovae(d, n, o, s))
	}
	normal := Offset{Kind: NormalOffset, Mean: -19.25, SD: 0.03}
	absolute := Offset{Kind: AbsoluteOffset}
	bao := must[*BAO](t)(NewBAO(&data.BAO{Z: []float64{0.5, 2.3, 0.5, 1089}, Value: []float64{13, 8.6, 22, 94}, Err: []float64{0.2, 0.1, 0.3, 0.1},
		Quantity: []data.Quantity{data.DMOverRd, data.DHOverRd, data.DHOverRd, data.DMOverRd}}, nil))
	rates := must[*Rates](t)(NewRates(&data.Rates{Z: []float64{0.3, 6}, H: []float64{80, 700}, Err: []float64{4, 90}}, nil))
	for name, terms := range map[string][]Term{
		"free":              {sn(one, full, Offset{}, Standing{})},
		"normal":            {sn(one, full, normal, Standing{})},
		"absolute":          {sn(one, full, absolute, Standing{})},
		"moduli":            {sn(moduli, nil, absolute, Standing{})},
		"normal of moduli":  {sn(moduli, nil, normal, Standing{})},
		"two free":          {sn(one, full, Offset{}, Standing{}), sn(two, nil, Offset{}, Standing{Rows: 1000, Chi2: 900})},
		"all kinds":         {sn(one, full, absolute, Standing{}), sn(two, nil, Offset{}, Standing{}), sn(moduli, nil, absolute, Standing{}), sn(two, nil, normal, Standing{})},
		"with BAO and H(z)": {bao, sn(one, full, normal, Standing{}), rates, sn(moduli, nil, absolute, Standing{Chi2: 3})},
		"BAO and H(z)":      {bao, rates},
	} {
		f := Family{RequireBigBang: true, FromTemperature: true, Fixed: map[string]float64{"rd": 147},
			Free: []Parameter{param(t, "Om", 0.05, 1), param(t, "OL", 0, 1.2), param(t, "H0", 60, 80), param(t, "M", -20, -19)}}
		p := posterior(t, f, terms...)
		e, d := p.Evaluator(), p.Direct().Evaluator()
		for _, x := range universes(p.space, rand.New(rand.NewPCG(6, 6)), 100) {
			got, want := e.Chi2(x), d.Chi2(x)
			if !(math.Abs(got-want) <= 1e-6+1e-10*want) {
				t.Errorf("%s, %v: chi² %.10g, direct %.10g", name, x, got, want)
			}
		}
		if n := p.DirectEvaluations(); n > 10 {
			t.Errorf("%s: %d direct evaluations", name, n)
		}
		if d.posterior.DirectEvaluations() != 0 {
			t.Errorf("%s: evaluations of a direct posterior are counted", name)
		}
	}
}

// Templates are the same as the covariance that they stand for, condensed, direct
// and as the errors of single rows.
func TestSystematicsAgainstCovariance(t *testing.T) {
	for _, offset := range []Offset{{}, {Kind: NormalOffset, Mean: -19.2, SD: 0.05}} {
		table, templates := survey(7, 700, 5)
		cov := written(table.Err, templates)
		noise := must[Noise](t)(Systematics(table.Err, templates, 5))
		for i := range table.Err {
			if d := noise.Sigma(i)/math.Sqrt(cov.At(i, i)) - 1; math.Abs(d) > 1e-14 {
				t.Fatalf("error of row %d differs by %.2g", i, d)
			}
		}
		f := curvedFamily(t)
		f.Free = append(f.Free, param(t, "H0", 60, 80))
		a := posterior(t, f, must[*Supernovae](t)(NewSupernovae(table, noise, offset, Standing{})))
		b := posterior(t, f, must[*Supernovae](t)(NewSupernovae(table, correlate(t, cov), offset, Standing{})))
		ea, eb, da := a.Evaluator(), b.Direct().Evaluator(), a.Direct().Evaluator()
		for _, x := range universes(a.space, rand.New(rand.NewPCG(8, 8)), 200) {
			want := eb.Chi2(x)
			if math.IsNaN(want) { // past the antipode
				continue
			}
			if got := ea.Chi2(x); !(math.Abs(got-want) <= 1e-6) {
				t.Errorf("%v: condensed chi² %.10g, want %.10g", x, got, want)
			}
			if got := da.Chi2(x); !(math.Abs(got-want) <= 1e-6) {
				t.Errorf("%v: direct chi² %.10g, want %.10g", x, got, want)
			}
		}
	}
	if _, err := Systematics([]float64{1, 1}, []float64{1, 2, 3}, 2); err == nil {
		t.Error("three numbers are two templates of two rows")
	}
}

// A triangle given row by row is the factor of all rows: its columns have their
// norms and products.
func TestTriangle(t *testing.T) {
	random := rand.New(rand.NewPCG(11, 11))
	const n, c = 3*pieceRows + 7, 9
	a := make([]float64, n*c)
	for i := range a {
		a[i] = random.NormFloat64()
	}
	tri := newTriangle(c)
	tri.add(a)
	r := tri.rows()
	for i := range c {
		for j := range c {
			want, got := 0.0, 0.0
			for k := range n {
				want += a[k*c+i] * a[k*c+j]
			}
			for k := range c {
				got += r[k*c+i] * r[k*c+j]
			}
			if math.Abs(got-want) > 1e-9 {
				t.Errorf("product of columns %d and %d is %v, want %v", i, j, got, want)
			}
			if j < i && r[i*c+j] != 0 {
				t.Errorf("element %d, %d is %v", i, j, r[i*c+j])
			}
		}
	}
}
