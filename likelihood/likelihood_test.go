package likelihood

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"omen/data"
	"omen/model"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/mat"
)

// invented is a small table of supernovae with a random positive definite
// covariance.
func invented(seed uint64, n int) (*data.Supernovae, *mat.SymDense) {
	random := rand.New(rand.NewPCG(seed, 1))
	sn := &data.Supernovae{}
	u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
	root := mat.NewDense(n, n, nil)
	for i := range n {
		z := 0.02 + 1.2*random.Float64()
		sn.Z = append(sn.Z, z)
		sn.ZHel = append(sn.ZHel, z*(1+1e-3*random.NormFloat64()))
		sn.Value = append(sn.Value, u.DistanceModulus(z, z)-19.3+0.1*random.NormFloat64())
		sn.Err = append(sn.Err, 0.1)
		for j := range n {
			root.Set(i, j, 0.02*random.NormFloat64())
		}
		root.Set(i, i, root.At(i, i)+0.1)
	}
	cov := mat.NewSymDense(n, nil)
	cov.SymOuterK(1, root)
	return sn, cov
}

// distant is a prediction for a term in a universe, by the definitions alone.
func distant(u model.Universe, m, hrd float64, t Term) *Prediction {
	p := &Prediction{Point: Point{Universe: u, M: m, HRd: hrd}, work: make([]float64, t.scratch())}
	for _, z := range t.Redshifts() {
		p.DM = append(p.DM, u.DM(z)*u.H0/model.C)
		p.DH = append(p.DH, u.DH(z)*u.H0/model.C)
	}
	return p
}

// The free offset must give the least chi-squared over all offsets, and the
// normal one that of the best compromise with its prior, both found here by
// brute force with an inverted covariance.
func TestOffsetsAgainstBruteForce(t *testing.T) {
	sn, cov := invented(3, 12)
	u := model.Universe{Om: 0.25, OL: 0.6, H0: 72, W0: -1}
	const mean, sd = -19.4, 0.05
	var inverse mat.Dense
	if err := inverse.Inverse(cov); err != nil {
		t.Fatal(err)
	}
	chi2 := func(m float64) float64 {
		r := mat.NewVecDense(len(sn.Z), nil)
		for i := range sn.Z {
			r.SetVec(i, sn.Value[i]-m-u.DistanceModulus(sn.Z[i], sn.ZHel[i]))
		}
		return mat.Inner(r, &inverse, r)
	}
	least := func(f func(float64) float64) float64 { // of a parabola, exactly
		a, b, c := f(-20), f(-19), f(-18)
		x := -19 - (c-a)/(2*(a-2*b+c))
		return f(x)
	}
	for _, c := range []struct {
		name   string
		offset Offset
		want   float64
	}{
		{"absolute", Offset{Kind: AbsoluteOffset}, chi2(-19.2)},
		{"free", Offset{}, least(chi2)},
		{"normal", Offset{Kind: NormalOffset, Mean: mean, SD: sd}, least(func(m float64) float64 { return chi2(m) + (m-mean)*(m-mean)/(sd*sd) })},
	} {
		s := must[*Supernovae](t)(NewSupernovae(sn, correlate(t, cov), c.offset, Standing{}))
		if got := s.Chi2(distant(u, -19.2, math.NaN(), s)); math.Abs(got-c.want) > 1e-8*c.want {
			t.Errorf("%s offset: chi² %.10f, want %.10f", c.name, got, c.want)
		}
	}
}

// A free offset makes chi-squared blind to H0 and M, whatever the universe.
func TestFreeOffsetIsBlindToH0(t *testing.T) {
	sn, cov := invented(5, 9)
	s := must[*Supernovae](t)(NewSupernovae(sn, correlate(t, cov), Offset{}, Standing{}))
	random := rand.New(rand.NewPCG(5, 2))
	for range 50 {
		u := model.Universe{Om: random.Float64(), OL: random.Float64(), H0: 70, W0: -1}
		a := s.Chi2(distant(u, 0, 0, s))
		u.H0 = 40 + 60*random.Float64()
		if b := s.Chi2(distant(u, 0, 0, s)); math.Abs(a-b) > 1e-7*a {
			t.Fatalf("chi² %v with H0 = 70, %v with %v", a, b, u.H0)
		}
	}
}

