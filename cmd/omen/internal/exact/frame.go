package exact

import (
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// frame is a change of coordinates x = centre + L u in which a posterior that is well
// inside its priors is round: integration by nested lines then finds each line where the one
// before it was, whatever the correlations. The volume of u is that of x over |L|.
type frame struct {
	centre []float64
	l      *mat.TriDense // lower
	extent []float64     // of the box in u, on either side
}

// reach is how far the box goes in standard deviations, at least. Beyond it lies 4e-12
// of a Gaussian, and up to it a line needs no more cuts than the one in its middle.
const reach = 6.95

// newFrame looks at a density around its mode. Nil where it is not a peak with its
// surroundings inside the box: then the coordinates are good as they are.
func newFrame(density func(x []float64) float64, mode, lo, hi []float64) *frame {
	f := &frame{centre: slices.Clone(mode)}
	dim := len(mode)
	scale := mat.NewTriDense(dim, mat.Lower, nil)
	for i := range mode {
		scale.SetTri(i, i, (hi[i]-lo[i])/100)
	}
	f.l = scale
	for range 3 { // each time in the coordinates of the last
		if !f.improve(density) {
			return nil
		}
	}
	for i := range mode {
		sd := f.sd(i)
		if mode[i]-reach*sd < lo[i] || mode[i]+reach*sd > hi[i] {
			return nil
		}
	}
	f.measure(density)
	return f
}

// sd is the standard deviation of the i-th parameter.
func (f *frame) sd(i int) float64 {
	sum := 0.0
	for k := range i + 1 {
		sum = math.Hypot(sum, f.l.At(i, k))
	}
	return sum
}

// at writes x of u.
func (f *frame) at(x, u []float64) {
	for i := range x {
		x[i] = f.centre[i]
		for k := range i + 1 {
			x[i] += f.l.At(i, k) * u[k]
		}
	}
}

// logVolume is ln |L|.
func (f *frame) logVolume() float64 {
	sum := 0.0
	for i := range f.centre {
		sum += math.Log(f.l.At(i, i))
	}
	return sum
}

// improve multiplies L with the Cholesky factor of the covariance that the curvature
// at the centre implies, by differences over steps that cost about half a unit of ln p.
func (f *frame) improve(density func(x []float64) float64) bool {
	dim := len(f.centre)
	x, u := make([]float64, dim), make([]float64, dim)
	value := func(set ...float64) float64 { // pairs of an axis and a position on it
		clear(u)
		for i := 0; i < len(set); i += 2 {
			u[int(set[i])] = set[i+1]
		}
		f.at(x, u)
		return density(x)
	}
	top := value()
	step := make([]float64, dim)
	for i := range step {
		h := 1.0
		for range 40 {
			drop := top - math.Min(value(float64(i), h), value(float64(i), -h))
			if drop > 0.25 && drop < 1 {
				break
			}
			h *= math.Min(math.Max(math.Sqrt(0.5/math.Max(drop, 1e-12)), 0.1), 10) // not a number counts as a steep drop
			if math.IsNaN(h) || math.IsInf(drop, 1) {
				h = 0.1
			}
		}
		step[i] = h
	}
	curvature := mat.NewSymDense(dim, nil)
	for i := range dim {
		a, h := float64(i), step[i]
		curvature.SetSym(i, i, (2*top-value(a, h)-value(a, -h))/(h*h))
		for j := range i {
			b, k := float64(j), step[j]
			mixed := value(a, h, b, k) - value(a, h, b, -k) - value(a, -h, b, k) + value(a, -h, b, -k)
			curvature.SetSym(i, j, -mixed/(4*h*k))
		}
	}
	var chol mat.Cholesky
	covariance := mat.NewSymDense(dim, nil)
	if !chol.Factorize(curvature) || chol.InverseTo(covariance) != nil || !chol.Factorize(covariance) {
		return false
	}
	var round mat.TriDense
	chol.LTo(&round)
	product := mat.NewTriDense(dim, mat.Lower, nil)
	product.MulTri(f.l, &round)
	f.l = product
	return true
}

// wider is the frame with a larger box; nil after some tries, when the coordinates are
// as good as they are.
func (f *frame) wider(tries int) *frame {
	if tries == 3 {
		return nil
	}
	for i := range f.extent {
		f.extent[i] *= 1.4
	}
	return f
}

// directions are how many rays measure the extent.
const directions = 300

// measure finds how far the density reaches: to where ln p has fallen by that of a
// Gaussian at reach, along rays in all directions.
func (f *frame) measure(density func(x []float64) float64) {
	dim := len(f.centre)
	f.extent = make([]float64, dim)
	for i := range f.extent {
		f.extent[i] = reach
	}
	x, u := make([]float64, dim), make([]float64, dim)
	f.at(x, u)
	floor := density(x) - reach*reach/2
	for n := range directions {
		ray := direction(n)
		inside := func(r float64) bool {
			for i := range u {
				u[i] = r * ray[i]
			}
			f.at(x, u)
			return density(x) > floor
		}
		r, grow := reach, 1.5
		for r < 100*reach && inside(r) {
			r *= grow
		}
		for range 5 { // back to where it begins to be outside
			if grow = math.Sqrt(grow); r > reach && !inside(r/grow) {
				r /= grow
			}
		}
		for i := range u {
			f.extent[i] = math.Max(f.extent[i], r*math.Abs(ray[i]))
		}
	}
}

// direction is one of evenly spread points on the sphere: Fibonacci's lattice (common
// practice).
func direction(n int) [3]float64 {
	z := 1 - (2*float64(n)+1)/directions
	phi := math.Pi * (3 - math.Sqrt(5)) * float64(n)
	s := math.Sqrt(1 - z*z)
	return [3]float64{s * math.Cos(phi), s * math.Sin(phi), z}
}
