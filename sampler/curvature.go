package sampler

import (
	"math"

	"gonum.org/v1/gonum/mat"
)

// probe looks at a function, a log-density, near one of its maxima.
type probe struct {
	f      Density
	x      []float64
	fx     float64
	lo, hi []float64 // the box: how far it makes sense to look
	y      []float64 // scratch
}

// at returns f at x + s·e_i + t·e_j, −Inf where it is not finite.
func (p *probe) at(i int, s float64, j int, t float64) float64 {
	copy(p.y, p.x)
	p.y[i] += s
	p.y[j] += t
	if v := p.f(p.y); finite(v) {
		return v
	}
	return math.Inf(-1)
}

// step returns how far along coordinate i, in the direction of sign, the
// function drops by about ½: one standard deviation of a Gaussian in that
// coordinate, the others held. Where it does not drop that far inside the box,
// it returns the distance to the side and false; 0 and true if the function has
// no finite value that side.
func (p *probe) step(i int, sign float64) (h float64, fell bool) {
	reach := p.hi[i] - p.x[i]
	if sign < 0 {
		reach = p.x[i] - p.lo[i]
	}
	drop := func(h float64) float64 { return p.fx - p.at(i, sign*h, i, 0) }
	if !(reach > 0) || drop(reach) < 0.5 {
		return max(reach, 0), false
	}
	// Bisect the exponent of the step: a width may be any fraction of the box.
	least := reach * 1e-12
	low, high := least, reach
	for range 40 {
		h := math.Sqrt(low * high)
		switch d := drop(h); {
		case d > 0.3 && d < 0.8:
			return h * math.Sqrt(0.5/d), true
		case d < 0.5:
			low = h
		default:
			high = h
		}
	}
	if low == least {
		return 0, true
	}
	return low, true
}

// width returns the step over which to look at coordinate i, and whether it can
// be taken to both sides: not where the maximum is at an edge.
func (p *probe) width(i int) (h float64, smooth bool) {
	down, fellDown := p.step(i, -1)
	up, fellUp := p.step(i, 1)
	h = max(down, up)
	if fellDown && fellUp && down > 0 && up > 0 {
		h = min(down, up)
	}
	if near := min(down, up); near > 0.2*h {
		return near, true
	}
	return max(h, 1e-9*(p.hi[i]-p.lo[i])), false
}

// spread returns a matrix S such that x + S·(normal numbers) has roughly the
// covariance of the density around its maximum x: the inverse of the second
// derivatives, taken by central differences over one standard deviation, after
// adding the variance of a uniform distribution over the box as information, so
// that directions without a maximum stay within the box. A coordinate that has
// no derivatives (at an edge) stands alone with the width over which the
// density falls; so do all if there is no maximum (a plateau).
func spread(f Density, x, lo, hi []float64) *mat.TriDense {
	p := &probe{f: f, x: x, fx: f(x), lo: lo, hi: hi, y: make([]float64, len(x))}
	width, smooth := make([]float64, len(x)), make([]bool, len(x))
	for i := range x {
		width[i], smooth[i] = p.width(i)
	}
	if root, ok := p.root(width, smooth); ok {
		return root
	}
	root := mat.NewTriDense(len(x), mat.Lower, nil)
	for i, w := range width {
		root.SetTri(i, i, w)
	}
	return root
}

// root returns the Cholesky factor of the covariance from the second
// derivatives over steps of the given widths, false if they are not those of a
// maximum.
func (p *probe) root(width []float64, smooth []bool) (*mat.TriDense, bool) {
	n := len(p.x)
	// In units of the widths, in which its diagonal is about one.
	information := mat.NewSymDense(n, nil)
	for i := range n {
		information.SetSym(i, i, 1)
		if !smooth[i] {
			continue
		}
		h := width[i]
		second := p.at(i, h, i, 0) + p.at(i, -h, i, 0) - 2*p.fx
		box := (p.hi[i] - p.lo[i]) / h
		information.SetSym(i, i, -second+12/(box*box))
		for j := range i {
			if smooth[j] {
				k := width[j]
				mixed := p.at(i, h, j, k) - p.at(i, h, j, -k) - p.at(i, -h, j, k) + p.at(i, -h, j, -k)
				information.SetSym(i, j, -mixed/4)
			}
		}
	}
	var chol mat.Cholesky
	var covariance mat.SymDense
	if !allFinite(information) || !chol.Factorize(information) || chol.InverseTo(&covariance) != nil || !chol.Factorize(&covariance) {
		return nil, false
	}
	root := new(mat.TriDense)
	chol.LTo(root)
	for i := range n {
		for j := range i + 1 {
			root.SetTri(i, j, root.At(i, j)*width[i])
		}
	}
	return root, true
}

func allFinite(m *mat.SymDense) bool {
	n := m.SymmetricDim()
	for i := range n {
		for j := range n {
			if !finite(m.At(i, j)) {
				return false
			}
		}
	}
	return true
}

// displaced returns x + S·v.
func displaced(x []float64, root *mat.TriDense, v []float64) []float64 {
	y := append([]float64(nil), x...)
	for i := range y {
		for j := range i + 1 {
			y[i] += root.At(i, j) * v[j]
		}
	}
	return y
}
