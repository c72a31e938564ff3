package sampler

import (
	"fmt"
	"math"
)

// Density is the natural logarithm of a probability density at x, up to a
// constant: −Inf or NaN where the density is zero or undefined. It must return
// the same value for the same x, must not keep or change x, and may own scratch
// memory: one goroutine at a time calls it.
type Density func(x []float64) float64

// stretch is the a of Goodman & Weare (2010): a proposal moves a walker along
// the line through another one by a factor z between 1/a and a. a = 2 is the
// paper's own choice.
const stretch = 2.0

// DefaultWalkers returns the number of walkers per ensemble for dim parameters:
// at least 32, four for every parameter, even.
func DefaultWalkers(dim int) int {
	return max(32, 4*dim)
}

// Ensemble is a set of walkers that propose moves to each other: the
// affine-invariant stretch move of Goodman & Weare (2010, Commun. Appl. Math.
// Comput. Sci. 5, 65), in which two halves of the ensemble are updated in turn,
// each from the positions of the other.
type Ensemble struct {
	density  Density
	seed     uint64
	index    int
	dim      int
	step     int
	accepted int
	x        []float64 // walkers × dim
	logp     []float64 // one per walker
	proposal []float64
	random   stream
}

// NewEnsemble places an ensemble's walkers at start, a row of dim numbers for
// each. index tells the ensembles of one run apart: with the seed it fixes the
// random stream. It is an error if the number of walkers is odd or below
// 2·dim+2, or if a walker starts where the density is not finite.
func NewEnsemble(d Density, seed uint64, index, dim int, start []float64) (*Ensemble, error) {
	if err := checkShape(dim, start); err != nil {
		return nil, err
	}
	logp := make([]float64, len(start)/dim)
	for k := range logp {
		x := start[k*dim : (k+1)*dim]
		logp[k] = d(x)
		if !finite(logp[k]) {
			return nil, fmt.Errorf("sampler: ensemble %d, walker %d starts at %v where the log-density is %v", index, k, x, logp[k])
		}
	}
	return restore(d, seed, index, dim, 0, start, logp), nil
}

// restore makes an ensemble that goes on from a complete step. It copies x and
// logp.
func restore(d Density, seed uint64, index, dim, step int, x, logp []float64) *Ensemble {
	return &Ensemble{
		density:  d,
		seed:     seed,
		index:    index,
		dim:      dim,
		step:     step,
		x:        append([]float64(nil), x...),
		logp:     append([]float64(nil), logp...),
		proposal: make([]float64, dim),
	}
}

// checkShape reports walkers that the stretch move cannot use.
func checkShape(dim int, x []float64) error {
	switch n := len(x) / max(dim, 1); {
	case dim < 1:
		return fmt.Errorf("sampler: %d parameters, need at least one", dim)
	case n*dim != len(x):
		return fmt.Errorf("sampler: %d numbers are no whole number of walkers in %d dimensions", len(x), dim)
	case n%2 != 0 || n < 2*dim+2:
		return fmt.Errorf("sampler: %d walkers, need an even number, at least %d for %d parameters", n, 2*dim+2, dim)
	}
	return nil
}

// Step moves every walker once. It evaluates the density once per walker and
// does not allocate.
func (e *Ensemble) Step() {
	e.step++
	e.random.seek(e.seed, e.index, e.step)
	n := len(e.logp)
	e.moveHalf(0, n/2, n/2)
	e.moveHalf(n/2, n, 0)
}

// moveHalf proposes a move to walkers lo ≤ k < hi from the other half, which
// starts at walker other.
func (e *Ensemble) moveHalf(lo, hi, other int) {
	half := len(e.logp) / 2
	for k := lo; k < hi; k++ {
		e.move(k, other+e.random.index(half))
	}
}

// move proposes Y = Xj + z(Xk − Xj) to walker k and accepts it with probability
// min(1, z^(d−1) p(Y)/p(Xk)), where z has the density g(z) ∝ 1/√z on [1/a, a].
// The conversions to float64 keep a compiler from fusing multiplication and
// addition, which would change the bytes of a chain between processors.
func (e *Ensemble) move(k, j int) {
	// g's distribution function inverted: √z = (1 + (a−1)u)/√a.
	r := 1 + float64((stretch-1)*e.random.uniform())
	z := r * r / stretch
	xk, xj := e.x[k*e.dim:(k+1)*e.dim], e.x[j*e.dim:(j+1)*e.dim]
	for i := range e.proposal {
		e.proposal[i] = xj[i] + float64(z*(xk[i]-xj[i]))
	}
	// Drawn whether needed or not: a step takes the same numbers from the
	// stream whatever happens to its walkers.
	u := e.random.uniform()
	logp := e.density(e.proposal)
	if finite(logp) && math.Log(u) < float64(float64(e.dim-1)*math.Log(z))+(logp-e.logp[k]) {
		copy(xk, e.proposal)
		e.logp[k] = logp
		e.accepted++
	}
}

// Positions returns the walkers' positions, a row of dim numbers for each. They
// are the ensemble's own and change with the next step.
func (e *Ensemble) Positions() []float64 { return e.x }

// LogDensities returns the log-density of every walker, valid until the next
// step.
func (e *Ensemble) LogDensities() []float64 { return e.logp }

// finite reports whether a log-density belongs to a place a walker may stand.
func finite(logp float64) bool {
	return !math.IsNaN(logp) && !math.IsInf(logp, 0)
}
