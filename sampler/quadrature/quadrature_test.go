package quadrature

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"gonum.org/v1/gonum/integrate/quad"
)

func TestRule(t *testing.T) {
	var x, w [7]float64
	quad.Legendre{}.FixedLocations(x[:], w[:], -1, 1)
	for i := range x {
		if math.Abs(abscissa[2*i+1]+x[i]) > 1e-15 || // gonum's descend
			math.Abs(gauss[2*i+1]-w[i]) > 1e-15 {
			t.Errorf("Gauss node %d: %g weight %g, want %g %g", i, abscissa[2*i+1], gauss[2*i+1], x[i], w[i])
		}
	}
	for n := range 25 {
		var s float64
		for i, x := range abscissa {
			s += kronrod[i] * math.Pow(x, float64(n))
		}
		want := 0.0
		if n%2 == 0 {
			want = 2 / float64(n+1)
		}
		if exact := math.Abs(s-want) < 1e-14; exact != (n < 24) {
			t.Errorf("∫x^%d = %.17g, want %.17g only below degree 24", n, s, want)
		}
	}
}

// Both estimates of the error, on smooth and on kinked functions anywhere in the piece.
func TestRuleErrors(t *testing.T) {
	rng := rand.New(rand.NewPCG(11, 12))
	erf := func(a, b float64) float64 { return math.Sqrt(math.Pi) / 2 * (math.Erf(b) - math.Erf(a)) }
	low := 0
	for range 4000 {
		a, b, at := 6*rng.Float64()-3, 0.0, 0.0
		b = a + 5*rng.Float64()
		at = a + (b-a)*rng.Float64()
		c, f := core{a: a, b: b}, [points]vec{}
		for i := range f {
			x, _ := c.node(i)
			f[i][0], f[i][1] = math.Exp(-x*x), math.Abs(x-at)
		}
		c.sumRule(&f, 2)
		if d := math.Abs(c.val[0] - erf(a, b)); d > c.err[0]+1e-15 {
			t.Errorf("Gaussian on [%g, %g]: error %g, estimated %g", a, b, d, c.err[0])
		}
		if d := math.Abs(c.val[1] - ((at-a)*(at-a)+(b-at)*(b-at))/2); d > c.err[1] {
			low++
		}
	}
	if low > 80 {
		t.Errorf("the error of a kink is underestimated %d times in 4000", low)
	}
}

// cut is a correlated Gaussian cut by a curve, with classes: a bit of everything.
func cut(dim int) Problem {
	return Problem{Classes: 2, Class: func(x []float64) int {
		if x[0]+x[1] > 1 {
			return 1
		}
		return 0
	}, Density: fixed(func(x []float64) float64 {
		s := 0.0
		for i, v := range x {
			v -= 0.3 * float64(i)
			s += v * v / 0.02 * float64(1+i)
		}
		if x[1] > 0.4+x[0]*x[0] {
			return math.Inf(-1)
		}
		return -s - 8*x[0]*x[1]
	}), Lo: []float64{-1, -1, -3}[:dim], Hi: []float64{1.5, 2, 4}[:dim]}
}

func TestSameForAnyNumberOfWorkers(t *testing.T) {
	o := DefaultOptions()
	o.Tolerance, o.ClassTolerance = 1e-2, 1e-1
	for dim := 2; dim <= 3; dim++ {
		p := cut(dim)
		if dim == 3 {
			p.Lo, p.Hi = []float64{-0.4, -0.2, 0.2}, []float64{0.2, 0.6, 1} // little more than the mass: it is slow
		}
		o.Workers = 1
		want := integrate(t, p, o)
		o.Workers = 3
		got := integrate(t, p, o)
		if d := cmp.Diff(want, got, cmp.AllowUnexported(Nodes{}), cmpopts.EquateNaNs()); d != "" {
			t.Errorf("%d dimensions: 3 workers differ from 1: %.300s", dim, d)
		}
	}
}

