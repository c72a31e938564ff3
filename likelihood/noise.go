package likelihood

import (
	"errors"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// noise whitens residuals: it solves L w = r in place, where L Lᵀ is their
// covariance, so that chi-squared is w·w. The covariance is never inverted.
type noise interface {
	whiten(r []float64)
	sigma(i int) float64 // the marginal standard deviation of measurement i
}

// independent is the noise of measurements without correlations.
type independent []float64

func (s independent) whiten(r []float64)  { floats.Div(r, s) }
func (s independent) sigma(i int) float64 { return s[i] }

// correlated is the noise of a full covariance, held as its Cholesky factor.
type correlated struct {
	l      blas64.Triangular
	sigmas []float64
}

func (c *correlated) whiten(r []float64) {
	blas64.Trsv(blas.NoTrans, c.l, blas64.Vector{N: len(r), Data: r, Inc: 1})
}
func (c *correlated) sigma(i int) float64 { return c.sigmas[i] }

// newNoise uses the covariance, or the errors alone when it is nil.
func newNoise(errs []float64, cov *mat.SymDense) (noise, error) {
	if cov == nil {
		return independent(errs), nil
	}
	var chol mat.Cholesky
	if !chol.Factorize(cov) {
		return nil, errors.New("the covariance is not positive definite")
	}
	var l mat.TriDense
	chol.LTo(&l)
	c := &correlated{l: l.RawTriangular(), sigmas: make([]float64, cov.SymmetricDim())}
	for i := range c.sigmas {
		c.sigmas[i] = math.Sqrt(cov.At(i, i))
	}
	return c, nil
}
