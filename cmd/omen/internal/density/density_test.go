package density

import (
	"fmt"
	"math"
	"math/rand/v2"
	"testing"
)

// law is a distribution to draw from and to integrate exactly.
type law struct {
	name  string
	edges Edges
	draw  func(*rand.Rand) float64
	cdf   func(float64) float64
	n     int
}

func phi(x float64) float64 { return math.Erfc(-x/math.Sqrt2) / 2 }

// truncated is a unit Gaussian about mu kept above zero.
func truncated(mu float64) law {
	return law{
		name: fmt.Sprintf("Gaussian about %g cut at 0", mu), edges: Edges{0, math.Inf(1)}, n: 20000,
		draw: func(r *rand.Rand) float64 {
			for {
				if x := mu + r.NormFloat64(); x >= 0 {
					return x
				}
			}
		},
		cdf: func(x float64) float64 { return (phi(x-mu) - phi(-mu)) / phi(mu) },
	}
}

var laws = []law{
	{"Gaussian", NoEdges(), (*rand.Rand).NormFloat64, phi, 20000},
	{"Gaussian, few", NoEdges(), (*rand.Rand).NormFloat64, phi, 1000},
	{"uniform", Edges{0, 1}, (*rand.Rand).Float64, func(x float64) float64 { return x }, 20000},
	{"exponential", Edges{0, math.Inf(1)}, (*rand.Rand).ExpFloat64, func(x float64) float64 { return 1 - math.Exp(-x) }, 20000},
	truncated(1), truncated(0), truncated(-2),
	{"two peaks", NoEdges(), func(r *rand.Rand) float64 { return 4*math.Floor(2*r.Float64()) + r.NormFloat64() },
		func(x float64) float64 { return (phi(x) + phi(x-4)) / 2 }, 20000},
}

// The region drawn at 68% and 95% must hold that much of the true distribution, on average over data sets: one
// data set of n draws strays from it by √(p(1-p)/n) in any method.
func TestIntervalMass(t *testing.T) {
	const sets = 40
	for _, l := range laws {
		masses := [2]float64{0.68, 0.95}
		var got [2]float64
		for seed := range sets {
			r := rand.New(rand.NewPCG(uint64(seed), 1))
			x := make([]float64, l.n)
			for i := range x {
				x[i] = l.draw(r)
			}
			c, err := Estimate(x, nil, 0, l.edges)
			if err != nil {
				t.Fatal(err)
			}
			for k, m := range masses {
				for _, v := range c.Intervals(m) {
					got[k] += (l.cdf(v.Hi) - l.cdf(v.Lo)) / sets
				}
			}
		}
		for k, m := range masses {
			if math.Abs(got[k]-m) > 0.01*m {
				t.Errorf("%s: region at %g holds %.4f", l.name, m, got[k])
			}
		}
	}
}

func TestCurveAtEdge(t *testing.T) {
	r := rand.New(rand.NewPCG(3, 1))
	for _, c := range []struct {
		l    law
		want float64 // density at the edge 0
		tol  float64
	}{
		{laws[2], 1, 0.04},
		{laws[3], 1, 0.06},
		{truncated(1), math.Exp(-0.5) / math.Sqrt(2*math.Pi) / phi(1), 0.03},
	} {
		x := make([]float64, 20000)
		for i := range x {
			x[i] = c.l.draw(r)
		}
		e, err := Estimate(x, nil, 0, c.l.edges)
		if err != nil {
			t.Fatal(err)
		}
		if e.X[0] != 0 || math.Abs(e.At(0)-c.want) > c.tol {
			t.Errorf("%s: density at the edge %g, want %g; first node %g", c.l.name, e.At(0), c.want, e.X[0])
		}
	}
}