func TestStoppedEarlyIsHonest(t *testing.T) {
	o := DefaultOptions()
	o.Tolerance, o.MaxEvaluations = 1e-10, 100
	r := integrate(t, Problem{Density: fixed(banana(2, 0.05)), Lo: []float64{-8, -100}, Hi: []float64{9, 200}}, o)
	if len(r.Warnings) == 0 || !strings.Contains(r.Warnings[0], "evaluations") {
		t.Errorf("warnings %q, want one about evaluations", r.Warnings)
	}
	if d := math.Abs(r.LogEvidence.Value); d > r.LogEvidence.Err {
		t.Errorf("ln evidence off by %g, stated %g", d, r.LogEvidence.Err)
	}
}

func TestReweight(t *testing.T) {
	g := randomGaussian(rand.New(rand.NewPCG(13, 14)), 3)
	lo, hi := g.box()
	r := integrate(t, Problem{Density: g.density, Lo: lo, Hi: hi, Classes: 2, Class: func(x []float64) int {
		if x[1] > g.mean[1]+g.sd(1) {
			return 1
		}
		return 0
	}}, DefaultOptions())
	// a prior ratio exp(z) with z = x1 in standard deviations shifts z by one
	n, ratio, err := r.Nodes.Reweight(func(x []float64) float64 { return math.Exp((x[1] - g.mean[1]) / g.sd(1)) })
	if err != nil {
		t.Fatal(err)
	}
	loose := func(e Estimate) Estimate { return Estimate{e.Value, e.Err + 1e-8} }
	within(t, "ln mean ratio", loose(ratio), 0.5, 1e-5)
	within(t, "mean", loose(n.Mean(func(x []float64) float64 { return (x[1] - g.mean[1]) / g.sd(1) })), 1, 1e-5)
	within(t, "class", loose(n.Probability(1)), 0.5, 1e-5)
	within(t, "class before", loose(r.Nodes.Probability(1)), upper(1), 1e-5)
	if _, _, err := n.Reweight(func([]float64) float64 { return math.NaN() }); err == nil {
		t.Error("a NaN ratio was taken")
	}
	if _, _, err := n.Reweight(func([]float64) float64 { return 0 }); err == nil {
		t.Error("a ratio of zero was taken")
	}
}

func TestDerived(t *testing.T) {
	for dim := 1; dim <= 3; dim++ {
		g := randomGaussian(rand.New(rand.NewPCG(15, uint64(dim))), dim)
		lo, hi := g.box()
		r := integrate(t, Problem{Density: g.density, Lo: lo, Hi: hi}, DefaultOptions())
		for axis := range dim {
			a := make([]float64, dim)
			for i := range a {
				a[i] = 0.5 / g.sd(i)
			}
			a[axis] *= 3
			along := g.along(a)
			m, err := r.Nodes.Marginal(along)
			if err != nil {
				t.Fatal(err)
			}
			if d := m.Disagreement(0, 1, 0, oneSigma, -1, 1); d > 0.01 {
				t.Errorf("%d dim, mostly along %d: off by %.2g standard deviations", dim, axis, d)
			}
		}
	}
}

// One pass at the tolerance that three parameters are given in practice: the nodes are few.
func TestDerivedFromFewNodes(t *testing.T) {
	o := DefaultOptions()
	o.Tolerance, o.ClassTolerance, o.Passes = 1e-4, 3e-3, 1
	for dim := 1; dim <= 3; dim++ {
		g := randomGaussian(rand.New(rand.NewPCG(18, uint64(dim))), dim)
		lo, hi := g.box()
		r := integrate(t, Problem{Density: g.density, Lo: lo, Hi: hi}, o)
		for axis := range dim {
			a := make([]float64, dim)
			a[axis] = 1
			m, err := r.Nodes.Marginal(g.along(a))
			if err != nil {
				t.Fatal(err)
			}
			l, u := m.Interval(0.95)
			d95 := math.Max(math.Abs(l+1.959963984540054), math.Abs(u-1.959963984540054))
			if d := m.Disagreement(0, 1, 0, oneSigma, -1, 1); d > 0.006 || d95 > 0.015 {
				t.Errorf("%d dim, coordinate %d: off by %.2g standard deviations, 95%% ends by %.2g", dim, axis, d, d95)
			}
		}
	}
}

