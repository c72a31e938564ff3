package quadrature

import (
	"math"
	"slices"
	"sort"

	"gonum.org/v1/gonum/integrate/quad"
)

// gridSize is the number of points a marginal is tabulated at: some 50 per standard deviation.
const gridSize = 513

// Marginal is the distribution of one quantity. The grid spans all but 1e-7 of the probability at either end,
// and reaches to the edge of the box where the density does.
type Marginal struct {
	X       []float64 // grid, ascending
	Density []float64 // at X
	CDF     []float64 // at X
	Mean    float64
	SD      float64
	Defined float64 // the probability that the quantity is defined, on which everything else is conditional
	Err     float64 // estimated largest relative error of the integrals behind the table
}

// curve is a marginal as the integration left it: pieces in ascending order, each a polynomial through its
// values at the nodes of the rule.
type curve struct {
	pieces []curvePiece
	before []float64 // integral up to the start of each piece, and the total
	bary   [points]float64
	gx, gw [8]float64 // Gauss–Legendre on [0, 1]: exact for the polynomial between two points
}

func newCurve(pieces []curvePiece) *curve {
	c := &curve{pieces: slices.Clone(pieces), before: make([]float64, len(pieces)+1)}
	sort.Slice(c.pieces, func(i, j int) bool { return c.pieces[i].a < c.pieces[j].a })
	for i, p := range c.pieces {
		c.before[i+1] = c.before[i] + p.integral(func(float64) float64 { return 1 })
	}
	for i := range c.bary { // barycentric weights: Berrut & Trefethen 2004, SIAM Review 46:501
		c.bary[i] = 1
		for j := range abscissa {
			if j != i {
				c.bary[i] /= abscissa[i] - abscissa[j]
			}
		}
	}
	quad.Legendre{}.FixedLocations(c.gx[:], c.gw[:], 0, 1)
	return c
}

// integral returns the integral of the piece times g.
func (p *curvePiece) integral(g func(x float64) float64) (s float64) {
	for k := range points {
		t, scale := p.node(k)
		s += scale * kronrod[k] * p.f[k] * g(t)
	}
	return s
}

// u maps x to the variable of the rule, 0 … 1: the inverse of core.node.
func (p *curvePiece) u(x float64) float64 {
	f := min(max((x-p.a)/(p.b-p.a), 0), 1)
	switch {
	case p.edgeA:
		return math.Sqrt(f)
	case p.edgeB:
		return 1 - math.Sqrt(1-f)
	}
	return f
}

// stretch is dx/du.
func (p *curvePiece) stretch(u float64) float64 {
	switch w := p.b - p.a; {
	case p.edgeA:
		return 2 * w * u
	case p.edgeB:
		return 2 * w * (1 - u)
	default:
		return w
	}
}

// mean returns the mean of g.
func (c *curve) mean(g func(x float64) float64) (m float64) {
	for i := range c.pieces {
		m += c.pieces[i].integral(g)
	}
	return m / c.total()
}

func (c *curve) total() float64 { return c.before[len(c.pieces)] }

// find returns the piece that holds x, or that is nearest below it.
func (c *curve) find(x float64) int {
	return max(0, sort.Search(len(c.pieces), func(i int) bool { return c.pieces[i].a > x })-1)
}

// at returns the density at x. A polynomial may dip below zero beside a kink; a density does not.
func (c *curve) at(x float64) float64 {
	p := &c.pieces[c.find(x)]
	if x < p.a || x > p.b {
		return 0
	}
	return math.Max(0, c.polynomial(p, p.u(x))) / c.total()
}

// polynomial returns the polynomial of a piece at u, 0 … 1.
func (c *curve) polynomial(p *curvePiece, u float64) float64 {
	u = 2*u - 1
	var num, den float64
	for k, b := range c.bary {
		d := u - abscissa[k]
		if d == 0 {
			return p.f[k]
		}
		num, den = num+b/d*p.f[k], den+b/d
	}
	return num / den
}

// cdf returns the probability below x.
func (c *curve) cdf(x float64) float64 {
	i := c.find(x)
	p := &c.pieces[i]
	t := p.u(x)
	if t == 1 {
		return c.before[i+1] / c.total()
	}
	var s float64
	for k, g := range c.gx {
		u := g * t
		s += c.gw[k] * t * p.stretch(u) * c.polynomial(p, u)
	}
	return (c.before[i] + s) / c.total()
}

