package quadrature

import (
	"cmp"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/optimize"
)

// search finds the mode of a density on a box, deterministically.
type search struct {
	density Density
	lo, hi  []float64
	x       []float64
	evals   int
}

// value is ln p at a point of the unit cube, -Inf outside of it.
func (s *search) value(u []float64) float64 {
	for i, v := range u {
		if !(v >= 0 && v <= 1) {
			return math.Inf(-1)
		}
		s.x[i] = s.lo[i] + v*(s.hi[i]-s.lo[i])
	}
	s.evals++
	if v := s.density(s.x); !math.IsNaN(v) && !math.IsInf(v, 1) {
		return v
	}
	return math.Inf(-1)
}

type candidate struct {
	u []float64
	v float64
}

// maximise scans the box with an additive recurrence on powers of the root of g^(d+1) = g + 1 (Roberts 2018,
// "The unreasonable effectiveness of quasirandom sequences", from memory) and climbs from the best points and
// from start by Nelder & Mead (1965), twice, since a collapsed simplex has been known to stop short.
func (s *search) maximise(start []float64) (candidate, error) {
	cs := s.scan(400 * len(s.lo))
	if start != nil {
		u := make([]float64, len(start))
		for i := range u {
			u[i] = (start[i] - s.lo[i]) / (s.hi[i] - s.lo[i])
		}
		cs = append([]candidate{{u, s.value(u)}}, cs[:3]...)
	}
	best := candidate{v: math.Inf(-1)}
	for _, c := range cs[:4] {
		if math.IsInf(c.v, -1) {
			continue
		}
		if c = s.climb(s.climb(c, 0.05), 0.002); c.v > best.v {
			best = c
		}
	}
	if best.u == nil {
		return best, ErrNoSupport
	}
	return s.climb(best, 1e-4), nil
}

// scan returns points of the unit cube, best first.
func (s *search) scan(n int) []candidate {
	d := len(s.lo)
	g := 1.5
	for range 50 {
		g = math.Pow(1+g, 1/float64(d+1))
	}
	cs := make([]candidate, n)
	for k := range cs {
		u := make([]float64, d)
		for i := range u {
			_, u[i] = math.Modf(0.5 + float64(k)*math.Pow(g, -float64(i+1)))
		}
		cs[k] = candidate{u, s.value(u)}
	}
	slices.SortStableFunc(cs, func(a, b candidate) int { return cmp.Compare(b.v, a.v) })
	return cs
}

func (s *search) climb(c candidate, size float64) candidate {
	p := optimize.Problem{Func: func(u []float64) float64 { return -s.value(u) }}
	r, err := optimize.Minimize(p, c.u, &optimize.Settings{FuncEvaluations: 400 * len(c.u)},
		&optimize.NelderMead{SimplexSize: size})
	if r == nil || (err != nil && r.X == nil) || !(-r.F > c.v) {
		return c
	}
	return candidate{slices.Clone(r.X), -r.F}
}

// shape guesses mean and covariance from the mode: the inverse of the curvature by central differences over
// steps that cost half a unit of ln p, or a diagonal of those steps where the curvature is no covariance
// (a mode on an edge, a flat direction).
func (s *search) shape(c candidate) guess {
	d := len(c.u)
	h := make([]float64, d)
	for i := range h {
		h[i] = s.step(c, i)
	}
	cov := mat.NewSymDense(d, nil)
	var chol mat.Cholesky
	if chol.Factorize(s.curvature(c, h)) {
		if chol.InverseTo(cov) != nil {
			cov.Zero()
		}
	}
	g := guess{ref: c.v, mean: make([]float64, d), cov: cov}
	sane := true
	for i := range d {
		v := cov.At(i, i)
		sane = sane && v > 0 && v < 1
	}
	for i := range d {
		wi := s.hi[i] - s.lo[i]
		g.mean[i] = s.lo[i] + c.u[i]*wi
		for j := range i + 1 {
			v := cov.At(i, j)
			if !sane {
				v = 0
				if i == j {
					v = h[i] * h[i]
				}
			}
			cov.SetSym(i, j, v*wi*(s.hi[j]-s.lo[j]))
		}
	}
	return g
}

// step returns how far from the mode along coordinate i ln p has fallen by one half: the longer of both sides.
func (s *search) step(c candidate, i int) float64 {
	u := slices.Clone(c.u)
	side := func(end float64) float64 {
		in, out := c.u[i], end
		for range 60 {
			if u[i] = (in + out) / 2; s.value(u) > c.v-0.5 {
				in = u[i]
			} else {
				out = u[i]
			}
		}
		return math.Abs(in - c.u[i])
	}
	return math.Max(math.Max(side(0), side(1)), 1e-12)
}

// curvature is minus the matrix of second derivatives at the mode, in units of the cube.
func (s *search) curvature(c candidate, h []float64) *mat.SymDense {
	d := len(h)
	m := mat.NewSymDense(d, nil)
	u := slices.Clone(c.u)
	at := func(i, j int, a, b float64) float64 {
		copy(u, c.u)
		u[i] += a * h[i]
		u[j] += b * h[j]
		return s.value(u)
	}
	for i := range d {
		m.SetSym(i, i, (2*c.v-at(i, i, 1, 0)-at(i, i, -1, 0))/(h[i]*h[i]))
		for j := range i {
			cross := at(i, j, 1, 1) - at(i, j, 1, -1) - at(i, j, -1, 1) + at(i, j, -1, -1)
			m.SetSym(i, j, -cross/(4*h[i]*h[j]))
		}
	}
	return m
}

// gaussian tells whether the density is close to the Gaussian of the guess two and four standard deviations
// away from the mode, along each axis of its Cholesky factor and inside the box: then no pilot is needed.
func (s *search) gaussian(g guess) bool {
	d := len(g.mean)
	var chol mat.Cholesky
	if !chol.Factorize(g.cov) {
		return false
	}
	var l mat.TriDense
	chol.LTo(&l)
	u := make([]float64, d)
	for axis := range d {
		for _, k := range [...]float64{-4, -2, 2, 4} {
			for i := range u {
				u[i] = (g.mean[i] + k*l.At(i, axis) - s.lo[i]) / (s.hi[i] - s.lo[i])
			}
			if fall := g.ref - s.value(u); !(math.Abs(fall/(k*k/2)-1) < 0.3) {
				return false
			}
		}
	}
	return true
}