func TestDerivedWithinAClass(t *testing.T) {
	r := integrate(t, Problem{Lo: []float64{-9, -9}, Hi: []float64{9, 9}, Classes: 2,
		Density: fixed(func(x []float64) float64 { return -(x[0]*x[0] + x[1]*x[1]) / 2 }),
		Class: func(x []float64) int {
			if x[0]+x[1] > 0 {
				return 1
			}
			return 0
		}}, DefaultOptions())
	half := r.Nodes.Select(func(_ []float64, class int) bool { return class == 1 })
	m, err := half.Marginal(func(x []float64) float64 {
		if x[0]+x[1] < 0 {
			return math.NaN()
		}
		return (x[0] + x[1]) / math.Sqrt2
	})
	if err != nil {
		t.Fatal(err)
	}
	mean := math.Sqrt(2 / math.Pi)
	if math.Abs(m.Mean-mean) > 1e-6 || math.Abs(m.Median()-0.674489750196082) > 7e-3 {
		t.Errorf("half-normal: mean %g, want %g; median %g, want 0.6745", m.Mean, mean, m.Median())
	}
	if _, err := half.Marginal(func([]float64) float64 { return math.NaN() }); err == nil {
		t.Error("a quantity defined nowhere was accepted")
	}
	if _, err := half.Marginal(func([]float64) float64 { return 7 }); err == nil {
		t.Error("a constant was accepted")
	}
}

func TestThin(t *testing.T) {
	r := integrate(t, cut(2), DefaultOptions())
	n := r.Nodes.Thin(1e-4)
	if n.Len() > r.Nodes.Len()*2/3 {
		t.Errorf("%d of %d nodes left", n.Len(), r.Nodes.Len())
	}
	for c := range 2 {
		if a, b := n.Probability(c).Value, r.Nodes.Probability(c).Value; math.Abs(a/b-1) > 2e-4 {
			t.Errorf("class %d: %g after thinning, %g before", c, a, b)
		}
	}
}

func TestShortestIntervalAtAnEdge(t *testing.T) {
	r := integrate(t, Problem{Density: fixed(func(x []float64) float64 { return -x[0] }), Lo: []float64{0}, Hi: []float64{50}}, DefaultOptions())
	m := &r.Marginals[0]
	if l, u := m.HighestDensity(0.95); l > 1e-4 || math.Abs(u+math.Log(0.05)) > 1e-3 {
		t.Errorf("[%g, %g], want [0, %g]", l, u, -math.Log(0.05))
	}
	if !math.IsNaN(m.Quantile(1.1)) || !math.IsNaN(m.Quantile(math.NaN())) {
		t.Error("a quantile outside [0, 1] is not NaN")
	}
}

func TestFlatDensityFillsTheBox(t *testing.T) {
	// 0 inside, -Inf on the edge itself: a prior may be open
	r := integrate(t, Problem{Density: fixed(func(x []float64) float64 {
		if x[0] <= 2 || x[0] >= 5 || x[1] <= 0 || x[1] >= 4 {
			return math.Inf(-1)
		}
		return 0
	}), Lo: []float64{2, 0}, Hi: []float64{5, 4}}, DefaultOptions())
	within(t, "ln area", r.LogEvidence, math.Log(12), 1e-7)
	if m := &r.Marginals[0]; math.Abs(m.SD-3/math.Sqrt(12)) > 1e-6 || math.Abs(m.Quantile(0.25)-2.75) > 1e-6 {
		t.Errorf("uniform: sd %g, lower quartile %g", m.SD, m.Quantile(0.25))
	}
}

