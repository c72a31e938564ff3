package likelihood

import (
	"math"
	"math/rand/v2"
	"testing"

	"omen/data"
	"omen/model"

	"gonum.org/v1/gonum/mat"
)

// survey is an invented survey of n supernovae: redshifts from 0.01 to 2.26, dense
// where they are easy to find, in a universe with Om = 0.3, OL = 0.7, and k
// systematics of some hundredths of a magnitude that vary with redshift.
func survey(seed uint64, n, k int) (sn *data.Supernovae, templates []float64) {
	random := rand.New(rand.NewPCG(seed, 2))
	u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
	sn = &data.Supernovae{}
	for i := range n {
		f := (float64(i) + random.Float64()) / float64(n)
		sn.Z = append(sn.Z, 0.01+2.25*f*f*f)
	}
	path := newPath(sn.Z)
	dm := make([]float64, n)
	path.Fill(u, dm, nil)
	amplitude := make([]float64, k)
	for j := range amplitude {
		amplitude[j] = random.NormFloat64()
	}
	for i, z := range sn.Z {
		e := 0.1 + 0.1*random.Float64()
		shift := 0.0
		for j := range k {
			t := 0.02 * (math.Cos(float64(j)*math.Log1p(z)) + 0.3*random.NormFloat64())
			templates = append(templates, t)
			shift += amplitude[j] * t
		}
		zHel := z + 0.001*random.NormFloat64()
		sn.ZHel = append(sn.ZHel, zHel)
		sn.Err = append(sn.Err, e)
		sn.Value = append(sn.Value, 5*math.Log10((1+zHel)*dm[i]*speedOfLight/u.H0)+25-19.3+shift+e*random.NormFloat64())
	}
	return sn, templates
}

// written is the covariance of errors and templates as a matrix.
func written(errs, templates []float64) *mat.SymDense {
	n := len(errs)
	c := mat.NewSymDense(n, nil)
	c.SymOuterK(1, mat.NewDense(n, len(templates)/n, templates))
	for i, e := range errs {
		c.SetSym(i, i, c.At(i, i)+e*e)
	}
	return c
}

func surveyTerm(t testing.TB, seed uint64, n int, offset Offset) *Supernovae {
	sn, templates := survey(seed, n, 20)
	return must[*Supernovae](t)(NewSupernovae(sn, correlate(t, written(sn.Err, templates)), offset, Standing{}))
}

// Condensed chi-squared against the evaluation over all rows, over the whole
// default prior and beside its awkward edges.
func TestCondensedAgainstDirect(t *testing.T) {
	sn := surveyTerm(t, 1, 1590, Offset{})
	om, ol := param(t, "Om", 0, 1.5), param(t, "OL", -0.5, 1.8)
	w0, wa := param(t, "w0", -3, 1), param(t, "wa", -3, 2)
	for _, c := range []struct {
		name string
		f    Family
	}{
		{"constant", Family{Free: []Parameter{om, ol}, RequireBigBang: true}},
		{"constant, radiation", Family{Free: []Parameter{om, ol}, RequireBigBang: true, FromTemperature: true}},
		{"w", Family{Free: []Parameter{om, ol, w0}, DarkEnergy: W, RequireBigBang: true}},
		{"w0-wa", Family{Free: []Parameter{om, ol, w0, wa}, DarkEnergy: W0Wa, RequireBigBang: true, RequireMatterEra: true}},
	} {
		p := posterior(t, c.f, sn)
		worst, direct, second := compare(t, p, 500)
		t.Logf("%s: worst %.2g, direct %d second %d", c.name, worst, direct, second)
	}
}

func compare(t *testing.T, p *Posterior, n int) (worst float64, direct, second int) {
	random := rand.New(rand.NewPCG(9, 9))
	e, d := p.Evaluator(), p.Direct().Evaluator()
	lo, hi := p.Space().Box()
	x := make([]float64, len(lo))
	for k := 0; k < n; {
		for i := range x {
			x[i] = lo[i] + (hi[i]-lo[i])*random.Float64()
		}
		before := p.DirectEvaluations()
		got := e.Chi2(x)
		if p.DirectEvaluations() != before {
			direct++
			k++
			continue
		}
		want := d.Chi2(x)
		if math.IsNaN(want) && math.IsNaN(got) {
			continue
		}
		k++
		if math.IsNaN(want) != math.IsNaN(got) {
			t.Errorf("%v: %v, want %v", x, got, want)
			continue
		}
		if _, ok := e.levels[0].chi2(&e.point); !ok {
			second++
		}
		if diff := math.Abs(got - want); diff > worst {
			worst = diff
			t.Logf("%v %v %.3g", x, want, diff)
		}
	}
	return worst, direct, second
}
