package density

import (
	"fmt"
	"math"
)

// Edges are the hard limits of a quantity, such as those of a flat prior: no draw lies beyond them, and the
// density need not vanish there. An infinite limit means that there is no edge on that side.
type Edges struct{ Lo, Hi float64 }

// NoEdges is the whole real line.
func NoEdges() Edges { return Edges{math.Inf(-1), math.Inf(1)} }

// Curve is a density in one dimension, tabulated at ascending nodes and linear between them; it is zero
// outside. It integrates to one.
type Curve struct {
	X, P  []float64
	ranks ranked // of the draws the curve was estimated from, or of points of a tabulated density
}

// Surface is a density in two dimensions on a rectangular grid, bilinear between the nodes and zero outside.
// P is row-major with X running fastest: P[j*len(X)+i] belongs to (X[i], Y[j]). It integrates to one.
type Surface struct {
	X, Y, P []float64
	ranks   ranked
}

const (
	lineNodes   = 1024 // nodes of an estimated curve
	coarseNodes = 128  // side of the FFT of an estimated surface, padding included
	finestNodes = 512  // the same for narrow surfaces
	minDraws    = 20   // fewer than this is not a density
)

// NewCurve takes a density known at the ascending nodes x, from quadrature for example, and scales it to
// integrate to one.
func NewCurve(x, p []float64) (*Curve, error) {
	if err := checkNodes("x", x); err != nil {
		return nil, err
	}
	if len(p) != len(x) {
		return nil, fmt.Errorf("density: %d values at %d nodes", len(p), len(x))
	}
	c := &Curve{X: x, P: append([]float64(nil), p...)}
	if err := normalise(c.P, c.mass()); err != nil {
		return nil, err
	}
	c.ranks = c.quadrature()
	return c, nil
}

// NewSurface takes a density known on the grid x × y (p row-major, x fastest) and scales it to integrate to one.
func NewSurface(x, y, p []float64) (*Surface, error) {
	if err := checkNodes("x", x); err != nil {
		return nil, err
	}
	if err := checkNodes("y", y); err != nil {
		return nil, err
	}
	if len(p) != len(x)*len(y) {
		return nil, fmt.Errorf("density: %d values on a grid of %d × %d", len(p), len(x), len(y))
	}
	s := &Surface{X: x, Y: y, P: append([]float64(nil), p...)}
	if err := normalise(s.P, s.mass()); err != nil {
		return nil, err
	}
	s.ranks = s.quadrature()
	return s, nil
}

func checkNodes(name string, x []float64) error {
	if len(x) < 2 {
		return fmt.Errorf("density: %d nodes in %s, at least 2 are needed", len(x), name)
	}
	for i := range x {
		if math.IsNaN(x[i]) || math.IsInf(x[i], 0) || i > 0 && !(x[i] > x[i-1]) {
			return fmt.Errorf("density: nodes in %s are not finite and ascending at index %d", name, i)
		}
	}
	return nil
}

// normalise divides p by mass and refuses anything that is not a density.
func normalise(p []float64, mass float64) error {
	if !(mass > 0) || math.IsInf(mass, 0) {
		return fmt.Errorf("density: the values integrate to %g", mass)
	}
	for i, v := range p {
		if !(v >= 0) {
			return fmt.Errorf("density: value %g at index %d", v, i)
		}
		p[i] = v / mass
	}
	return nil
}

// mass is the integral by the trapezium rule, exact for a piecewise linear curve.
func (c *Curve) mass() float64 {
	sum := 0.0
	for i := 1; i < len(c.X); i++ {
		sum += (c.X[i] - c.X[i-1]) * (c.P[i] + c.P[i-1]) / 2
	}
	return sum
}

// mass is the integral of the bilinear surface.
func (s *Surface) mass() float64 {
	sum := 0.0
	for j, y := range s.Y {
		for i, x := range s.X {
			sum += s.P[j*len(s.X)+i] * span(s.X, i, x) * span(s.Y, j, y)
		}
	}
	return sum
}

// span is the length of axis that node i stands for.
func span(nodes []float64, i int, x float64) float64 {
	lo, hi := x, x
	if i > 0 {
		lo = nodes[i-1]
	}
	if i < len(nodes)-1 {
		hi = nodes[i+1]
	}
	return (hi - lo) / 2
}

// At returns the density at x, zero outside the nodes, NaN for NaN.
func (c *Curve) At(x float64) float64 {
	if math.IsNaN(x) {
		return math.NaN()
	}
	i, t := locate(c.X, x)
	if i < 0 {
		return 0
	}
	return c.P[i] + t*(c.P[i+1]-c.P[i])
}

// At returns the density at (x, y), zero outside the grid, NaN for NaN.
func (s *Surface) At(x, y float64) float64 {
	if math.IsNaN(x) || math.IsNaN(y) {
		return math.NaN()
	}
	i, t := locate(s.X, x)
	j, u := locate(s.Y, y)
	if i < 0 || j < 0 {
		return 0
	}
	n := len(s.X)
	k := j*n + i
	low := s.P[k] + t*(s.P[k+1]-s.P[k])
	high := s.P[k+n] + t*(s.P[k+n+1]-s.P[k+n])
	return low + u*(high-low)
}

// locate finds the interval of nodes that holds x and how far along it x lies. The first guess assumes even
// spacing, which makes it immediate on the estimators' own grids. The index is -1 outside.
func locate(nodes []float64, x float64) (int, float64) {
	last := len(nodes) - 1
	if x < nodes[0] || x > nodes[last] {
		return -1, 0
	}
	i := int((x - nodes[0]) / (nodes[last] - nodes[0]) * float64(last))
	i = max(0, min(i, last-1))
	for x < nodes[i] {
		i--
	}
	for i < last-1 && x > nodes[i+1] {
		i++
	}
	return i, (x - nodes[i]) / (nodes[i+1] - nodes[i])
}