func TestWhatCannotBeIntegrated(t *testing.T) {
	flat := fixed(func([]float64) float64 { return 0 })
	one := []float64{1}
	for name, p := range map[string]Problem{
		"four dimensions": {Density: flat, Lo: make([]float64, 4), Hi: []float64{1, 1, 1, 1}},
		"empty box":       {Density: flat, Lo: one, Hi: one},
		"infinite box":    {Density: flat, Lo: one, Hi: []float64{math.Inf(1)}},
		"infinite density": {Density: fixed(func(x []float64) float64 {
			if x[0] > 0.5 {
				return math.Inf(1)
			}
			return 0
		}), Lo: []float64{0, 0}, Hi: []float64{1, 1}},
	} {
		if _, err := Integrate(context.Background(), p, DefaultOptions()); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
	p := Problem{Density: fixed(func([]float64) float64 { return math.NaN() }), Lo: []float64{0}, Hi: one}
	if _, err := Integrate(context.Background(), p, DefaultOptions()); !errors.Is(err, ErrNoSupport) {
		t.Errorf("no support: %v", err)
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	if _, err := Integrate(ctx, cut(2), DefaultOptions()); !errors.Is(err, context.Canceled) {
		t.Errorf("cancelled: %v", err)
	}
	if _, err := Integrate(context.Background(), cut(2), Options{}); err == nil {
		t.Error("options without tolerances were accepted")
	}
}

// A support too small for the scan to hit, but known to the caller.
func TestStart(t *testing.T) {
	p := Problem{Density: fixed(func(x []float64) float64 {
		if d := math.Abs(x[0]-1) + math.Abs(x[1]-1); d > 1e-4 {
			return math.Inf(-1)
		}
		return 0
	}), Lo: []float64{-5, -5}, Hi: []float64{5, 5}}
	if _, err := Integrate(context.Background(), p, DefaultOptions()); !errors.Is(err, ErrNoSupport) {
		t.Errorf("without a start: %v", err)
	}
	p.Start = []float64{1.00001, 0.99998}
	r := integrate(t, p, DefaultOptions())
	within(t, "ln area", r.LogEvidence, math.Log(2e-8), 1e-4)
}

func BenchmarkGaussian2(b *testing.B) { benchmark(b, 2) }
func BenchmarkGaussian3(b *testing.B) { benchmark(b, 3) }

func benchmark(b *testing.B, dim int) {
	g := randomGaussian(rand.New(rand.NewPCG(17, 18)), dim)
	lo, hi := g.box()
	p := Problem{Density: g.density, Lo: lo, Hi: hi}
	b.ReportAllocs()
	for b.Loop() {
		r, err := Integrate(context.Background(), p, DefaultOptions())
		if err != nil {
			b.Fatal(err)
		}
		b.ReportMetric(float64(r.Evaluations), "evaluations")
	}
}

func BenchmarkClasses2(b *testing.B) {
	for b.Loop() {
		if _, err := Integrate(context.Background(), cut(2), DefaultOptions()); err != nil {
			b.Fatal(err)
		}
	}
}

// Probabilities that are not good enough end the work after the first pass.
func TestEnough(t *testing.T) {
	g := randomGaussian(rand.New(rand.NewPCG(3, 2)), 2)
	lo, hi := g.box()
	for _, enough := range []bool{false, true} {
		o := DefaultOptions()
		var seen []Estimate
		o.Enough = func(classes []Estimate) bool {
			seen = classes
			return enough
		}
		p := Problem{Density: g.density, Lo: lo, Hi: hi, Classes: 2, Class: func(x []float64) int {
			if x[0] < (lo[0]+hi[0])/2 {
				return 0
			}
			return 1
		}}
		r := integrate(t, p, o)
		if want := map[bool]int{false: 1, true: 2}[enough]; len(r.Marginals) != want {
			t.Errorf("enough %t: %d marginals, want %d", enough, len(r.Marginals), want)
		}
		if diff := cmp.Diff(r.Classes, seen); diff != "" {
			t.Error(diff)
		}
	}
}
