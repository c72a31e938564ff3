package density

import (
	"math"

	"gonum.org/v1/gonum/dsp/fourier"
)

// The boundary correction. With K the kernel of width h, u the distance from the point to a draw, S_m = Σ p u^m K
// over the draws and A_m = ∫ u^m K over the part of the line inside the edges, the local linear estimate
// (A2 S0 - A1 S1)/(A0 A2 - A1²) has a bias of order h² up to the edge (Jones 1993, Statist. and Computing 3,
// 135). It can turn negative; S0/A0·exp(A0 f/S0 - 1) cannot and keeps the order (Jones & Foster 1996,
// Statistica Sinica 6, 1005). In two dimensions the same with vectors u. Far from edges A = (1, 0, h²) and
// both are the plain kernel estimate.

// smooth1 convolves the counts with the kernel. The second result is what a draw of unit weight adds to the
// density at its own place.
func smooth1(counts []float64, a axis, h float64) (p, self []float64) {
	size := 2 * a.n
	fft := fourier.NewCmplxFFT(size)
	z := make([]complex128, size)
	for i, c := range counts {
		z[i] = complex(c, a.inside(i)*a.dx) // draws in the real part, the line itself in the imaginary one
	}
	fft.Coefficients(z, z)
	var s [3][]complex128
	for m := range s {
		s[m] = make([]complex128, size)
		for j := range z {
			k := wavenumber(j, size, a.dx) * h
			s[m][j] = z[j] * moment1(m, k, h)
		}
		fft.Sequence(s[m], s[m])
	}
	scale := 1 / (float64(size) * a.dx)
	p, self = make([]float64, a.n), make([]float64, a.n)
	for i := range p {
		s0, s1 := real(s[0][i])*scale, real(s[1][i])*scale
		a0, a1, a2 := imag(s[0][i])*scale, imag(s[1][i])*scale, imag(s[2][i])*scale
		det := a0*a2 - a1*a1
		p[i] = positive(s0/a0, (a2*s0-a1*s1)/det)
		self[i] = a2 / det / (math.Sqrt(2*math.Pi) * h)
	}
	return p, self
}

// inside is the share of node i's cell that lies inside the edges.
func (a *axis) inside(i int) float64 {
	if i == 0 && a.left || i == a.n-1 && a.right {
		return 0.5
	}
	return 1
}

// wavenumber of coefficient j on a circle of size nodes a distance dx apart.
func wavenumber(j, size int, dx float64) float64 {
	if j > size/2 {
		j -= size
	}
	return 2 * math.Pi * float64(j) / (float64(size) * dx)
}

// moment1 is the Fourier transform of u^m K for the Gaussian kernel of width h at k = q/h.
func moment1(m int, q, h float64) complex128 {
	g := math.Exp(-q * q / 2)
	switch m {
	case 0:
		return complex(g, 0)
	case 1:
		return complex(0, -h*q*g)
	default:
		return complex(h*h*(1-q*q)*g, 0)
	}
}

// positive combines the renormalised and the local linear estimate (Jones & Foster 1996).
func positive(plain, linear float64) float64 {
	if !(plain > 1e-300) { // rounding of the FFT far from any draw
		return 0
	}
	return plain * math.Exp(min(linear/plain, 3)-1)
}

// field is the binned draws in two dimensions, in Fourier space: draws in the real part, the domain in the
// imaginary part before the transform.
type field struct {
	ax, ay   axis
	size     int
	fft      *fourier.CmplxFFT
	spectrum []complex128 // of the draws alone
	domain   []complex128 // of the domain alone; nil if no edge is near
	near     [4]float64   // share of the draws within a tenth of a standard deviation of each edge
}

func newField(x, y, w []float64, wsum float64, ax, ay axis, size int) *field {
	f := &field{ax: ax, ay: ay, size: size, fft: fourier.NewCmplxFFT(size), spectrum: make([]complex128, size*size)}
	for i := range x {
		kx, tx, okx := ax.place(x[i])
		ky, ty, oky := ay.place(y[i])
		if !okx || !oky {
			continue
		}
		s, k := at(w, i)/wsum, ky*size+kx
		f.spectrum[k] += complex((1-tx)*(1-ty)*s, 0)
		f.spectrum[k+1] += complex(tx*(1-ty)*s, 0)
		f.spectrum[k+size] += complex((1-tx)*ty*s, 0)
		f.spectrum[k+size+1] += complex(tx*ty*s, 0)
	}
	f.countNear()
	f.transform(f.spectrum, false)
	if ax.left || ax.right || ay.left || ay.right {
		f.domain = make([]complex128, size*size)
		for j := range ay.n {
			for i := range ax.n {
				f.domain[j*size+i] = complex(ax.inside(i)*ay.inside(j)*ax.dx*ay.dx, 0)
			}
		}
		f.transform(f.domain, false)
	}
	return f
}

