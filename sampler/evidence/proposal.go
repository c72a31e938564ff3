package evidence

import (
	"errors"
	"math"
	"math/rand/v2"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat"
	"gonum.org/v1/gonum/stat/distuv"
)

// freedom is the degrees of freedom of the proposal: tails heavy enough to cover those of a posterior that is
// not quite Gaussian, light enough to lose little on one that is.
const freedom = 5

// proposal is a multivariate Student t with the mean and the covariance of a sample.
type proposal struct {
	mean []float64
	chol *mat.TriDense // of the scale matrix
	norm float64       // ln density at the mean
	z    []float64
}

// fit takes the draws, row-major.
func fit(draws []float64, dim int) (*proposal, error) {
	m := mat.NewDense(len(draws)/dim, dim, draws)
	p := &proposal{mean: make([]float64, dim), chol: new(mat.TriDense), z: make([]float64, dim)}
	for i := range dim {
		p.mean[i] = stat.Mean(mat.Col(nil, i, m), nil)
	}
	cov := mat.NewSymDense(dim, nil)
	stat.CovarianceMatrix(cov, m, nil)
	cov.ScaleSym((freedom-2.)/freedom, cov)
	var chol mat.Cholesky
	if degenerate(p.mean, cov) || !chol.Factorize(cov) {
		return nil, errors.New("the draws do not span all parameters: one is fixed or a combination of others, or there are too few")
	}
	chol.LTo(p.chol)
	a, _ := math.Lgamma((freedom + float64(dim)) / 2)
	b, _ := math.Lgamma(freedom / 2.)
	p.norm = a - b - float64(dim)/2*math.Log(freedom*math.Pi) - chol.LogDet()/2
	return p, nil
}

// degenerate tells whether the covariance has no width in some direction, to rounding.
func degenerate(mean []float64, cov *mat.SymDense) bool {
	corr := mat.NewSymDense(len(mean), nil)
	for i, m := range mean {
		v := cov.At(i, i)
		if !(v > 1e-24*(1+m*m)) {
			return true
		}
		for j := range i + 1 {
			corr.SetSym(i, j, cov.At(i, j)/math.Sqrt(v*cov.At(j, j)))
		}
	}
	var chol mat.Cholesky
	return !chol.Factorize(corr) || chol.Cond() > 1e13
}

// logDensity returns ln g(t).
func (p *proposal) logDensity(t []float64) float64 {
	var s float64
	for i := range t {
		z := t[i] - p.mean[i]
		for j := range i {
			z -= p.chol.At(i, j) * p.z[j]
		}
		p.z[i] = z / p.chol.At(i, i)
		s += p.z[i] * p.z[i]
	}
	return p.norm - (freedom+float64(len(t)))/2*math.Log1p(s/freedom)
}

// draw writes a draw to t: a Gaussian over the root of χ²/ν.
func (p *proposal) draw(t []float64, rng *rand.Rand) {
	scale := math.Sqrt(freedom / distuv.ChiSquared{K: freedom, Src: rng}.Rand())
	for i := range t {
		p.z[i] = scale * rng.NormFloat64()
		t[i] = p.mean[i]
		for j := range i + 1 {
			t[i] += p.chol.At(i, j) * p.z[j]
		}
	}
}