// The rule for the width of the kernel against the optimum it estimates (Wand & Jones 1995, §2.5): for the density
// it is to smooth, known here, (2√π ∫f”² n)^(-1/5).
func TestBandwidth(t *testing.T) {
	const n = 5000
	for _, l := range []struct {
		law
		roughness float64 // ∫f''²
	}{
		{laws[0], 3 / (8 * math.Sqrt(math.Pi))},
		{laws[7], 3 / (16 * math.Sqrt(math.Pi))}, // half as much where the peaks are four apart, to 2%
	} {
		mean := 0.0
		for seed := range 10 {
			r := rand.New(rand.NewPCG(uint64(seed), 3))
			x := make([]float64, n)
			for i := range x {
				x[i] = l.draw(r)
			}
			a, err := newAxis(x, nil, n, NoEdges())
			if err != nil {
				t.Fatal(err)
			}
			a.grid(lineNodes, 1)
			mean += bandwidth1(bin1(x, nil, n, a), a, n) / 10
		}
		if want := math.Pow(2*math.Sqrt(math.Pi)*l.roughness*n, -1./5); math.Abs(mean/want-1) > 0.06 {
			t.Errorf("%s: width %.4f, optimum %.4f", l.name, mean, want)
		}
	}
}

// In two dimensions the same for (2π n ∫(∇²f)²)^(-1/6) in whitened coordinates, here of two round peaks six
// apart, whose characteristic function is exp(-k²/2) cos(3kx).
func TestBandwidth2(t *testing.T) {
	const n = 5000
	r := rand.New(rand.NewPCG(4, 3))
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], y[i] = 6*math.Floor(2*r.Float64())-3+r.NormFloat64(), r.NormFloat64()
	}
	ax, _ := newAxis(x, nil, n, NoEdges())
	ay, _ := newAxis(y, nil, n, NoEdges())
	ax.gridPadded(256, 2)
	ay.gridPadded(256, 2)
	f := newField(x, y, nil, n, ax, ay, 256)
	shape := sym2{10, 0, 1}
	sum, step := 0.0, 0.02
	for kx := -6.; kx < 6; kx += step {
		for ky := -6.; ky < 6; ky += step {
			q := shape.form(kx, ky)
			sum += q * q * math.Exp(-kx*kx-ky*ky) * sq(math.Cos(3*kx)) * step * step
		}
	}
	want := math.Pow(2*math.Pi*n*sum*math.Sqrt(shape.det())/(4*math.Pi*math.Pi), -1./6)
	if got := f.bandwidth(shape, n); math.Abs(got/want-1) > 0.15 {
		t.Errorf("width %.4f, optimum %.4f", got, want)
	}
}

func sq(x float64) float64 { return x * x }

// A correlated Gaussian cut at both edges of a corner, where all moments of the correction matter; the mean over
// data sets, as a single one strays by several per cent in the very corner.
func TestSurfaceAtCorner(t *testing.T) {
	const n, rho, sets = 10000, 0.6, 12
	half := Edges{0, math.Inf(1)}
	points := []Point{{0, 0}, {0.3, 0}, {0, 1}, {0, 1.5}, {1, 0}, {1, 1}}
	tol := []float64{0.03, 0.015, 0.0125, 0.005, 0.0125, 0.0125} // {0, 1.5} tells the slope along x
	got := make([]float64, len(points))
	for seed := range sets {
		r := rand.New(rand.NewPCG(uint64(seed), 4))
		var x, y []float64
		for len(x) < n {
			if a, b := correlated(rho)(r); a >= 0 && b >= 0 {
				x, y = append(x, a), append(y, b)
			}
		}
		s, err := Estimate2(x, y, nil, 0, half, half)
		if err != nil {
			t.Fatal(err)
		}
		for i, p := range points {
			got[i] += s.At(p.X, p.Y) / sets
		}
	}
	share := 0.25 + math.Asin(rho)/(2*math.Pi)
	for i, p := range points {
		q := (p.X*p.X - 2*rho*p.X*p.Y + p.Y*p.Y) / (1 - rho*rho)
		want := math.Exp(-q/2) / (2 * math.Pi * math.Sqrt(1-rho*rho) * share)
		if math.Abs(got[i]-want) > tol[i] {
			t.Errorf("density at %v %.4f, want %.4f", p, got[i], want)
		}
	}
}

// plane is a distribution in the plane and whether its true density at a point is inside a region is known.
type plane struct {
	name   string
	ex, ey Edges
	draw   func(*rand.Rand) (x, y float64)
	n      int
}

