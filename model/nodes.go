package model

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/integrate/quad"
)

// Nodes is a line of sight known at n Chebyshev points in ln(1+z), which is all of it: distances are analytic
// in ln(1+z), and the polynomial through their values at the points
//
//	y_j = Y (1 - cos(πj/n))/2,   j = 0 … n,   Y = ln(1 + the span)
//
// differs from them by less than 4M ρ⁻ⁿ/(ρ-1), if they are bounded by M in the ellipse with foci 0 and Y whose
// semi-axes sum to ρY/2 (Trefethen 2013, Approximation Theory and Approximation Practice, theorem 8.2). The
// nearest singularity of a flat universe with a cosmological constant is a zero of E², π/3 from the real axis;
// for a span of z = 2.3 that is ρ = 3.8, and twenty-four points are exact to rounding. How good they are for
// the universe at hand is read from the last coefficients of its own Chebyshev series; see [Nodes.Fill].
//
// The point j = 0 is today, where every universe is alike. It is not kept.
//
// The integrand of the distance is expanded at the same points, and integrated by a matrix that does not depend
// on the universe (spectral integration; Clenshaw & Curtis 1960, Numer. Math. 2, 197). Further redshifts, such
// as those of BAO, cost a row of the matrix each.
//
// Nodes are immutable and may serve several goroutines.
type Nodes struct {
	z       []float64 // at the points, ascending, then the further redshifts
	x, y, a []float64 // 1+z, ln(1+z) and 1/(1+z) of these
	n       int       // points
	half    float64   // Y/2

	// With h = (1+z)/E at the points and 1 today, start + rule·h is, row by row: χ/z at the points, χ at the
	// further redshifts, and the last coefficients of the series of h.
	rule  blas64.General
	start []float64
}

// lastCoefficients is how many of a series' coefficients are looked at; see Remainder.
const lastCoefficients = 6

// FewestNodes is the least number of points of Nodes.
const FewestNodes = 8

// NodesFor is the least number of points that make the distances to redshifts up to span good to 1e-14 in any
// universe whose zeros of E² stay π/3 in ln(1+z) away from the real axis, as those of every flat universe
// with a cosmological constant do. The bound is that of the integrand over n, by which integration divides it.
func NodesFor(span float64) int {
	eta := math.Pi / 3 / (math.Log1p(span) / 2)
	rho := eta + math.Sqrt(1+eta*eta)
	n := FewestNodes
	for 4*math.Pow(rho, -float64(n))/(rho-1)/float64(n) > 1e-14 {
		n++
	}
	return n
}

// NewNodes prepares n points up to the redshift span, and further redshifts, which must be positive and not
// above the span.
func NewNodes(span float64, n int, further []float64) (*Nodes, error) {
	if !(span > 0) || math.IsInf(span, 0) || n < FewestNodes {
		return nil, fmt.Errorf("model: %d nodes up to z = %v; need a positive redshift and at least %d nodes", n, span, FewestNodes)
	}
	p := &Nodes{n: n, half: math.Log1p(span) / 2}
	for j := 1; j <= n; j++ {
		p.add(math.Expm1(p.point(j)), p.point(j))
	}
	for i, z := range further {
		if !(z > 0 && z <= span) {
			return nil, fmt.Errorf("model: redshift %d beside nodes is %v, must be positive and at most %v", i, z, span)
		}
		p.add(z, math.Log1p(z))
	}
	p.prepare()
	return p, nil
}

func (p *Nodes) add(z, y float64) {
	p.z, p.x, p.y, p.a = append(p.z, z), append(p.x, 1+z), append(p.y, y), append(p.a, 1/(1+z))
}

// point is y_j, by the half angle so that small ones keep their digits.
func (p *Nodes) point(j int) float64 {
	s := math.Sin(math.Pi * float64(j) / float64(2*p.n))
	return 2 * p.half * s * s
}

