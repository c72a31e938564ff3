package evidence

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"runtime"
	"strings"
	"testing"

	"omen/sampler/quadrature"
)

type logp = func(x []float64) float64

// gauss is a product of normals of unit mass, coordinate i of width 1+i, sheared: x_i += x_{i-1}.
func gauss(x []float64) float64 {
	s := -float64(len(x)) / 2 * math.Log(2*math.Pi)
	for i := range x {
		v := x[i]
		if i > 0 {
			v -= x[i-1]
		}
		v /= float64(1 + i)
		s -= v*v/2 + math.Log(float64(1+i))
	}
	return s
}

func drawGauss(x []float64, rng *rand.Rand) {
	for i := range x {
		x[i] = float64(1+i) * rng.NormFloat64()
		if i > 0 {
			x[i] += x[i-1]
		}
	}
}

// above cuts x_0 < z away.
func above(z float64, p logp) logp {
	return func(x []float64) float64 {
		if x[0] < z {
			return math.NaN()
		}
		return p(x)
	}
}

func banana(x []float64) float64 {
	v := (x[1] - x[0]*x[0]) / 0.4
	return -(x[0]*x[0]+v*v)/2 - math.Log(2*math.Pi*0.4)
}

func drawBanana(x []float64, rng *rand.Rand) {
	x[0] = rng.NormFloat64()
	x[1] = x[0]*x[0] + 0.4*rng.NormFloat64()
}

func wide(dim int) (lo, hi []float64) {
	for range dim {
		lo, hi = append(lo, -90), append(hi, 70)
	}
	return lo, hi
}

// sample draws n times, independently, what lies within the box.
func sample(n int, lo, hi []float64, p logp, draw func([]float64, *rand.Rand), rng *rand.Rand) Sample {
	s := Sample{ESS: float64(n)}
	x := make([]float64, len(lo))
	for len(s.LogP) < n {
		draw(x, rng)
		inside := true
		for i, v := range x {
			inside = inside && v > lo[i] && v < hi[i]
		}
		if v := p(x); inside && !math.IsNaN(v) {
			s.X, s.LogP = append(s.X, x...), append(s.LogP, v)
		}
	}
	return s
}

func target(p logp, lo, hi []float64) Target {
	return Target{Density: func() func([]float64) float64 { return p }, Lo: lo, Hi: hi}
}

func bridged(t *testing.T, s Sample, g Target, seed uint64) *Result {
	t.Helper()
	r, err := Bridge(context.Background(), s, g, seed)
	if err != nil {
		t.Fatal(err)
	}
	return r
}

func TestClosedForms(t *testing.T) {
	upper := func(z float64) float64 { return math.Erfc(z/math.Sqrt2) / 2 }
	for _, c := range []struct {
		name  string
		dim   int
		edge  float64 // of the box, in x_0
		p     logp
		draw  func([]float64, *rand.Rand)
		want  float64
		error float64 // largest that is acceptable
	}{
		{"gaussian", 2, -90, gauss, drawGauss, 0, 0.02},
		{"gaussian", 4, -90, gauss, drawGauss, 0, 0.02},
		{"gaussian", 6, -90, gauss, drawGauss, 0, 0.03},
		{"cut by the box", 3, 0.5, gauss, drawGauss, math.Log(upper(0.5)), 0.02},
		{"cut by the density", 3, -90, above(-0.3, gauss), drawGauss, math.Log(upper(-0.3)), 0.03},
		{"banana", 2, -90, banana, drawBanana, 0, 0.03},
	} {
		lo, hi := wide(c.dim)
		lo[0] = c.edge
		s := sample(8000, lo, hi, c.p, c.draw, rand.New(rand.NewPCG(1, uint64(c.dim))))
		r := bridged(t, s, target(c.p, lo, hi), 1)
		if d := math.Abs(r.LogEvidence.Value - c.want); d > 3*r.LogEvidence.Err || r.LogEvidence.Err > c.error || r.Warnings != nil {
			t.Errorf("%s, %d dim: %.4f ± %.4f, want %.4f ± at most %.4f; %v", c.name, c.dim, r.LogEvidence.Value, r.LogEvidence.Err, c.want, c.error, r.Warnings)
		}
	}
}

// A constant added to ln p is a constant added to ln evidence, however large.
func TestShift(t *testing.T) {
	lo, hi := wide(2)
	s := sample(2000, lo, hi, gauss, drawGauss, rand.New(rand.NewPCG(2, 2)))
	want := bridged(t, s, target(gauss, lo, hi), 1)
	for i := range s.LogP {
		s.LogP[i] -= 5000
	}
	got := bridged(t, s, target(func(x []float64) float64 { return gauss(x) - 5000 }, lo, hi), 1)
	if d := got.LogEvidence.Value + 5000 - want.LogEvidence.Value; math.Abs(d) > 1e-9 {
		t.Errorf("shifted by 5000, ln evidence is off by %g", d)
	}
}