func correlated(rho float64) func(*rand.Rand) (float64, float64) {
	s := math.Sqrt(1 - rho*rho)
	return func(r *rand.Rand) (float64, float64) {
		a, b := r.NormFloat64(), r.NormFloat64()
		return a, rho*a + s*b
	}
}

func positiveX(f func(*rand.Rand) (float64, float64)) func(*rand.Rand) (float64, float64) {
	return func(r *rand.Rand) (float64, float64) {
		for {
			if x, y := f(r); x >= 0 {
				return x, y
			}
		}
	}
}

var planes = []plane{
	{"Gaussian", NoEdges(), NoEdges(), correlated(0), 10000},
	{"Gaussian, few", NoEdges(), NoEdges(), correlated(0.5), 1000},
	{"narrow Gaussian", NoEdges(), NoEdges(), correlated(0.95), 10000},
	{"very narrow Gaussian", NoEdges(), NoEdges(), correlated(-0.999), 10000},
	{"uniform", Edges{0, 1}, Edges{-1, 1}, func(r *rand.Rand) (float64, float64) { return r.Float64(), 2*r.Float64() - 1 }, 20000},
	{"Gaussian cut at x=0", Edges{0, math.Inf(1)}, NoEdges(), positiveX(correlated(0)), 10000},
	{"narrow Gaussian cut at x=0", Edges{0, math.Inf(1)}, NoEdges(), positiveX(correlated(0.9)), 10000},
	{"bent", NoEdges(), NoEdges(), func(r *rand.Rand) (float64, float64) {
		x := r.NormFloat64()
		return x, 0.5*x*x + 0.3*r.NormFloat64()
	}, 10000},
	{"tailed", NoEdges(), NoEdges(), tailed, 10000},
}

// tailed has a long tail that is narrow. Its logarithm is concave, and so all its regions are convex.
func tailed(r *rand.Rand) (x, y float64) {
	x = r.ExpFloat64() + r.ExpFloat64() + r.ExpFloat64()
	return x, x + 0.3*r.NormFloat64()
}

// The mass of a region is measured with fresh draws, through the contour itself.
func TestRegionMass(t *testing.T) {
	const sets, fresh = 6, 10000
	for _, p := range planes {
		hits := map[float64]float64{0.68: 0, 0.95: 0}
		for seed := range sets {
			r := rand.New(rand.NewPCG(uint64(seed), 2))
			x, y := make([]float64, p.n), make([]float64, p.n)
			for i := range x {
				x[i], y[i] = p.draw(r)
			}
			s, err := Estimate2(x, y, nil, 0, p.ex, p.ey)
			if err != nil {
				t.Fatal(err)
			}
			levels := map[float64]float64{0.68: s.Level(0.68), 0.95: s.Level(0.95)}
			for range fresh {
				d := s.At(p.draw(r))
				for m := range hits {
					if d >= levels[m] {
						hits[m] += 1. / (sets * fresh)
					}
				}
			}
		}
		for m, got := range hits {
			if math.Abs(got-m) > 0.01*m {
				t.Errorf("%s: region at %g holds %.4f", p.name, m, got)
			}
		}
	}
}

// The outlines of a Gaussian are ellipses of known area, and their smoothing is what the kernel adds.
func TestRegionShape(t *testing.T) {
	r := rand.New(rand.NewPCG(5, 2))
	const n, rho = 20000, 0.9
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], y[i] = correlated(rho)(r)
	}
	s, err := Estimate2(x, y, nil, 0, NoEdges(), NoEdges())
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range []float64{0.68, 0.95} {
		loops := s.Region(m)
		want := -2 * math.Log(1-m) * math.Pi * math.Sqrt(1-rho*rho)
		if got := area(loops); len(loops) != 1 || math.Abs(got/want-1) > 0.04 {
			t.Errorf("%d outlines of area %g at %g, want one of %g", len(loops), got, m, want)
		}
	}
}

