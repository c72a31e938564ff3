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
