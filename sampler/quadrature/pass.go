package quadrature

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// pass is one nested integration with a fixed order of the coordinates. It is shared by the workers and only
// changed between batches.
type pass struct {
	dim    int
	order  []int     // order[level] is the caller's coordinate, outermost first
	lo, hi []float64 // by level
	mean   []float64 // by level
	chol   *mat.TriDense
	ref    float64 // ln p that counts as 1

	class  func([]float64) int
	slots  int // 1 + classes
	record bool

	relative, relativeClass, rarest float64
	scale                           [3]vec // magnitude of the integrals of each level, from what was seen so far
}

// guess is what is known of a density before a pass: where its mass is.
type guess struct {
	ref  float64
	mean []float64
	cov  *mat.SymDense
	mass float64 // the integral, in units of exp(ref); 0 when not known
}

// newPass orders the coordinates with first outermost and the others after it, cyclically. The Cholesky
// factor of the covariance in that order holds the conditional means and widths of each level given those
// outside it.
func newPass(p Problem, first int, g guess) *pass {
	d := len(p.Lo)
	q := &pass{dim: d, ref: g.ref, slots: 1}
	cov := mat.NewSymDense(d, nil)
	for l := range d {
		i := (first + l) % d
		q.order = append(q.order, i)
		q.lo, q.hi, q.mean = append(q.lo, p.Lo[i]), append(q.hi, p.Hi[i]), append(q.mean, g.mean[i])
		for m := range l + 1 {
			cov.SetSym(l, m, g.cov.At(i, q.order[m]))
		}
	}
	var chol mat.Cholesky
	for jitter := 1e-12; !chol.Factorize(cov); jitter *= 100 { // a ridge without width, to rounding
		for l := range d {
			cov.SetSym(l, l, cov.At(l, l)*(1+jitter))
		}
	}
	q.chol = new(mat.TriDense)
	chol.LTo(q.chol)
	q.guessScales(g.mass)
	return q
}

// guessScales derives what an integral at each level amounts to from the mass of the whole, or from that of a
// Gaussian of height 1.
func (p *pass) guessScales(mass float64) {
	var width [3]float64
	gaussian := 1.0
	for l := range p.dim {
		width[l] = math.Min(math.Sqrt(2*math.Pi)*p.chol.At(l, l), p.hi[l]-p.lo[l])
		gaussian *= width[l]
	}
	if mass == 0 {
		mass = gaussian
	}
	for l := range p.dim {
		p.scale[l][0] = mass
		mass /= width[l]
	}
}

// sections returns where a level is cut, in conditional standard deviations from the conditional mean: pieces
// on which the rule sees a Gaussian to a relative 1e-8 at once, or to 1e-3 where no more is asked for.
func (p *pass) sections() []float64 {
	if p.relative >= 1e-3 {
		return []float64{-6, 6}
	}
	return []float64{-6, -2, 2, 6}
}

// cuts returns the edges of the box of a level and, between them, the sections about the conditional mean given
// the coordinates outside. Cuts that would make a sliver are left out. Hints from outside are further cuts.
func (w *worker) cuts(level int) []float64 {
	var z [3]float64
	var mean float64
	for l := range level + 1 {
		mean = w.mean[l]
		for m := range l {
			mean += w.chol.At(l, m) * z[m]
		}
		z[l] = (w.x[w.order[l]] - mean) / w.chol.At(l, l)
	}
	sd := w.chol.At(level, level)
	sliver := sd
	if w.relative >= 1e-5 { // one piece from 2 to 9 is good enough
		sliver *= 3
	}
	c := append(w.buf[level][:0], w.lo[level])
	for _, k := range w.sections() {
		if t := mean + k*sd; t > w.lo[level]+sliver && t < w.hi[level]-sliver {
			c = append(c, t)
		}
	}
	c = append(c, w.hi[level])
	for _, hints := range w.hints[:min(level, len(w.hints))] {
		for _, h := range hints {
			if t := h[w.order[level]]; t > w.lo[level] && t < w.hi[level] {
				c = append(c, t)
			}
		}
	}
	slices.Sort(c)
	w.buf[level] = slices.Compact(c)
	return w.buf[level]
}

// Inner levels are integrated more tightly, so that the rule outside sees a smooth integrand.
var tighter = [3]float64{1, 0.3, 0.1}

// tolerance returns the absolute error allowed at a level for each slot, relative to the larger of what the
// pieces hold and what integrals at this level amount to elsewhere: a line far out in the tail need not be
// good to itself. For a class it is relative to that class.
func (p *pass) tolerance(level int, pieces []core) (tol vec) {
	var own vec
	for i := range pieces {
		for s := range p.slots {
			own[s] += pieces[i].val[s]
		}
	}
	total := math.Max(p.scale[level][0], own[0])
	for s := range tol {
		tol[s] = tighter[level] * p.relative * total
	}
	for s := 1; s < p.slots; s++ {
		of := max(p.scale[level][s], own[s], p.rarest*total)
		tol[s] = tighter[level] * p.relativeClass * of
	}
	return tol
}