// The posterior's one pass over shared distances against every term by itself.
func TestPosteriorAgainstTerms(t *testing.T) {
	sn, cov := invented(7, 20)
	supernovae := must[*Supernovae](t)(NewSupernovae(sn, correlate(t, cov), Offset{}, Standing{}))
	bao := must[*BAO](t)(NewBAO(&data.BAO{Z: []float64{0.7, 0.3, 0.7, 2.3}, Value: []float64{17.3, 8, 19.5, 4.5}, Err: []float64{0.2, 0.1, 0.3, 0.2},
		Quantity: []data.Quantity{data.DMOverRd, data.DVOverRd, data.DHOverRd, data.DMOverDH}}, nil))
	ages := must[*Ages](t)(NewAges(&data.Ages{Z: []float64{0, 1}, Age: []float64{15, 3}, Err: []float64{0.5, 0.4},
		Bound: []data.Bound{data.LowerBound, data.Measured}}, nil))
	rates := must[*Rates](t)(NewRates(&data.Rates{Z: []float64{0.3, 1.5}, H: []float64{80, 150}, Err: []float64{4, 9}}, nil))
	f := Family{FromTemperature: true, RequireBigBang: true, DarkEnergy: W0Wa, Fixed: map[string]float64{"rd": 147},
		Free: []Parameter{param(t, "H0", 50, 90), param(t, "Om", 0, 1), param(t, "OL", -0.5, 1.5), param(t, "wa", -1, 1), param(t, "w0", -2, 0)}}
	p := posterior(t, f, supernovae, bao, ages, rates)
	e := p.Evaluator()
	random := rand.New(rand.NewPCG(7, 2))
	lo, hi := p.Space().Box()
	checked := 0
	for range 300 {
		x := make([]float64, len(lo))
		for i := range x {
			x[i] = lo[i] + (hi[i]-lo[i])*random.Float64()
		}
		var pt Point
		p.Space().Point(x, &pt)
		want := 0.0
		for _, term := range p.Terms() {
			want += term.Chi2(distant(pt.Universe, pt.M, pt.HRd, term))
		}
		got := e.Chi2(x)
		if !pt.Universe.HasBigBang() {
			want = math.NaN()
		}
		if math.IsNaN(want) != math.IsNaN(got) || math.Abs(got-want) > 1e-6*want {
			t.Fatalf("at %v: chi² %v, the terms by themselves %v", x, got, want)
		}
		if !math.IsNaN(want) {
			checked++
		}
	}
	if checked < 100 {
		t.Errorf("only %d universes had distances", checked)
	}
}

// A lower bound on an age must not punish an older universe.
func TestAgeBoundIsOneSided(t *testing.T) {
	ages := must[*Ages](t)(NewAges(&data.Ages{Z: []float64{0}, Age: []float64{13}, Err: []float64{0.5}, Bound: []data.Bound{data.LowerBound}}, nil))
	older := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1} // 13.467 Gyr
	if got := ages.Chi2(distant(older, 0, 0, ages)); got != 0 {
		t.Errorf("an older universe costs %v", got)
	}
	younger := model.Universe{Om: 1, H0: 70, W0: -1} // 2/3 of 13.968 Gyr
	d := (13 - 2.0/3*model.HubbleTime1/70) / 0.5
	if got := ages.Chi2(distant(younger, 0, 0, ages)); math.Abs(got-d*d) > 1e-9 {
		t.Errorf("a younger universe costs %v, want %v", got, d*d)
	}
}

// A bound is a row, but no degree of freedom; a marginalised offset is a parameter.
func TestDegreesOfFreedom(t *testing.T) {
	sn, _ := invented(7, 20)
	ages := must[*Ages](t)(NewAges(&data.Ages{Z: []float64{0, 1, 0.5}, Age: []float64{15, 3, 5}, Err: []float64{0.5, 0.4, 0.5},
		Bound: []data.Bound{data.LowerBound, data.Measured, data.LowerBound}}, nil))
	f := Family{Flat: true, Free: []Parameter{param(t, "H0", 50, 90), param(t, "Om", 0, 1)}}
	p := posterior(t, f, must[*Supernovae](t)(NewSupernovae(sn, nil, Offset{}, Standing{})), ages)
	if rows, n, parameters, dof := p.Rows(), p.Measurements(), p.Parameters(), p.DegreesOfFreedom(); rows != 23 || n != 21 || parameters != 3 || dof != 18 {
		t.Errorf("%d rows, %d measurements, %d parameters, %d degrees of freedom, want 23, 21, 3, 18", rows, n, parameters, dof)
	}
}

