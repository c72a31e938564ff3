package likelihood

import (
	"math"
	"math/rand/v2"
	"testing"

	"omen/data"
	"omen/model"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
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

// chi2s is the chi-squared of a table with a free offset and a full covariance in
// many universes, straight from the definitions: all residuals are whitened in
// one call, which is several times faster than one after the other.
func chi2s(t *testing.T, s *Supernovae, space *Space, xs [][]float64) []float64 {
	const batch = 200
	n := len(s.z)
	path := must[*model.Path](t)(model.NewPath(s.z))
	dm := make([]float64, n)
	var out []float64
	for from := 0; from < len(xs); from += batch {
		some := xs[from:min(from+batch, len(xs))]
		r := blas64.General{Rows: n, Cols: len(some), Stride: len(some), Data: make([]float64, n*len(some))}
		for c, x := range some {
			var p Point
			space.Point(x, &p)
			path.Fill(p.Universe, dm, nil)
			for i, d := range dm {
				r.Data[i*r.Stride+c] = s.target[i] - 5*math.Log10(d)
			}
		}
		blas64.Trsm(blas.Left, blas.Trans, 1, s.noise.(*correlated).u, r)
		w := make([]float64, n)
		for c := range some {
			for i := range w {
				w[i] = r.Data[i*r.Stride+c]
			}
			b := floats.Dot(s.ones, w)
			out = append(out, floats.Dot(w, w)-b*b/s.weight)
		}
	}
	return out
}

// Condensed chi-squared against the evaluation over all rows, in 10,000 universes
// from all over the priors and beside the no-big-bang line. Those that are
// evaluated directly are compared too, and must be few.
func TestCondensedAgainstDirect(t *testing.T) {
	sn := surveyTerm(t, 1, 1590, Offset{})
	for name, f := range defaultFamilies(t) {
		p := posterior(t, f, sn)
		e := p.Evaluator()
		xs := universes(p.space, rand.New(rand.NewPCG(9, 9)), 2500)
		worst := 0.0
		for i, want := range chi2s(t, sn, p.space, xs) {
			got := e.Chi2(xs[i])
			if math.IsNaN(got) != math.IsNaN(want) {
				t.Errorf("%s, %v: chi² %v, want %v", name, xs[i], got, want)
			}
			if !math.IsNaN(want) { // past the antipode of a closed universe
				worst = math.Max(worst, math.Abs(got-want))
			}
		}
		t.Logf("%s: chi² differs by at most %.2g; %d of %d evaluations were direct", name, worst, p.DirectEvaluations(), len(xs))
		if worst > 1e-6 {
			t.Errorf("%s: chi² differs by %.2g", name, worst)
		}
		if n := p.DirectEvaluations(); n > len(xs)/5 {
			t.Errorf("%s: %d of %d evaluations were direct", name, n, len(xs))
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
	for i, want := range chi2s(t, sn, p.space, xs) {
		var pt Point
		p.space.Point(xs[i], &pt)
		l.fill(pt.Universe)
		got, ok := l.chi2(&pt)
		if ok && math.Abs(got-want) > 1e-6 {
			t.Errorf("%v: chi² %v let pass, want %v", xs[i], got, want)
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