// prepare computes the rule.
func (p *Nodes) prepare() {
	rows := len(p.z) + lastCoefficients
	p.rule = blas64.General{Rows: rows, Cols: p.n, Stride: p.n, Data: make([]float64, rows*p.n)}
	p.start = make([]float64, rows)
	row := make([]float64, p.n+1)
	put := func(i int, scale float64) {
		p.start[i] = row[0] * scale
		for j, v := range row[1:] {
			p.rule.Data[i*p.n+j] = v * scale
		}
	}
	for i, y := range p.y {
		p.integration(y, row)
		if i < p.n {
			put(i, 1/p.z[i])
		} else {
			put(i, 1)
		}
	}
	for k := range lastCoefficients {
		p.coefficient(p.n-k, row)
		put(len(p.z)+k, 1)
	}
}

// cardinals fills row with the n+1 polynomials that are 1 at one point and 0 at the others, evaluated at y: by
// the barycentric formula (Trefethen 2013, theorem 5.2).
func (p *Nodes) cardinals(y float64, row []float64) {
	sum := 0.0
	for j := range row {
		d := y
		if j > 0 {
			d -= p.y[j-1]
		}
		if d == 0 {
			clear(row)
			row[j] = 1
			return
		}
		w := 1 / d
		if j%2 == 1 {
			w = -w
		}
		if j == 0 || j == p.n {
			w /= 2
		}
		row[j] = w
		sum += w
	}
	for j := range row {
		row[j] /= sum
	}
}

// integration fills row with the integrals of the cardinals from 0 to y: by a Gauss rule, exact for their
// degree, without the cancellation of antiderivatives at small y.
func (p *Nodes) integration(y float64, row []float64) {
	m := p.n/2 + 1
	if m == 26 {
		m++ // gonum v0.17.0 tabulates a wrong weight for 26 points
	}
	t, w := make([]float64, m), make([]float64, m)
	quad.Legendre{}.FixedLocations(t, w, 0, y)
	at := make([]float64, len(row))
	clear(row)
	for i := range t {
		p.cardinals(t[i], at)
		for j, v := range at {
			row[j] += w[i] * v
		}
	}
}

// coefficient fills row with the weights of the values at the points in the k-th Chebyshev coefficient of the
// polynomial through them.
func (p *Nodes) coefficient(k int, row []float64) {
	for j := range row {
		row[j] = 2 / float64(p.n) * math.Cos(math.Pi*float64(j*k%(2*p.n))/float64(p.n))
		if k%2 == 1 {
			row[j] = -row[j] // the points ascend
		}
		if j == 0 || j == p.n {
			row[j] /= 2
		}
	}
	if k == p.n {
		for j := range row {
			row[j] /= 2
		}
	}
}

// Len is the number of points n.
func (p *Nodes) Len() int { return p.n }

// Z is the redshift of point k, of 0 … n-1.
func (p *Nodes) Z(k int) float64 { return p.z[k] }

// Interpolation fills row, of length n, with the weights of the values at the points in the value at z, for a
// function that is 0 today. z must not be above the span.
func (p *Nodes) Interpolation(z float64, row []float64) {
	var room [128]float64
	all := room[:]
	if p.n >= len(room) {
		all = make([]float64, p.n+1)
	}
	all = all[:p.n+1]
	p.cardinals(math.Log1p(z), all)
	copy(row, all[1:])
}

// Alias is the error at z of the polynomial through the points, if the function is the first Chebyshev
// polynomial that they cannot tell from a lower one, of degree n+1: T_{n+1} - T_{n-1}.
func (p *Nodes) Alias(z float64) float64 {
	angle := math.Acos(math.Max(-1, 1-math.Log1p(z)/p.half))
	sign := 1 - 2*float64((p.n+1)%2) // of T_k at the start of the interval, which is where Acos begins
	return sign * (math.Cos(float64(p.n+1)*angle) - math.Cos(float64(p.n-1)*angle))
}

// LastCoefficients is a matrix that turns values at the points, of a function that is 0 today, into the last
// coefficients of its Chebyshev series.
func (p *Nodes) LastCoefficients() [][]float64 {
	var m [][]float64
	row := make([]float64, p.n+1)
	for k := range lastCoefficients {
		p.coefficient(p.n-k, row)
		m = append(m, append([]float64(nil), row[1:]...))
	}
	return m
}

