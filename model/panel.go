package model

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// order is the number of Gauss-Legendre nodes in a panel.
const order = 12

// maxDepth bounds how often a panel is halved: 2⁻⁵⁰ of a panel is the resolution of its variable.
const maxDepth = 50

// panelRule is a Gauss-Legendre rule on [-1, 1] that also yields the Legendre coefficients of its integrand.
type panelRule struct {
	x, w [order]float64
	coef [order][order]float64 // c_m = Σ_k coef[m][k] f(x_k)
	last [order / 2][6]float64 // coef[order-6 … order-1][k] by columns, for the first half of the nodes
}

// panel is the one rule of the package: constant tables, computed once.
var panel = newPanelRule()

func newPanelRule() (p panelRule) {
	quad.Legendre{}.FixedLocations(p.x[:], p.w[:], -1, 1)
	for k, x := range p.x {
		var leg [order + 1]float64
		legendre(x, &leg)
		for m := range order {
			p.coef[m][k] = (float64(m) + 0.5) * p.w[k] * leg[m]
			if k < order/2 && m >= order-6 {
				p.last[k][m-order+6] = p.coef[m][k]
			}
		}
	}
	return p
}

// legendre fills p with the Legendre polynomials P_0 … P_order at x.
func legendre(x float64, p *[order + 1]float64) {
	p[0], p[1] = 1, x
	for m := 1; m < order; m++ {
		p[m+1] = (float64(2*m+1)*x*p[m] - float64(m)*p[m-1]) / float64(m+1)
	}
}

// antiderivatives fills q with ∫_{-1}^{x} P_m for m = 0 … order-1 and x = above-1:
// (P_{m+1} - P_{m-1})/(2m+1), and above itself for m = 0.
func antiderivatives(above float64, q *[order]float64) {
	var p [order + 1]float64
	legendre(above-1, &p)
	q[0] = above
	for m := 1; m < order; m++ {
		q[m] = (p[m+1] - p[m-1]) / float64(2*m+1)
	}
}

// mean is the mean of f over the panel, given its values at the nodes.
func (p *panelRule) mean(f *[order]float64) float64 {
	sum := 0.0
	for k, v := range f {
		sum += p.w[k] * v
	}
	return sum / 2
}

// series fills c with the Legendre coefficients of f.
func (p *panelRule) series(f, c *[order]float64) {
	for m := range c {
		c[m] = 0
		for k, v := range f {
			c[m] += p.coef[m][k] * v
		}
	}
}

// omitted estimates the first Legendre coefficients of f beyond the twelve that a panel holds, by the slower of
// the decays over its last three pairs. Pairs, because a single coefficient may vanish by symmetry. This is the
// relative error of the expansion near the ends of the panel; that of the integral is about its square.
func (p *panelRule) omitted(f *[order]float64) float64 {
	var c6, c7, c8, c9, c10, c11 float64
	for k := range order / 2 {
		even, odd := f[k]+f[order-1-k], f[k]-f[order-1-k] // the nodes are symmetric, so are the polynomials
		t := &p.last[k]
		c6 += t[0] * even
		c7 += t[1] * odd
		c8 += t[2] * even
		c9 += t[3] * odd
		c10 += t[4] * even
		c11 += t[5] * odd
	}
	first, second, last := math.Abs(c6)+math.Abs(c7), math.Abs(c8)+math.Abs(c9), math.Abs(c10)+math.Abs(c11)
	if first == 0 || second == 0 {
		return last
	}
	decay := math.Min(1, math.Max(last/second, second/first))
	return decay * math.Max(last, second*decay)
}

// The estimates of omitted, relative to the mean, below which a panel is not halved: for its integral to be
// good to rounding, and for its expansion to be good to 1e-10 anywhere in it.
const (
	integralTail = 1e-7
	denseTail    = 1e-11
)

// rounding is a generous bound on the relative rounding error of a sum, in units of its largest term.
const rounding = 8 * 0x1p-52

// integrate is the integral from a to b of a positive function that is analytic on [a, b], to a relative
// accuracy near rounding. f returns its value and a bound on the value's rounding error. Panels are halved
// until their Legendre coefficients have died away or are noise, so the cost grows with the logarithm of
// the distance to the nearest singularity. NaN if f is NaN at a node.
func integrate(f func(float64) (v, noise float64), a, b float64) float64 {
	budget := 2000 // never reached unless a bound on the noise is wrong
	return bisect(f, a, b, maxDepth, &budget)
}

func bisect(f func(float64) (v, noise float64), a, b float64, depth int, budget *int) float64 {
	mid, half := a+(b-a)/2, (b-a)/2
	var v [order]float64
	noise := 0.0
	for k, x := range panel.x {
		var n float64
		v[k], n = f(mid + half*x)
		noise = math.Max(noise, n)
	}
	mean := panel.mean(&v)
	*budget--
	if depth == 0 || *budget < 0 || !(panel.omitted(&v) > integralTail*mean+noise) {
		return mean * (b - a)
	}
	return bisect(f, a, mid, depth-1, budget) + bisect(f, mid, b, depth-1, budget)
}
