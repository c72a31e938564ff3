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

// antiderivatives fills q with ∫_{-1}^{x} P_m for m = 0 … order-1: (P_{m+1} - P_{m-1})/(2m+1).
func antiderivatives(x float64, q *[order]float64) {
	var p [order + 1]float64
	legendre(x, &p)
	q[0] = x + 1
	for m := 1; m < order; m++ {
		q[m] = (p[m+1] - p[m-1]) / float64(2*m+1)
	}
}

// integral is the mean of f over the panel, given its values at the nodes.
func (p *panelRule) mean(f *[order]float64) float64 {
	sum := 0.0
	for k, v := range f {
		sum += p.w[k] * v
	}
	return sum / 2
}

// tail is the size of the last two Legendre coefficients, which says how well twelve terms describe f: the
// error of the expansion is about this, the error of the integral about its square (times |f|⁻¹).
func (p *panelRule) tail(f *[order]float64) float64 {
	var c10, c11 float64
	for k, v := range f {
		c10 += p.coef[order-2][k] * v
		c11 += p.coef[order-1][k] * v
	}
	return math.Abs(c10) + math.Abs(c11)
}

// integralTail is the tail, relative to the mean, below which the integral over a panel is good to rounding.
const integralTail = 1e-7

// integrate is the integral from a to b of a positive function that is analytic on [a, b], to a relative
// accuracy near rounding. Panels are halved until their Legendre coefficients have died away, so the cost
// grows with the logarithm of the distance to the nearest singularity. NaN if f is NaN at a node.
func integrate(f func(float64) float64, a, b float64) float64 {
	return bisect(f, a, b, maxDepth)
}

func bisect(f func(float64) float64, a, b float64, depth int) float64 {
	mid, half := a+(b-a)/2, (b-a)/2
	var v [order]float64
	for k, x := range panel.x {
		v[k] = f(mid + half*x)
	}
	mean := panel.mean(&v)
	if depth == 0 || !(panel.tail(&v) > integralTail*math.Abs(mean)) {
		return mean * (b - a)
	}
	return bisect(f, a, mid, depth-1) + bisect(f, mid, b, depth-1)
}
