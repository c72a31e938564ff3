package model

import (
	"math"

	"gonum.org/v1/gonum/integrate/quad"
)

// maxDepth bounds how often a panel is halved: 2⁻⁵⁰ of a panel is the resolution of its variable. panelBudget
// bounds into how many; it is not reached unless a bound on the rounding error is wrong.
const (
	maxDepth    = 50
	panelBudget = 2000
)

// rule is a Gauss-Legendre rule on [-1, 1] that knows the Legendre coefficients of its integrand: c_m is the sum
// of (m+1/2) w_k P_m(x_k) f(x_k).
type rule struct {
	x, w []float64
	last [][6]float64 // those factors for the last six m by columns, for the first half of the nodes
}

func newRule(n int) rule {
	r := rule{x: make([]float64, n), w: make([]float64, n), last: make([][6]float64, n/2)}
	quad.Legendre{}.FixedLocations(r.x, r.w, -1, 1)
	p := make([]float64, n+1)
	for k := range r.last {
		legendre(r.x[k], p)
		for i := range 6 {
			m := n - 6 + i
			r.last[k][i] = (float64(m) + 0.5) * r.w[k] * p[m]
		}
	}
	return r
}

// legendre fills p with the Legendre polynomials P_0, P_1, … at x.
func legendre(x float64, p []float64) {
	p[0], p[1] = 1, x
	for m := 1; m < len(p)-1; m++ {
		p[m+1] = (float64(2*m+1)*x*p[m] - float64(m)*p[m-1]) / float64(m+1)
	}
}

// mean is the mean of f over the panel, given its values at the nodes.
func (r *rule) mean(f []float64) float64 {
	sum := 0.0
	for k, w := range r.w {
		sum += w * f[k]
	}
	return sum / 2
}

// omitted estimates the first Legendre coefficients of f beyond those that the nodes determine, by the slower of
// the decays over the last three pairs. Pairs, because a single coefficient may vanish by symmetry. This is the
// relative error of the expansion near the ends of the panel; that of the integral is about its square.
func (r *rule) omitted(f []float64) float64 {
	var c [6]float64
	for k := range r.last {
		t := &r.last[k]
		left, right := f[k], f[len(f)-1-k]
		even, odd := left+right, left-right // the nodes are symmetric, so are the polynomials
		c[0] += t[0] * even
		c[1] += t[1] * odd
		c[2] += t[2] * even
		c[3] += t[3] * odd
		c[4] += t[4] * even
		c[5] += t[5] * odd
	}
	first, second, last := math.Abs(c[0])+math.Abs(c[1]), math.Abs(c[2])+math.Abs(c[3]), math.Abs(c[4])+math.Abs(c[5])
	if first == 0 || second == 0 {
		return last
	}
	decay := min(1, max(last/second, second/first))
	return decay * max(last, second*decay)
}

// order is the number of nodes of a panel whose integral is wanted at many points inside.
const order = 12

// denseRule is a rule that also gives the integral over the first part of the panel, as a series.
type denseRule struct {
	rule
	coef [order][order]float64 // c_m = Σ_k coef[m][k] f(x_k)
	mono [order][order]float64 // P_m = Σ_j mono[m][j] x^j
}

// panel serves the integrals inside which many points are wanted, whole those of which only the whole is. Constant
// tables, computed once.
var (
	panel = newDenseRule()
	whole = newRule(wholeOrder)
)

// wholeOrder is the number of nodes of whole, the most that a rule may have.
const wholeOrder = 24

func newDenseRule() denseRule {
	d := denseRule{rule: newRule(order)}
	var p [order + 1]float64
	for k, x := range d.x {
		legendre(x, p[:])
		for m := range order {
			d.coef[m][k] = (float64(m) + 0.5) * d.w[k] * p[m]
		}
	}
	d.mono[0][0], d.mono[1][1] = 1, 1
	for m := 1; m < order-1; m++ {
		for j := range order {
			d.mono[m+1][j] = -float64(m) / float64(m+1) * d.mono[m-1][j]
			if j > 0 {
				d.mono[m+1][j] += float64(2*m+1) / float64(m+1) * d.mono[m][j-1]
			}
		}
	}
	return d
}