// marginalOf tabulates a curve.
func marginalOf(pieces []curvePiece, relative float64) Marginal {
	c := newCurve(pieces)
	m := Marginal{Defined: 1, Err: relative}
	m.Mean = c.mean(func(x float64) float64 { return x })
	m.SD = math.Sqrt(c.mean(func(x float64) float64 { return (x - m.Mean) * (x - m.Mean) }))
	lo, hi := c.span()
	for i := range gridSize {
		x := lo + (hi-lo)*float64(i)/(gridSize-1)
		m.X = append(m.X, x)
		m.Density = append(m.Density, c.at(x))
		m.CDF = append(m.CDF, c.cdf(x))
	}
	monotone(m.CDF)
	return m
}

// span returns the range that holds all but 1e-7 at either end, extended to the edge of the box if it is near.
func (c *curve) span() (lo, hi float64) {
	a, b := c.pieces[0].a, c.pieces[len(c.pieces)-1].b
	solve := func(p float64) float64 {
		l, h := a, b
		for range 200 {
			if m := (l + h) / 2; c.cdf(m) < p {
				l = m
			} else {
				h = m
			}
		}
		return l
	}
	lo, hi = solve(1e-7), solve(1-1e-7)
	if near := 0.01 * (hi - lo); lo-a < near {
		lo = a
	}
	if near := 0.01 * (hi - lo); b-hi < near {
		hi = b
	}
	return lo, hi
}

// monotone takes out what rounding and interpolation may have put in.
func monotone(cdf []float64) {
	for i := range cdf {
		cdf[i] = min(max(cdf[i], 0), 1)
		if i > 0 {
			cdf[i] = max(cdf[i], cdf[i-1])
		}
	}
}

// Quantile returns the value below which the probability is p; the end of the grid where the grid does not
// reach that far; NaN unless 0 ≤ p ≤ 1.
func (m *Marginal) Quantile(p float64) float64 {
	if !(p >= 0 && p <= 1) {
		return math.NaN()
	}
	j := sort.SearchFloat64s(m.CDF, p)
	switch {
	case j == 0:
		return m.X[0]
	case j == len(m.CDF):
		return m.X[j-1]
	}
	return m.X[j-1] + (m.X[j]-m.X[j-1])*fractionWithin(m.Density[j-1], m.Density[j], (p-m.CDF[j-1])/(m.CDF[j]-m.CDF[j-1]))
}

// fractionWithin returns where in an interval, in units of it, the fraction p of its mass is reached when the
// density goes linearly from f to g.
func fractionWithin(f, g, p float64) float64 {
	mean := (f + g) / 2
	if mean <= 0 {
		return p
	}
	f, g = f/mean, g/mean
	return 2 * p / (f + math.Sqrt(f*f+2*(g-f)*p))
}

// Median returns the 50% quantile.
func (m *Marginal) Median() float64 { return m.Quantile(0.5) }

// Interval returns the central credible interval of probability p.
func (m *Marginal) Interval(p float64) (lower, upper float64) {
	return m.Quantile((1 - p) / 2), m.Quantile((1 + p) / 2)
}

// HighestDensity returns the shortest interval of probability p: the highest-density interval when the
// density has one peak.
func (m *Marginal) HighestDensity(p float64) (lower, upper float64) {
	width := func(q float64) float64 { return m.Quantile(q+p) - m.Quantile(q) }
	const steps = 500
	at, q := (1-p)/steps, 0.0
	for i := range steps + 1 {
		if t := float64(i) * at; width(t) < width(q) {
			q = t
		}
	}
	l, h := math.Max(0, q-at), math.Min(1-p, q+at)
	for range 60 { // ternary search between the neighbours
		if a, b := l+(h-l)/3, h-(h-l)/3; width(a) <= width(b) {
			h = b
		} else {
			l = a
		}
	}
	if t := (l + h) / 2; width(t) < width(q) {
		q = t
	}
	return m.Quantile(q), m.Quantile(q + p)
}

// Disagreement compares a summary of a sample with the marginal: the largest difference in mean, standard
// deviation, median and the ends of the central interval of probability p, in units of the marginal's
// standard deviation.
func (m *Marginal) Disagreement(mean, sd, median, p, lower, upper float64) float64 {
	l, u := m.Interval(p)
	var worst float64
	for _, d := range [...]float64{mean - m.Mean, sd - m.SD, median - m.Median(), lower - l, upper - u} {
		worst = math.Max(worst, math.Abs(d)/m.SD)
	}
	return worst
}