// countNear measures how much probability lies within a tenth of a standard deviation of each edge.
func (f *field) countNear() {
	bx, by := int(0.1*f.ax.sd/f.ax.dx)+1, int(0.1*f.ay.sd/f.ay.dx)+1
	for j := range f.ay.n {
		for i := range f.ax.n {
			v := real(f.spectrum[j*f.size+i])
			for e, near := range [4]bool{
				f.ax.left && i < bx, f.ax.right && i >= f.ax.n-bx,
				f.ay.left && j < by, f.ay.right && j >= f.ay.n-by,
			} {
				if near {
					f.near[e] += v
				}
			}
		}
	}
}

// crowded says whether the density at some edge is a tenth of its typical height or more. A Gaussian has
// 0.04 of its draws within 0.1 standard deviations at its peak.
func (f *field) crowded() bool {
	for _, v := range f.near {
		if v > 0.004 {
			return true
		}
	}
	return false
}

func (f *field) kx(i int) float64 { return wavenumber(i, f.size, f.ax.dx) }
func (f *field) ky(j int) float64 { return wavenumber(j, f.size, f.ay.dx) }

// transform is the two-dimensional FFT in place: rows, then columns.
func (f *field) transform(z []complex128, inverse bool) {
	do := f.fft.Coefficients
	if inverse {
		do = f.fft.Sequence
	}
	n := f.size
	for j := range n {
		do(z[j*n:(j+1)*n], z[j*n:(j+1)*n])
	}
	transpose(z, n)
	for j := range n {
		do(z[j*n:(j+1)*n], z[j*n:(j+1)*n])
	}
	transpose(z, n)
}

// transpose works in blocks to stay in the cache.
func transpose(z []complex128, n int) {
	const b = 16
	for j0 := 0; j0 < n; j0 += b {
		for i0 := 0; i0 <= j0; i0 += b {
			for j := j0; j < j0+b; j++ {
				for i := i0; i < min(i0+b, j); i++ {
					z[j*n+i], z[i*n+j] = z[i*n+j], z[j*n+i]
				}
			}
		}
	}
}

// fewDraws is how many draws under the kernel make the slope of the local linear estimate as good as none. Towards
// fewer the estimate goes over to the plain one, or noise would fray the outlines where they meet an edge.
const fewDraws = 10

// manyDraws is how many draws under a kernel draw the outlines steadily. A kernel that suits the whole density has
// fewer in the tails: with 14,000 draws of a Gaussian 900 at the peak, but 45 at the outline of 95%, which then frays.
const manyDraws = 150

// adapted smooths with the kernel k where it has many draws and goes over to a wider one where it has few, as their
// own density says. The wider one would put more than is there into the tails; it is scaled so that they keep what k
// gives them. Regions hold what they should in any case, for levels are calibrated on the draws.
func (f *field) adapted(k, wide sym2, ess float64) (p, self []float64) {
	p, self = f.smooth(k, ess)
	wideP, wideSelf := f.smooth(wide, ess)
	under := ess * 4 * math.Pi * math.Sqrt(k.det())
	trust := make([]float64, len(p)) // in k
	few, fewWide := 0., 0.
	for i := range p {
		trust[i] = 1 / (1 + math.Pow(manyDraws/max(under*wideP[i], 1e-9), 4))
		few += (1 - trust[i]) * p[i]
		fewWide += (1 - trust[i]) * wideP[i]
	}
	scale := 1.
	if fewWide > 0 {
		scale = few / fewWide
	}
	for i, t := range trust {
		p[i] = t*p[i] + (1-t)*scale*wideP[i]
		self[i] = t*self[i] + (1-t)*scale*wideSelf[i]
	}
	return p, self
}

// smooth convolves with the Gaussian of covariance k the draws worth ess independent ones; see smooth1 for the
// results.
func (f *field) smooth(k sym2, ess float64) (p, self []float64) {
	nx, ny := f.ax.n, f.ay.n
	p, self = make([]float64, nx*ny), make([]float64, nx*ny)
	peak := 1 / (2 * math.Pi * math.Sqrt(k.det()))
	scale := 1 / (float64(f.size*f.size) * f.ax.dx * f.ay.dx)
	if f.domain == nil {
		s := f.convolve(f.spectrum, k, f.gauss(k), 0)
		for j := range ny {
			for i := range nx {
				p[j*nx+i], self[j*nx+i] = max(0, real(s[j*f.size+i])*scale), peak
			}
		}
		return p, self
	}
	g := f.gauss(k)
	var m [6][]complex128
	z := make([]complex128, len(f.spectrum))
	for i := range z {
		z[i] = f.spectrum[i] + complex(0, 1)*f.domain[i]
	}
	for i := range m {
		m[i] = f.convolve(z, k, g, i)
	}
	for j := range ny {
		for i := range nx {
			plain, linear, own := local(m, j*f.size+i, scale)
			draws := ess * plain * 2 / peak // under the kernel, 4π√det times the density
			trust := draws / (draws + fewDraws)
			p[j*nx+i], self[j*nx+i] = positive(plain, plain+trust*(linear-plain)), own*peak
		}
	}
	return p, self
}