// series fills c with the Legendre coefficients of f.
func (d *denseRule) series(f, c *[order]float64) {
	for m := range c {
		c[m] = 0
		for k, v := range f {
			c[m] += d.coef[m][k] * v
		}
	}
}

// powers fills c with the coefficients of the powers of x. Those of the high powers come from series that have died
// away, so little is lost to their cancellation.
func (d *denseRule) powers(f, c *[order]float64) {
	var s [order]float64
	d.series(f, &s)
	*c = [order]float64{}
	for m, v := range s {
		for j := m & 1; j <= m; j += 2 {
			c[j] += v * d.mono[m][j]
		}
	}
}

// antiderivatives fills q with ∫_{-1}^{x} P_m for m = 0 … order-1 and x = above-1:
// (P_{m+1} - P_{m-1})/(2m+1), and above itself for m = 0.
func antiderivatives(above float64, q *[order]float64) {
	var p [order + 1]float64
	legendre(above-1, p[:])
	q[0] = above
	for m := 1; m < order; m++ {
		q[m] = (p[m+1] - p[m-1]) / float64(2*m+1)
	}
}

// The estimates of omitted, relative to the mean, below which a panel is not halved: for its integral to be
// good to 1e-10 (the square would allow 1e-5, but a weak singularity may hide below the coefficients of a
// smooth bulk; measured over the prior range the worst error is 5e-11, and most are near rounding), and for its
// expansion to be good to 1e-10 anywhere in it.
const (
	integralTail = 1e-9
	denseTail    = 1e-11
)

// looseTail is the integralTail of times, whose integrands have no strong singularity beside a weak one: over the
// prior range the worst error of an age is 3e-11, as with 1e-9, and 4e-13 near the universes that measurements
// favour. It spares most universes the halving of their only panel.
const looseTail = 1e-6

// rounding is a generous bound on the relative rounding error of a sum, in units of its largest term.
const rounding = 8 * 0x1p-52

// points are the nodes of a panel or the values there; those of a rule with fewer nodes come first.
type points [wholeOrder]float64

// integrand is a positive function: its values at the first n of the points x, and a bound on their rounding
// errors. It is asked for a whole panel at a time, since a call costs as much as a value. Arrays rather than
// slices, because a slice handed to an unknown function is allocated.
type integrand func(x points, n int) (v points, noise float64)

// integrate is the integral from a to b of a function that is analytic on [a, b], with the tail integralTail to a
// relative accuracy near rounding. Panels are halved until their omitted Legendre coefficients are below the
// tail or noise, so the cost grows with the logarithm of the distance to the nearest singularity. NaN if f is
// NaN at a node.
func (r *rule) integrate(f integrand, a, b, tail float64) float64 {
	budget := panelBudget
	return r.bisect(f, a, b, tail, maxDepth, &budget)
}

func (r *rule) bisect(f integrand, a, b, tail float64, depth int, budget *int) float64 {
	mid, half := a+(b-a)/2, (b-a)/2
	values, noise := f(r.between(mid, half), len(r.x))
	v := values[:len(r.x)]
	mean := r.mean(v)
	*budget--
	if depth == 0 || *budget < 0 || !(r.omitted(v) > tail*mean+noise) {
		return mean * (b - a)
	}
	return r.bisect(f, a, mid, tail, depth-1, budget) + r.bisect(f, mid, b, tail, depth-1, budget)
}

// between are the nodes of the panel of that middle and half-width.
func (r *rule) between(mid, half float64) (x points) {
	for k, t := range r.x {
		x[k] = mid + half*t
	}
	return x
}