// Outlines of convex regions turn once; those of draws fray where these are few.
func TestSmoothOutlines(t *testing.T) {
	const sets, n = 4, 14000
	for mass, most := range map[float64]float64{0.68: 1.2, 0.95: 1.4} {
		turns := 0.0
		for seed := range sets {
			r := rand.New(rand.NewPCG(uint64(seed), 6))
			x, y := make([]float64, n), make([]float64, n)
			for i := range x {
				x[i], y[i] = tailed(r)
			}
			s, err := Estimate2(x, y, nil, 0, NoEdges(), NoEdges())
			if err != nil {
				t.Fatal(err)
			}
			for _, l := range s.Region(mass) {
				turns += turning(l) / sets
			}
		}
		if turns > most {
			t.Errorf("outlines of %g turn %.2f times, at most %g allowed", mass, turns, most)
		}
	}
}

// turning is how often an outline turns around, either way, along and across the narrow direction of tailed.
func turning(l Loop) float64 {
	sum, last := 0.0, math.NaN()
	for i := range len(l) + 1 {
		p, q := l[i%len(l)], l[(i+1)%len(l)]
		dx, dy := q.X-p.X, q.Y-p.Y
		angle := math.Atan2((dy-dx)/0.3, (dx+dy)/4)
		if !math.IsNaN(last) {
			sum += math.Abs(math.Remainder(angle-last, 2*math.Pi))
		}
		last = angle
	}
	return sum / (2 * math.Pi)
}

func area(loops []Loop) float64 {
	a := 0.0
	for _, l := range loops {
		for i, p := range l {
			q := l[(i+1)%len(l)]
			a += (p.X*q.Y - q.X*p.Y) / 2
		}
	}
	return a
}

// A tabulated density needs no draws; coarse grids included.
func TestTabulated(t *testing.T) {
	x := make([]float64, 61)
	p := make([]float64, 61)
	for i := range x {
		x[i] = -6 + 0.2*float64(i)
		p[i] = 7 * math.Exp(-x[i]*x[i]/2)
	}
	c, err := NewCurve(x, p)
	if err != nil {
		t.Fatal(err)
	}
	if v := c.Intervals(0.68); len(v) != 1 || math.Abs(v[0].Hi-0.99446) > 0.005 || math.Abs(v[0].Lo+0.99446) > 0.005 {
		t.Errorf("68%% of a Gaussian in %v", v)
	}
	p2 := make([]float64, 61*61)
	for k := range p2 {
		p2[k] = p[k%61] * p[k/61]
	}
	s, err := NewSurface(x, x, p2)
	if err != nil {
		t.Fatal(err)
	}
	for _, m := range []float64{0.68, 0.95} {
		got, want := area(s.Region(m)), -2*math.Pi*math.Log(1-m)
		if math.Abs(got/want-1) > 0.01 {
			t.Errorf("area of %g at %g, want %g", got, m, want)
		}
	}
}

// A ring has a hole, wound the other way, and a region at the edges is closed along them.
func TestContour(t *testing.T) {
	var x, p []float64
	for i := range 81 {
		x = append(x, -2+0.05*float64(i))
	}
	for _, b := range x {
		for _, a := range x {
			r := math.Hypot(a, b)
			p = append(p, math.Exp(-(r-1)*(r-1)/0.08))
		}
	}
	s, err := NewSurface(x, x, p)
	if err != nil {
		t.Fatal(err)
	}
	half := math.Sqrt(0.08 * math.Ln2) // where the ring has half its height
	loops := s.Contour(s.At(1, 0) / 2)
	if want := math.Pi * 4 * half; len(loops) != 2 || math.Abs(area(loops)/want-1) > 0.01 {
		t.Errorf("%d outlines of area %g, want 2 of %g", len(loops), area(loops), want)
	}
	if all := area(s.Contour(0)); math.Abs(all-16) > 1e-12 {
		t.Errorf("everything covers %g of 16", all)
	}
	if none := s.Contour(2 * s.At(1, 0)); none != nil {
		t.Errorf("%d outlines above the peak", len(none))
	}
}

