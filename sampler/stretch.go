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

// stretchBy is the a of Goodman & Weare (2010): a proposal moves a walker along
// the line through another one by a factor z between 1/a and a. a = 2 is the
// paper's own choice.
const stretchBy = 2.0

// DefaultWalkers returns the number of walkers per ensemble for dim parameters:
// at least 32, four for every parameter, even.
func DefaultWalkers(dim int) int {
	return max(32, 4*dim)
}

// Ensemble is a set of walkers that propose moves to each other. Two halves of
// the ensemble are updated in turn, each from the positions of the other, by
// the stretch move of Goodman & Weare (2010, Commun. Appl. Math. Comput. Sci. 5,
// 65) or the move by a difference of ter Braak (2006, Stat. Comput. 16, 239),
// as chance decides. Both commute with every affine map of the space.
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

// checkShape reports walkers that the moves cannot use.
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

// differences is the probability that a walker moves by a difference. By such moves
// alone a round posterior of one to three parameters is forgotten three to four times
// faster than by stretches alone, but a thin tail is not; with half of each the
// one goes two to three times faster, and the tail of w0 and wa in BAO 1.5 times
// (measured on single walkers).
const differences = 0.5

// moveHalf proposes a move to walkers lo ≤ k < hi from the other half, which
// starts at walker other.
func (e *Ensemble) moveHalf(lo, hi, other int) {
	half := len(e.logp) / 2
	for k := lo; k < hi; k++ {
		logFactor := 0.0
		if e.random.uniform() < differences {
			i, j := e.random.pair(half)
			e.shift(k, other+i, other+j)
		} else {
			logFactor = e.stretch(k, other+e.random.index(half))
		}
		e.decide(k, logFactor)
	}
}

// stretch proposes Y = Xj + z(Xk − Xj) to walker k, where z has the density
// g(z) ∝ 1/√z on [1/a, a], and returns the logarithm of the factor z^(d−1) with
// which p(Y)/p(Xk) is accepted. The conversions to float64, here and below, keep
// a compiler from fusing multiplication and addition, which would change the
// bytes of a chain between processors.
func (e *Ensemble) stretch(k, j int) float64 {
	// g's distribution function inverted: √z = (1 + (a−1)u)/√a.
	r := 1 + float64((stretchBy-1)*e.random.uniform())
	z := r * r / stretchBy
	xk, xj := e.walker(k), e.walker(j)
	for i := range e.proposal {
		e.proposal[i] = xj[i] + float64(z*(xk[i]-xj[i]))
	}
	return float64(float64(e.dim-1) * math.Log(z))
}

// shift proposes Y = Xk + γ(Xi − Xj) to walker k, with the γ = 2.38/√(2d) that is
// best in a Gaussian (ter Braak 2006, §2). Xi − Xj is as likely as Xj − Xi, so the
// factor is one. The small noise of the paper, without which the walkers could
// reach but a lattice of places, is not needed beside the stretch move.
func (e *Ensemble) shift(k, i, j int) {
	gamma := 2.38 / math.Sqrt(float64(2*e.dim))
	xk, xi, xj := e.walker(k), e.walker(i), e.walker(j)
	for n := range e.proposal {
		e.proposal[n] = xk[n] + float64(gamma*(xi[n]-xj[n]))
	}
}

// decide moves walker k to the proposal Y with probability
// min(1, e^logFactor p(Y)/p(Xk)).
func (e *Ensemble) decide(k int, logFactor float64) {
	// Drawn whether needed or not: a step takes the same numbers from the
	// stream whatever happens to its walkers.
	u := e.random.uniform()
	logp := e.density(e.proposal)
	if finite(logp) && math.Log(u) < logFactor+(logp-e.logp[k]) {
		copy(e.walker(k), e.proposal)
		e.logp[k] = logp
		e.accepted++
	}
}

// walker returns the position of walker k.
func (e *Ensemble) walker(k int) []float64 { return e.x[k*e.dim : (k+1)*e.dim] }

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