// local solves the 3 × 3 system of the local linear estimate at cell c by Cramer's rule.
func local(m [6][]complex128, c int, scale float64) (plain, linear, own float64) {
	s0, sx, sy := real(m[0][c]), real(m[1][c]), real(m[2][c])
	a0, ax, ay := imag(m[0][c]), imag(m[1][c]), imag(m[2][c])
	axx, axy, ayy := imag(m[3][c]), imag(m[4][c]), imag(m[5][c])
	c0 := axx*ayy - axy*axy
	cx := axy*ay - ax*ayy
	cy := ax*axy - axx*ay
	det := a0*c0 + ax*cx + ay*cy
	return s0 / a0, (s0*c0 + sx*cx + sy*cy) / det, c0 / (det * scale)
}

// gauss is the Fourier transform of the Gaussian of covariance k.
func (f *field) gauss(k sym2) []float64 {
	g := make([]float64, len(f.spectrum))
	for j := range f.size {
		ky := f.ky(j)
		for i := range f.size {
			if q := k.form(f.kx(i), ky); q < 80 { // exp(-40) is below the rounding of the transform
				g[j*f.size+i] = math.Exp(-q / 2)
			}
		}
	}
	return g
}

// convolve multiplies the spectrum with that of a moment of the kernel and transforms back. Moments 0 to 5
// are K, uK, vK, u²K, uvK, v²K for the displacement (u, v).
func (f *field) convolve(z []complex128, k sym2, g []float64, moment int) []complex128 {
	out := make([]complex128, len(z))
	for j := range f.size {
		ky := f.ky(j)
		for i := range f.size {
			c := j*f.size + i
			if g[c] == 0 {
				continue
			}
			kx := f.kx(i)
			out[c] = z[c] * moment2(moment, k, k.xx*kx+k.xy*ky, k.xy*kx+k.yy*ky) * complex(g[c], 0)
		}
	}
	f.transform(out, true)
	return out
}

// moment2 is the polynomial that turns the transform of the kernel into that of a moment; (hx, hy) is the
// covariance times the wave vector.
func moment2(moment int, k sym2, hx, hy float64) complex128 {
	switch moment {
	case 0:
		return 1
	case 1:
		return complex(0, -hx)
	case 2:
		return complex(0, -hy)
	case 3:
		return complex(k.xx-hx*hx, 0)
	case 4:
		return complex(k.xy-hx*hy, 0)
	}
	return complex(k.yy-hy*hy, 0)
}

// sym2 is a symmetric 2 × 2 matrix.
type sym2 struct{ xx, xy, yy float64 }

func (s sym2) det() float64              { return s.xx*s.yy - s.xy*s.xy }
func (s sym2) form(x, y float64) float64 { return s.xx*x*x + 2*s.xy*x*y + s.yy*y*y }
func (s sym2) scaled(f float64) sym2     { return sym2{s.xx * f, s.xy * f, s.yy * f} }

// narrow is the smaller eigenvalue.
func (s sym2) narrow() float64 {
	half := (s.xx + s.yy) / 2
	return half - math.Hypot((s.xx-s.yy)/2, s.xy)
}

// inUnits is the matrix with x and y measured in units of dx and dy.
func (s sym2) inUnits(dx, dy float64) sym2 {
	return sym2{s.xx / (dx * dx), s.xy / (dx * dy), s.yy / (dy * dy)}
}

// atLeast widens the matrix so that its narrow side spans dx and dy.
func (s sym2) atLeast(dx, dy float64) sym2 {
	if lack := 1 - s.inUnits(dx, dy).narrow(); lack > 0 {
		s.xx += lack * dx * dx
		s.yy += lack * dy * dy
	}
	return s
}

// covariance of the draws, with the robust widths of the axes.
func covariance(x, y, w []float64, wsum float64, ax, ay axis) sym2 {
	sum := 0.0
	for i := range x {
		sum += (x[i] - ax.mean) * (y[i] - ay.mean) * at(w, i)
	}
	rho := sum / (wsum * ax.sd * ay.sd)
	rho = max(-0.9999, min(rho, 0.9999))
	return sym2{ax.sigma * ax.sigma, rho * ax.sigma * ay.sigma, ay.sigma * ay.sigma}
}