// Weights act like repeated draws, and correlated draws are smoothed as their effective number asks.
func TestWeights(t *testing.T) {
	r := rand.New(rand.NewPCG(6, 2))
	n := 8000
	x, w := make([]float64, n), make([]float64, n)
	for i := range x { // a Gaussian of width 2 reweighted to the unit one about 0.5
		x[i] = 2 * r.NormFloat64()
		w[i] = math.Exp(-(x[i]-0.5)*(x[i]-0.5)/2 + x[i]*x[i]/8)
	}
	c, err := Estimate(x, w, 0, NoEdges())
	if err != nil {
		t.Fatal(err)
	}
	v := c.Intervals(0.68)
	if len(v) != 1 || math.Abs(v[0].Lo+0.494) > 0.06 || math.Abs(v[0].Hi-1.494) > 0.06 {
		t.Errorf("reweighted 68%% interval %v, want about [-0.494, 1.494]", v)
	}
	few, err := Estimate(x, w, 100, NoEdges())
	if err != nil {
		t.Fatal(err)
	}
	if !(few.At(0.5) < 0.98*c.At(0.5)) {
		t.Errorf("peak %g with 100 effective draws, %g with all: the smoothing does not follow", few.At(0.5), c.At(0.5))
	}
}

func TestErrors(t *testing.T) {
	good := make([]float64, 100)
	for i := range good {
		good[i] = float64(i)
	}
	same := make([]float64, 100)
	bad := append([]float64{math.NaN()}, good[1:]...)
	for name, f := range map[string]func() error{
		"few":      func() error { _, err := Estimate(good[:5], nil, 0, NoEdges()); return err },
		"constant": func() error { _, err := Estimate(same, nil, 0, NoEdges()); return err },
		"NaN":      func() error { _, err := Estimate(bad, nil, 0, NoEdges()); return err },
		"outside":  func() error { _, err := Estimate(good, nil, 0, Edges{1, 200}); return err },
		"weights":  func() error { _, err := Estimate(good, good[:3], 0, NoEdges()); return err },
		"negative": func() error { _, err := Estimate(good, append([]float64{-1}, good[1:]...), 0, NoEdges()); return err },
		"zero":     func() error { _, err := Estimate(good, same, 0, NoEdges()); return err },
		"lengths":  func() error { _, err := Estimate2(good, good[1:], nil, 0, NoEdges(), NoEdges()); return err },
		"y":        func() error { _, err := Estimate2(good, same, nil, 0, NoEdges(), NoEdges()); return err },
		"nodes":    func() error { _, err := NewCurve(same, good); return err },
		"values":   func() error { _, err := NewCurve(good, good[1:]); return err },
		"empty":    func() error { _, err := NewCurve(good, same); return err },
		"below":    func() error { _, err := NewCurve(good, append([]float64{-1}, good[1:]...)); return err },
		"grid":     func() error { _, err := NewSurface(good, good, good); return err },
	} {
		if f() == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

func TestOutsideDomain(t *testing.T) {
	c, err := NewCurve([]float64{0, 1}, []float64{1, 1})
	if err != nil {
		t.Fatal(err)
	}
	if c.At(-0.1) != 0 || c.At(1.1) != 0 || !math.IsNaN(c.At(math.NaN())) {
		t.Error("the density outside the nodes is not zero, or NaN is not NaN")
	}
	for _, m := range []float64{0, 1, -1, 2, math.NaN()} {
		if !math.IsNaN(c.Level(m)) || c.Intervals(m) != nil {
			t.Errorf("a level for the mass %g", m)
		}
	}
}

func benchmark2(b *testing.B, n int, e Edges) {
	r := rand.New(rand.NewPCG(1, 1))
	x, y := make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], y[i] = positiveX(correlated(0.8))(r)
	}
	for b.Loop() {
		if _, err := Estimate2(x, y, nil, 4000, e, NoEdges()); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkEstimate2(b *testing.B) {
	for _, n := range []int{4000, 20000, 300000} {
		b.Run(fmt.Sprint(n), func(b *testing.B) { benchmark2(b, n, NoEdges()) })
		b.Run(fmt.Sprint(n, "-edge"), func(b *testing.B) { benchmark2(b, n, Edges{0, math.Inf(1)}) })
	}
}

func BenchmarkEstimate(b *testing.B) {
	r := rand.New(rand.NewPCG(1, 1))
	x := make([]float64, 300000)
	for i := range x {
		x[i] = r.NormFloat64()
	}
	for b.Loop() {
		if _, err := Estimate(x, nil, 4000, NoEdges()); err != nil {
			b.Fatal(err)
		}
	}
}
