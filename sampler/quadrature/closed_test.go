package quadrature

import (
	"context"
	"math"
	"math/rand/v2"
	"testing"

	"gonum.org/v1/gonum/integrate/quad"
	"gonum.org/v1/gonum/mat"
)

// gaussian is a normalised Gaussian density, drawn at random with scales over several decades.
type gaussian struct {
	mean []float64
	cov  *mat.SymDense
	chol mat.Cholesky
}

func randomGaussian(rng *rand.Rand, d int) *gaussian {
	g := &gaussian{cov: mat.NewSymDense(d, nil)}
	scale := make([]float64, d)
	a := mat.NewDense(d, d+1, nil)
	for i := range d {
		scale[i] = math.Pow(10, 4*rng.Float64()-2)
		g.mean = append(g.mean, scale[i]*10*rng.NormFloat64())
		for j := range d + 1 {
			a.Set(i, j, scale[i]*rng.NormFloat64())
		}
	}
	g.cov.SymOuterK(1, a)
	if !g.chol.Factorize(g.cov) {
		panic("singular")
	}
	return g
}

func (g *gaussian) density() Density {
	d := len(g.mean)
	var l, inv mat.TriDense
	g.chol.LTo(&l)
	if err := inv.InverseTri(&l); err != nil {
		panic(err)
	}
	rows := mat.DenseCopyOf(&inv).RawMatrix().Data
	norm := -float64(d)/2*math.Log(2*math.Pi) - g.chol.LogDet()/2
	return func(x []float64) float64 {
		var chi2 float64
		for i := range d {
			var z float64
			for j := range i + 1 {
				z += rows[i*d+j] * (x[j] - g.mean[j])
			}
			chi2 += z * z
		}
		return norm - chi2/2
	}
}

func (g *gaussian) sd(i int) float64 { return math.Sqrt(g.cov.At(i, i)) }

// box reaches lopsidedly far beyond the Gaussian.
func (g *gaussian) box() (lo, hi []float64) {
	for i, m := range g.mean {
		lo, hi = append(lo, m-20*g.sd(i)), append(hi, m+57*g.sd(i))
	}
	return lo, hi
}

// along returns the direction a·x in units of its own standard deviation, and its mean.
func (g *gaussian) along(a []float64) func(x []float64) float64 {
	var v, m float64
	for i := range a {
		m += a[i] * g.mean[i]
		for j := range a {
			v += a[i] * a[j] * g.cov.At(i, j)
		}
	}
	return func(x []float64) float64 {
		s := -m
		for i := range a {
			s += a[i] * x[i]
		}
		return s / math.Sqrt(v)
	}
}

// oneSigma is the probability within one standard deviation of a normal distribution, erf(1/√2).
const oneSigma = 0.6826894921370859

// upper is the probability of a standard normal above z.
func upper(z float64) float64 { return math.Erfc(z/math.Sqrt2) / 2 }