// chain is an autoregressive sample of the banana: what a Markov chain with correlation rho from draw to draw
// of x_0 and of the distance from the ridge gives.
func chain(n int, rho float64, rng *rand.Rand) Sample {
	s := Sample{ESS: float64(n) * (1 - rho) / (1 + rho)}
	z := []float64{rng.NormFloat64(), rng.NormFloat64()}
	for range n {
		for k := range z {
			z[k] = rho*z[k] + math.Sqrt(1-rho*rho)*rng.NormFloat64()
		}
		x := []float64{z[0], z[0]*z[0] + 0.4*z[1]}
		s.X, s.LogP = append(s.X, x...), append(s.LogP, banana(x))
	}
	return s
}

// Over repeated samples the error is as large as the scatter: independent and correlated draws.
func TestErrorsAreHonest(t *testing.T) {
	for _, c := range []struct {
		name string
		s    func(rng *rand.Rand) Sample
		p    logp
		dim  int
	}{
		{"independent", func(rng *rand.Rand) Sample {
			lo, hi := wide(3)
			return sample(2000, lo, hi, gauss, drawGauss, rng)
		}, gauss, 3},
		{"correlated", func(rng *rand.Rand) Sample { return chain(8000, 0.95, rng) }, banana, 2},
		{"banana", func(rng *rand.Rand) Sample {
			lo, hi := wide(2)
			return sample(2000, lo, hi, banana, drawBanana, rng)
		}, banana, 2},
	} {
		lo, hi := wide(c.dim)
		const trials = 60
		var chi2, bias float64
		for seed := range uint64(trials) {
			r := bridged(t, c.s(rand.New(rand.NewPCG(seed, 3))), target(c.p, lo, hi), seed)
			z := r.LogEvidence.Value / r.LogEvidence.Err
			chi2 += z * z / trials
			bias += z / trials
		}
		// the standard error of the root mean square of 60 is 0.09, of the mean 0.13
		if rms := math.Sqrt(chi2); rms > 1.35 || rms < 0.6 || math.Abs(bias) > 0.45 {
			t.Errorf("%s: root mean square of error/stated %.2f, mean %.2f: want 1 and 0", c.name, rms, bias)
		}
	}
}

// The variance over the posterior draws by hand: the ratio takes two values at random from draw to draw, or
// from block to block, so that the sample is worth no more than its blocks.
func TestErrorKnowsOfCorrelation(t *testing.T) {
	rng := rand.New(rand.NewPCG(12, 12))
	for _, run := range []int{1, 500} {
		b := bridge{s1: 0.5, s2: 0.5, ess: 10000, proposed: []float64{1, 1, 1, 1}}
		for len(b.drawn) < 10000 {
			l := 1.0 + 2*float64(rng.IntN(2)) // 1/(s1·l + s2) is 1 or 1/2
			for range run {
				b.drawn = append(b.drawn, l)
			}
		}
		want := 0.25 / 0.75 / math.Sqrt(float64(10000/run))
		if e := b.relativeError(1); math.Abs(e/want-1) > 0.35 {
			t.Errorf("runs of %d: relative error %.4f, want %.4f", run, e, want)
		}
	}
}

// Against the exact integral, where the posterior is cut by the box and by a curve.
func TestAgainstQuadrature(t *testing.T) {
	for dim := 2; dim <= 3; dim++ {
		p := func(x []float64) float64 {
			if x[1] > 3-x[0]*x[0] {
				return math.Inf(-1)
			}
			return gauss(x) - 0.1*x[0]*x[1]*x[1]
		}
		lo, hi := []float64{-1.5, -4, -5}[:dim], []float64{3, 6, 9}[:dim]
		exact, err := quadrature.Integrate(context.Background(), quadrature.Problem{
			Density: func() quadrature.Density { return p }, Lo: lo, Hi: hi}, quadrature.DefaultOptions())
		if err != nil {
			t.Fatal(err)
		}
		s := metropolis(60000, lo, hi, p, rand.New(rand.NewPCG(4, uint64(dim))))
		r := bridged(t, s, target(p, lo, hi), 1)
		if d := math.Abs(r.LogEvidence.Value - exact.LogEvidence.Value); d > 3*r.LogEvidence.Err || r.LogEvidence.Err > 0.05 {
			t.Errorf("%d dim: bridge %v, quadrature %v", dim, r.LogEvidence, exact.LogEvidence)
		}
	}
}

