package density

import (
	"math"

	"gonum.org/v1/gonum/dsp/fourier"
)

// bandwidth1 is the two-stage direct plug-in width of a Gaussian kernel (Sheather & Jones 1991, J. R. Statist.
// Soc. B 53, 683; Wand & Jones 1995, Kernel Smoothing, §3.6.1): h = (2√π ψ4 n)^(-1/5) with
// ψ_r = ∫ f^(r) f estimated from the draws by a kernel whose width follows from ψ_(r+2), which starts at the
// value of a Gaussian. The ψ_r are sums over the cosine transform of the binned draws, whose even
// continuation leaves no jump at a hard edge.
func bandwidth1(counts []float64, a axis, ess float64) float64 {
	power, dk := cosinePower(counts, a)
	psi := func(r int, g float64) float64 {
		sum := 0.0
		for j := 1; j < len(power); j++ {
			k := float64(j) * dk
			t := k * k * g * g / 2
			if t > 700 {
				break
			}
			sum += math.Pow(k, float64(r)) * power[j] * math.Exp(-t)
		}
		return sum * 2 * dk / math.Pi // 2/L Σ, without the sign (-1)^(r/2)
	}
	const root2pi = 2.5066282746310002
	psi8 := 105 / (32 * math.Sqrt(math.Pi) * math.Pow(a.sigma, 9))
	psi6 := psi(6, math.Pow(2*15/root2pi/(psi8*ess), 1./9))
	psi4 := psi(4, math.Pow(2*3/root2pi/(psi6*ess), 1./7))
	h := math.Pow(1/(2*math.Sqrt(math.Pi)*psi4*ess), 1./5)
	// No density of this spread asks for more smoothing than the first bound (Terrell 1990, J. Am. Statist.
	// Assoc. 85, 470), unless it is held up by two edges, as one that follows its flat prior is.
	most := 1.144 * a.sd * math.Pow(ess, -1./5)
	if a.left && a.right {
		most = max(most, float64(a.n-1)*a.dx/4)
	}
	return max(min(h, most), 1.2*a.dx) // below the spacing the sampled kernel would ring
}

// cosinePower returns |F_j|² with F_j = Σ p cos(j π (x-x0)/L), and the step π/L.
func cosinePower(counts []float64, a axis) ([]float64, float64) {
	c := append([]float64(nil), counts...)
	c[0] *= 2 // the ends stand once in the even continuation, the others twice
	c[len(c)-1] *= 2
	fourier.NewDCT(len(c)).Transform(c, c)
	for j, v := range c {
		c[j] = v * v / 4
	}
	return c, math.Pi / (float64(a.n-1) * a.dx)
}

// bandwidth is the two-dimensional direct plug-in factor h of the kernel covariance h²Σ, Σ being that of the
// draws: h = (2π n ψ4)^(-1/6), where ψ4 = ∫(∇²f)² in the coordinates in which Σ is the unit matrix
// (Wand & Jones 1994, Comput. Statist. 9, 97; one pilot for all terms as in Duong & Hazelton 2003,
// J. Nonparam. Statist. 15, 17). The pilots follow from the same expansion as in one dimension: with Gaussian
// ψ8 = 12/2π, g6 = (8/n)^(1/10), and g4 = (8/(π n ψ6))^(1/8). For a Gaussian all this gives n^(-1/6).
// The rule minimises the error of the density, not of its outlines. The closer the draws are to a Gaussian, the less
// a kernel of their own shape bends the outlines, whose level is calibrated afterwards, and the more a wider one
// steadies them: up to a third wider than the rule says. Where draws crowd against a hard edge the spectrum sees the
// jump, not the curvature, and 1.25 times the value for the Gaussian is taken.
func (f *field) bandwidth(shape sym2, ess float64) float64 {
	normal := math.Pow(ess, -1./6)
	if f.crowded() {
		return 1.25 * normal
	}
	psi6 := f.curvature(shape, 6, math.Pow(8/ess, 1./10))
	psi4 := f.curvature(shape, 4, math.Pow(8/(math.Pi*ess*psi6), 1./8))
	h := math.Pow(2*math.Pi*ess*psi4, -1./6)
	gaussian := min(max((h/normal-0.7)/0.2, 0), 1) // 0 far from a Gaussian, 1 close to it
	return min(max(h*(1+gaussian/3), 0.2*normal), 4./3*normal)
}

// curvature is ∫|k|^r |F|² exp(-k²g²/2) d²k/(2π)² in the whitened coordinates, r = 4 or 6.
func (f *field) curvature(shape sym2, r int, g float64) float64 {
	sum := 0.0
	for j := range f.size {
		ky := f.ky(j)
		for i := range f.size {
			q := shape.form(f.kx(i), ky)
			t := q * g * g / 2
			if t > 50 {
				continue
			}
			power := q * q
			if r == 6 {
				power *= q
			}
			v := f.spectrum[j*f.size+i]
			sum += power * (real(v)*real(v) + imag(v)*imag(v)) * math.Exp(-t)
		}
	}
	area := float64(f.size*f.size) * f.ax.dx * f.ay.dx
	return sum * math.Sqrt(shape.det()) / area
}