// Sight is what Nodes know about one universe: scratch memory for one goroutine.
type Sight struct {
	Shape  []float64 // ln(DM/z) at the points, DM in units of c/H0
	DM, DH []float64 // at the further redshifts, in units of c/H0

	// Past is true if the span is certain to lie past the antipode of a closed
	// universe: it has no distance. It is known where Shape is asked for.
	Past bool

	h, out []float64
}

// Sight returns the memory that Fill fills.
func (p *Nodes) Sight() *Sight {
	further := len(p.z) - p.n
	return &Sight{Shape: make([]float64, p.n), DM: make([]float64, further), DH: make([]float64, further),
		h: make([]float64, p.n), out: make([]float64, len(p.start))}
}

// Remainder estimates the sum of the coefficients beyond the last six of a Chebyshev series, which are given in
// descending order, by the slower of the decays over their three pairs. Pairs, because a single coefficient may
// vanish by symmetry.
func Remainder(last []float64) float64 {
	_ = last[lastCoefficients-1]
	third := math.Abs(last[0]) + math.Abs(last[1])
	second := math.Abs(last[2]) + math.Abs(last[3])
	first := math.Abs(last[4]) + math.Abs(last[5])
	if first == 0 || second == 0 {
		return third
	}
	decay := math.Min(1, math.Max(third/second, second/first))
	return decay * math.Max(third, second*decay)
}

// Fill computes the distances of a universe; Shape is left out if it is nil. omitted is the Remainder of the
// series of (1+z)/E over n, by which integration divides its coefficients: the relative error of the distances,
// unless it is large. It is NaN where the universe has no distances up to the span, and large where
// E² comes near a zero: then ask a Path.
func (p *Nodes) Fill(u Universe, s *Sight) (omitted float64) {
	e := u.expansion()
	h, n := s.h, p.n
	if e.lambda {
		for k, x := range p.x[:n] {
			h[k] = x / math.Sqrt(((e.or*x+e.om)*x+e.ok)*x*x+e.ol)
		}
	} else {
		for k, x := range p.x[:n] {
			h[k] = x / math.Sqrt(e.squared(x, p.y[k], p.a[k]))
		}
	}
	copy(s.out, p.start)
	blas64.Gemv(blas.NoTrans, 1, p.rule, blas64.Vector{N: n, Data: h, Inc: 1}, 1, blas64.Vector{N: len(s.out), Data: s.out, Inc: 1})
	omitted = Remainder(s.out[len(p.z):]) / float64(n)
	if s.Shape != nil {
		p.shape(e.ok, s)
		chi := p.z[n-1] * s.out[n-1]
		s.Past = e.ok*chi*chi < -math.Pi*math.Pi*(1+4*omitted)
	}
	for i, chi := range s.out[n:len(p.z)] {
		s.DM[i] = transverse(e.ok, chi)
		s.DH[i] = 1 / math.Sqrt(e.squared(p.x[n+i], p.y[n+i], p.a[n+i]))
	}
	return omitted
}

// shape fills in ln(DM/z).
func (p *Nodes) shape(ok float64, s *Sight) {
	n := p.n
	shape, ratio, z := s.Shape[:n], s.out[:n], p.z[:n]
	far := z[n-1] * ratio[n-1]
	if math.Abs(ok*far*far) <= 1 { // χ grows with the redshift
		for k, q := range ratio {
			chi := z[k] * q
			shape[k] = q * entire(ok*chi*chi)
		}
	} else {
		for k, q := range ratio {
			chi := z[k] * q
			shape[k] = q * sinc(ok*chi*chi)
		}
	}
	logarithms(shape)
}

// entire is sinc for |u| ≤ 1: its series multiplied out, and summed in two halves that do not wait for each other.
func entire(u float64) float64 {
	const (
		c1 = 1. / 6
		c2 = c1 / 20
		c3 = c2 / 42
		c4 = c3 / 72
		c5 = c4 / 110
		c6 = c5 / 156
		c7 = c6 / 210
		c8 = c7 / 272
		c9 = c8 / 342
	)
	v := u * u
	return (1 + v*(c2+v*(c4+v*(c6+v*c8)))) + u*(c1+v*(c3+v*(c5+v*(c7+v*c9))))
}
