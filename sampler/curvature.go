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
// coordinate, the others held. It is the distance to the edge of the box if the
// function does not drop that far, and 0 if it has no finite value that side.
func (p *probe) step(i int, sign float64) float64 {
	reach := p.hi[i] - p.x[i]
	if sign < 0 {
		reach = p.x[i] - p.lo[i]
	}
	if !(reach > 0) {
		return 0
	}
	// Bisect the exponent of the step: widths may be any fraction of the box.
	drop := func(h float64) float64 { return p.fx - p.at(i, sign*h, i, 0) }
	low, high := reach*1e-12, reach
	if drop(high) < 0.5 {
		return high
	}
	for range 40 {
		h := math.Sqrt(low * high)
		switch d := drop(h); {
		case d > 0.3 && d < 0.8:
			return h * math.Sqrt(0.5/d)
		case d < 0.5:
			low = h
		default:
			high = h
		}
	}
	if low == reach*1e-12 {
		return 0
	}
	return low
}

// spread returns a matrix S such that x + S·(normal numbers) has roughly the
// covariance of the density around its maximum x: the inverse of the second
// derivatives, taken by central differences over one standard deviation, after
// adding the variance of a uniform distribution over the box as information, so
// that directions without a maximum stay within the box. Where there are no
// usable derivatives (an edge, a plateau) it holds a width per coordinate.
func spread(f Density, x, lo, hi []float64) *mat.TriDense {
	p := &probe{f: f, x: x, fx: f(x), lo: lo, hi: hi, y: make([]float64, len(x))}
	width := make([]float64, len(x))
	smooth := true
	for i := range x {
		down, up := p.step(i, -1), p.step(i, 1)
		smooth = smooth && down > 0 && up > 0
		width[i] = min(down, up)
		if width[i] == 0 {
			width[i] = max(down, up, 1e-9*(hi[i]-lo[i]))
		}
	}
	if smooth {
		if root, ok := p.root(width); ok {
			return root
		}
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
func (p *probe) root(width []float64) (*mat.TriDense, bool) {
	n := len(p.x)
	// In units of the widths, in which its diagonal is about one.
	information := mat.NewSymDense(n, nil)
	for i := range n {
		for j := range i {
			h, k := width[i], width[j]
			mixed := p.at(i, h, j, k) - p.at(i, h, j, -k) - p.at(i, -h, j, k) + p.at(i, -h, j, -k)
			information.SetSym(i, j, -mixed/4)
		}
		h := width[i]
		second := p.at(i, h, i, 0) + p.at(i, -h, i, 0) - 2*p.fx
		box := (p.hi[i] - p.lo[i]) / h
		information.SetSym(i, i, -second+12/(box*box))
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