// Every prior integrates to one over its range.
func TestPriorsAreNormalised(t *testing.T) {
	for _, p := range []Prior{
		must[Prior](t)(Flat(-0.5, 1.8)),
		must[Prior](t)(LogFlat(0.1, 30)),
		must[Prior](t)(Normal(0.02218, 0.00055)),
		must[Prior](t)(Truncated(70, 5, 72, 90)),
		must[Prior](t)(Truncated(0, 1, 4, 9)),
	} {
		lo, hi := p.Range()
		got := quad.Fixed(func(x float64) float64 { return math.Exp(p.LogDensity(x)) }, lo, hi, 400, nil, 0)
		if math.Abs(got-1) > 1e-6 {
			t.Errorf("%s integrates to %v", p.String(), got)
		}
		half := p.Quantile(0.5)
		got = quad.Fixed(func(x float64) float64 { return math.Exp(p.LogDensity(x)) }, lo, half, 400, nil, 0)
		if math.Abs(got-0.5) > 1e-6 {
			t.Errorf("%s: %v lies below its median", p.String(), got)
		}
		if !math.IsInf(p.LogDensity(math.NaN()), -1) {
			t.Errorf("%s has a density at NaN", p.String())
		}
	}
}

// Terms that need what the space does not know are refused with a remedy.
func TestNeeds(t *testing.T) {
	sn, _ := invented(1, 4)
	flat := Family{Flat: true, Free: []Parameter{param(t, "Om", 0, 1)}}
	absolute := must[*Supernovae](t)(NewSupernovae(sn, nil, Offset{Kind: AbsoluteOffset}, Standing{}))
	bao := must[*BAO](t)(NewBAO(&data.BAO{Z: []float64{0.3}, Value: []float64{8}, Err: []float64{1}, Quantity: []data.Quantity{data.DVOverRd}}, nil))
	for _, c := range []struct {
		term  Term
		fixed map[string]float64
		want  string
	}{
		{absolute, nil, "need H0"},
		{absolute, map[string]float64{"H0": 70}, "need M"},
		{bao, nil, "need the sound horizon"},
		{bao, map[string]float64{"rd": 147}, "need the sound horizon"},
		{bao, map[string]float64{"rd": 147, "H0": 70}, ""},
		{bao, map[string]float64{"ob": 0.022, "H0": 70}, ""},
	} {
		f := flat
		f.Fixed = c.fixed
		_, err := NewPosterior(must[*Space](t)(NewSpace(f)), c.term)
		if (err == nil) != (c.want == "") || err != nil && !strings.Contains(err.Error(), c.want) {
			t.Errorf("%T with %v: got %v, want %q", c.term, c.fixed, err, c.want)
		}
	}
}

// Neither the few nodes, the many, nor the direct evaluation allocates.
func TestNoAllocation(t *testing.T) {
	p := posterior(t, curvedFamily(t), surveyTerm(t, 9, 60, Offset{}))
	e := p.Evaluator()
	for _, c := range []struct {
		x      []float64
		direct bool
	}{{[]float64{0.3, 0.7}, false}, {[]float64{0.3, 1.6}, false}, {[]float64{0.3, noBigBang(0.3) - 1e-10}, true}} {
		before := p.DirectEvaluations()
		if n := testing.AllocsPerRun(100, func() { e.LogDensity(c.x) }); n != 0 {
			t.Errorf("%v allocations per evaluation at %v", n, c.x)
		}
		if (p.DirectEvaluations() > before) != c.direct {
			t.Errorf("at %v: %d direct evaluations", c.x, p.DirectEvaluations()-before)
		}
	}
}

func Example() {
	om, _ := Flat(0, 1)
	space, err := NewSpace(Family{Flat: true, Free: []Parameter{{"Om", om}}})
	if err != nil {
		fmt.Println(err)
		return
	}
	sn := &data.Supernovae{Z: []float64{0.05, 0.5, 1}, Value: []float64{17.3, 22.9, 24.8}, Err: []float64{0.1, 0.1, 0.1}}
	term, err := NewSupernovae(sn, nil, Offset{}, Standing{})
	if err != nil {
		fmt.Println(err)
		return
	}
	p, err := NewPosterior(space, term)
	if err != nil {
		fmt.Println(err)
		return
	}
	e := p.Evaluator()
	fmt.Printf("chi² %.3f at Om = 0.3, %.3f at Om = 1\n", e.Chi2([]float64{0.3}), e.Chi2([]float64{1}))
	// Output: chi² 0.905 at Om = 0.3, 23.351 at Om = 1
}