// metropolis is a plain random walk; its draws are taken to be worth one in fifty.
func metropolis(n int, lo, hi []float64, p logp, rng *rand.Rand) Sample {
	s := Sample{ESS: float64(n) / 50}
	x, y := make([]float64, len(lo)), make([]float64, len(lo))
	v := p(x)
	for range n {
		inside := true
		for i := range y {
			y[i] = x[i] + 1.2*rng.NormFloat64()
			inside = inside && y[i] > lo[i] && y[i] < hi[i]
		}
		if inside {
			if w := p(y); math.Log(rng.Float64()) < w-v {
				v = w
				copy(x, y)
			}
		}
		s.X, s.LogP = append(s.X, x...), append(s.LogP, v)
	}
	return s
}

func TestDeterministic(t *testing.T) {
	lo, hi := wide(3)
	s := sample(2000, lo, hi, gauss, drawGauss, rand.New(rand.NewPCG(5, 5)))
	a := bridged(t, s, target(gauss, lo, hi), 9)
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(1))
	b := bridged(t, s, target(gauss, lo, hi), 9)
	c := bridged(t, s, target(gauss, lo, hi), 10)
	if a.LogEvidence != b.LogEvidence || a.LogEvidence == c.LogEvidence {
		t.Errorf("seed 9: %v and, on one core, %v; seed 10: %v", a.LogEvidence, b.LogEvidence, c.LogEvidence)
	}
}

func TestWhatCannotBeBridged(t *testing.T) {
	lo, hi := wide(2)
	good := sample(2000, lo, hi, gauss, drawGauss, rand.New(rand.NewPCG(6, 6)))
	for name, spoil := range map[string]func(s *Sample, g *Target){
		"too few":           func(s *Sample, _ *Target) { s.X, s.LogP = s.X[:100], s.LogP[:50] },
		"worth little":      func(s *Sample, _ *Target) { s.ESS = 5 },
		"worth nothing":     func(s *Sample, _ *Target) { s.ESS = math.NaN() },
		"outside the box":   func(s *Sample, _ *Target) { s.X[7] = 71 },
		"impossible draw":   func(s *Sample, _ *Target) { s.LogP[3] = math.Inf(-1) },
		"fixed parameter":   func(s *Sample, _ *Target) { fix(s, 1) },
		"density elsewhere": func(_ *Sample, g *Target) { *g = target(func([]float64) float64 { return math.Inf(-1) }, lo, hi) },
	} {
		s := Sample{append([]float64(nil), good.X...), append([]float64(nil), good.LogP...), good.ESS}
		g := target(gauss, lo, hi)
		spoil(&s, &g)
		if r, err := Bridge(context.Background(), s, g, 1); err == nil {
			t.Errorf("%s: %v, no error", name, r.LogEvidence)
		}
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Bridge(ctx, good, target(gauss, lo, hi), 1); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	good.ESS = 100
	if r := bridged(t, good, target(gauss, lo, hi), 1); len(r.Warnings) == 0 || !strings.Contains(r.Warnings[0], "100 independent") {
		t.Errorf("warnings %q, want one about 100 independent draws", r.Warnings)
	}
}

func fix(s *Sample, coordinate int) {
	for i := coordinate; i < len(s.X); i += 2 {
		s.X[i] = 1
	}
}

func TestBoxMap(t *testing.T) {
	b := box{[]float64{-3, 2}, []float64{5, 2.001}}
	rng := rand.New(rand.NewPCG(7, 7))
	x, y, s := make([]float64, 2), make([]float64, 2), make([]float64, 2)
	for range 1000 {
		for i := range x {
			x[i] = b.lo[i] + (b.hi[i]-b.lo[i])*math.Pow(rng.Float64(), 8)
		}
		j := b.toOpen(s, x)
		k := b.toBox(y, s)
		if math.Abs(y[0]-x[0]) > 1e-13 || math.Abs(y[1]-x[1]) > 1e-13 || math.Abs(j-k) > 1e-6*math.Abs(j) {
			t.Errorf("%v maps to %v and back to %v; Jacobians %g and %g", x, s, y, j, k)
		}
	}
	const h = 1e-5 // dx/dt by differences
	var d float64
	for i := range s {
		s[0], s[1] = 0.3, -1.2
		s[i] += h
		b.toBox(x, s)
		s[i] -= 2 * h
		b.toBox(y, s)
		d += math.Log((x[i] - y[i]) / (2 * h))
	}
	s[0], s[1] = 0.3, -1.2
	if j := b.toBox(x, s); math.Abs(j-d) > 1e-6 {
		t.Errorf("ln Jacobian %g, by differences %g", j, d)
	}
}

func BenchmarkBridge(b *testing.B) {
	lo, hi := wide(5)
	s := sample(20000, lo, hi, gauss, drawGauss, rand.New(rand.NewPCG(8, 8)))
	for b.Loop() {
		if _, err := Bridge(context.Background(), s, target(gauss, lo, hi), 1); err != nil {
			b.Fatal(err)
		}
	}
}