func integrate(t *testing.T, p Problem, o Options) *Result {
	t.Helper()
	r, err := Integrate(context.Background(), p, o)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// within fails unless got is as close to want as it says itself, and to the tolerance.
func within(t *testing.T, what string, got Estimate, want, tolerance float64) {
	t.Helper()
	if d := math.Abs(got.Value - want); !(d <= got.Err && d <= tolerance) {
		t.Errorf("%s = %.12g ± %.1g, want %.12g: off by %.2g, tolerance %.2g", what, got.Value, got.Err, want, d, tolerance)
	}
}

func fixed(d Density) func() Density { return func() Density { return d } }

func TestGaussianEvidenceAndMarginals(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	for trial := range 6 {
		g := randomGaussian(rng, 1+trial%3)
		lo, hi := g.box()
		r := integrate(t, Problem{Density: g.density, Lo: lo, Hi: hi}, DefaultOptions())
		within(t, "ln evidence", r.LogEvidence, 0, 1e-6)
		if r.Warnings != nil {
			t.Error(r.Warnings)
		}
		for i := range g.mean {
			m := &r.Marginals[i]
			sd := g.sd(i)
			off := m.Disagreement(g.mean[i], sd, g.mean[i], oneSigma, g.mean[i]-sd, g.mean[i]+sd)
			l, u := m.Interval(0.95)
			l95, u95 := (l-g.mean[i])/sd+1.959963984540054, (u-g.mean[i])/sd-1.959963984540054
			hl, hu := m.HighestDensity(oneSigma)
			if off > 1e-5 || math.Abs(l95)+math.Abs(u95) > 2e-5 || math.Abs(hu-hl-2*sd) > 1e-4*sd {
				t.Errorf("%d dim, coordinate %d: off by %.2g, 95%% ends by %.2g %.2g, highest density [%g %g]", len(lo), i, off, l95, u95, hl, hu)
			}
		}
	}
}

func TestTruncatedByTheBox(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for trial := range 6 {
		g := randomGaussian(rng, 1+trial%3)
		lo, hi := g.box()
		i := rng.IntN(len(lo))
		z := 3 * (rng.Float64() - 0.5)
		lo[i] = g.mean[i] + z*g.sd(i)
		r := integrate(t, Problem{Density: g.density, Lo: lo, Hi: hi}, DefaultOptions())
		within(t, "ln evidence", r.LogEvidence, math.Log(upper(z)), 1e-6)
		// the mean of a truncated normal is φ/Q (common knowledge)
		mean := g.mean[i] + g.sd(i)*math.Exp(-z*z/2)/math.Sqrt(2*math.Pi)/upper(z)
		if m := r.Marginals[i]; math.Abs(m.Mean-mean) > 1e-5*g.sd(i) || m.X[0] != lo[i] {
			t.Errorf("mean %g, want %g; grid begins at %g, box at %g", m.Mean, mean, m.X[0], lo[i])
		}
	}
}

func TestTruncatedByAPlane(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	for trial := range 4 {
		g := randomGaussian(rng, 2+trial%2)
		a := make([]float64, len(g.mean))
		for i := range a {
			a[i] = rng.NormFloat64() / g.sd(i)
		}
		along, z := g.along(a), 2*(rng.Float64()-0.5)
		lo, hi := g.box()
		r := integrate(t, Problem{Lo: lo, Hi: hi, Density: func() Density {
			d := g.density()
			return func(x []float64) float64 {
				if along(x) < z {
					return math.NaN()
				}
				return d(x)
			}
		}}, DefaultOptions())
		within(t, "ln evidence", r.LogEvidence, math.Log(upper(z)), 1e-6)
	}
}

// An ellipse and a ball off the centre and sheared, so that no chord lies where a cut is.
func TestCurvedSupport(t *testing.T) {
	ball := func(x []float64) float64 {
		var s, before float64
		for _, v := range x {
			v -= 0.37 + 0.8*before
			s += v * v
			before = v
		}
		if s > 1 {
			return math.Inf(-1)
		}
		return 0
	}
	r := integrate(t, Problem{Density: fixed(ball), Lo: []float64{-2, -3}, Hi: []float64{5, 4}}, DefaultOptions())
	within(t, "ln area of the ellipse", r.LogEvidence, math.Log(math.Pi), 1e-6)
	m := &r.Marginals[0]
	for i, x := range m.X {
		u := min(max(x-0.37, -1), 1) // the distribution of a chord's position in a disc
		if want := 0.5 + (u*math.Sqrt(1-u*u)+math.Asin(u))/math.Pi; math.Abs(m.CDF[i]-want) > 1e-6 {
			t.Fatalf("cumulative %g at %g, want %g", m.CDF[i], x, want)
		}
	}
	o := DefaultOptions()
	o.Tolerance = 1e-4
	r = integrate(t, Problem{Density: fixed(ball), Lo: []float64{-2, -3, -2}, Hi: []float64{5, 4, 3}}, o)
	within(t, "ln volume of the ball", r.LogEvidence, math.Log(4*math.Pi/3), 1e-4)
	if sd := math.Sqrt(0.2 * (1 + 0.64)); math.Abs(r.Marginals[1].SD-sd) > 1e-4 {
		t.Errorf("standard deviation in the ball %g, want %g", r.Marginals[1].SD, sd)
	}
}

// banana has unit mass along x1 = b·x0², of width w.
func banana(b, w float64) Density {
	return func(x []float64) float64 {
		v := (x[1] - b*x[0]*x[0]) / w
		return -(x[0]*x[0]+v*v)/2 - math.Log(2*math.Pi*w)
	}
}

func TestBanana(t *testing.T) {
	for _, c := range []struct{ b, w float64 }{{1, 0.3}, {3, 0.05}, {-0.5, 1}} {
		r := integrate(t, Problem{Density: fixed(banana(c.b, c.w)), Lo: []float64{-10, -400}, Hi: []float64{10, 400}}, DefaultOptions())
		within(t, "ln evidence", r.LogEvidence, 0, 1e-5)
		m, sd := r.Marginals[1], math.Sqrt(2*c.b*c.b+c.w*c.w) // mean and variance of χ²: 1 and 2
		if math.Abs(m.Mean-c.b) > 1e-5*sd || math.Abs(m.SD-sd) > 1e-5*sd {
			t.Errorf("banana %v: %g ± %g, want %g ± %g", c, m.Mean, m.SD, c.b, sd)
		}
	}
}

func TestTwoPeaks(t *testing.T) {
	peak := func(x []float64, at, s float64) float64 {
		a, b := (x[0]-at)/s, (x[1]-at)/s
		return math.Exp(-(a*a+b*b)/2) / (2 * math.Pi * s * s)
	}
	r := integrate(t, Problem{Density: fixed(func(x []float64) float64 {
		return math.Log(0.3*peak(x, -2, 0.2) + 0.7*peak(x, 1, 0.4))
	}), Lo: []float64{-6, -8}, Hi: []float64{6, 5}}, DefaultOptions())
	within(t, "ln evidence", r.LogEvidence, 0, 1e-6)
	if m := r.Marginals[1].Mean; math.Abs(m-0.1) > 1e-6 {
		t.Errorf("mean %g, want 0.1", m)
	}
}

func TestRareClass(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	const z = 5.6 // P = 1.07e-8
	for trial := range 6 {
		g := randomGaussian(rng, 1+trial%3)
		a := make([]float64, len(g.mean))
		for i := range a {
			a[i] = rng.NormFloat64() / g.sd(i)
		}
		along := g.along(a)
		lo, hi := g.box()
		r := integrate(t, Problem{Density: g.density, Lo: lo, Hi: hi, Classes: 2, Class: func(x []float64) int {
			if along(x) > z {
				return 1
			}
			return 0
		}}, DefaultOptions())
		within(t, "rare class", r.Classes[1], upper(z), 1e-3*upper(z))
		within(t, "common class", r.Classes[0], 1-upper(z), 1e-6)
		if p := r.Nodes.Probability(1); math.Abs(p.Value/r.Classes[1].Value-1) > 1e-6 {
			t.Errorf("nodes give %g, integration %g", p.Value, r.Classes[1].Value)
		}
	}
}

// The class beyond a parabola with its tip towards the mode: a thin region that begins far out in the tail.
func TestRareClassWithATip(t *testing.T) {
	normal := fixed(func(x []float64) float64 { return -(x[0]*x[0]+x[1]*x[1])/2 - math.Log(2*math.Pi) })
	for _, c := range []struct {
		at, bend float64
		axes     int // a spike thin in the outermost coordinate is out of reach
	}{{5.2, 1, 2}, {5, 8, 2}, {3, 100, 2}, {2, 800, 1}} {
		want := quad.Fixed(func(y float64) float64 {
			return math.Exp(-y*y/2) / math.Sqrt(2*math.Pi) * upper(c.at+c.bend*(y-0.7)*(y-0.7))
		}, -4, 4, 2000, quad.Legendre{}, 0)
		for axis := range c.axes {
			r := integrate(t, Problem{Density: normal, Lo: []float64{-30, -40}, Hi: []float64{40, 35}, Classes: 3,
				Class: func(x []float64) int {
					if y := x[1-axis] - 0.7; x[axis] > c.at+c.bend*y*y {
						return 2
					}
					return -1
				}}, DefaultOptions())
			within(t, "class with a tip", r.Classes[2], want, 3e-3*want)
			if r.Classes[0].Value != 0 {
				t.Errorf("an empty class has probability %g", r.Classes[0].Value)
			}
		}
	}
}

// Gamma-distributed coordinates, mixed linearly: skewed, with exponential tails and a corner of the support.
func TestErrorsAreHonest(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 10))
	for trial := range 12 {
		k0, k1, mix := 1.2+4*rng.Float64(), 2+8*rng.Float64(), rng.NormFloat64()
		l0, _ := math.Lgamma(k0)
		l1, _ := math.Lgamma(k1)
		o := DefaultOptions()
		o.Tolerance = math.Pow(10, -2-float64(trial%4))
		r := integrate(t, Problem{Density: fixed(func(x []float64) float64 {
			u, v := x[0], x[1]-mix*x[0]
			if u <= 0 || v <= 0 {
				return math.Inf(-1)
			}
			return (k0-1)*math.Log(u) - u - l0 + (k1-1)*math.Log(v) - v - l1
		}), Lo: []float64{-1, -200}, Hi: []float64{60, 250}}, o)
		within(t, "ln evidence", r.LogEvidence, 0, 10*o.Tolerance)
	}
}
