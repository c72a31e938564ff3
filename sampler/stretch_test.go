package sampler

import (
	"math"
	"slices"
	"strings"
	"testing"
)

func newGaussianEnsemble(tb testing.TB, seed uint64, index int) *Ensemble {
	tb.Helper()
	g := gaussian()
	start, err := Scatter(g.new(), g.mean, g.lo, g.hi, 32, seed, index)
	if err != nil {
		tb.Fatal(err)
	}
	e, err := NewEnsemble(g.new(), seed, index, 3, start)
	if err != nil {
		tb.Fatal(err)
	}
	return e
}

func TestStepDoesNotAllocate(t *testing.T) {
	e := newGaussianEnsemble(t, 1, 0)
	if n := testing.AllocsPerRun(100, e.Step); n != 0 {
		t.Errorf("a step allocates %v times", n)
	}
}

// The stream of a step depends on seed, ensemble and step, each of them.
func TestStreamsDiffer(t *testing.T) {
	seen := map[float64][3]uint64{}
	for seed := range uint64(20) {
		for ensemble := range 20 {
			for step := range 20 {
				var s stream
				s.seek(seed, ensemble, step)
				u := s.uniform()
				if other, ok := seen[u]; ok {
					t.Fatalf("seed %d, ensemble %d, step %d starts like %v", seed, ensemble, step, other)
				}
				seen[u] = [3]uint64{seed, uint64(ensemble), uint64(step)}
			}
		}
	}
	sum := 0.0
	for u := range seen {
		sum += u
	}
	// 8000 uniform numbers: ½ ± 0.0032.
	near(t, "mean of the first numbers", sum/float64(len(seen)), 0.5, 0.015)
}

// Stored chains are continued by later versions of the program: this changes
// only together with the version of the chain's format.
func TestStreamIsPinned(t *testing.T) {
	var s stream
	s.seek(1, 2, 3)
	got := []float64{s.uniform(), s.uniform(), float64(s.index(1000))}
	want := []float64{0.9897770184450253, 0.48831122975275376, 179}
	if !slices.Equal(got, want) {
		t.Errorf("the stream of seed 1, ensemble 2, step 3 starts with %v, want %v", got, want)
	}
}

// A step from the same state is the same step.
func TestStepDependsOnStateAlone(t *testing.T) {
	e := newGaussianEnsemble(t, 1, 0)
	for range 17 {
		e.Step()
	}
	copied := restore(gaussian().new(), 1, 0, 3, 17, e.Positions(), e.LogDensities())
	e.Step()
	copied.Step()
	if !slices.Equal(e.Positions(), copied.Positions()) || !slices.Equal(e.LogDensities(), copied.LogDensities()) {
		t.Error("a restored ensemble takes another step")
	}
}

// The move commutes with every affine map of the space: it has no scale or
// direction of its own.
func TestStepIsAffineInvariant(t *testing.T) {
	round := func(x []float64) float64 { return -(x[0]*x[0] + x[1]*x[1]) / 2 }
	// Powers of two, so that rounding is the same on both sides.
	to := func(x, y float64) (float64, float64) { return 1024 * x, y / 64 }
	stretched := func(x []float64) float64 { return round([]float64{x[0] / 1024, x[1] * 64}) }
	start := normals(5, 64)
	image := slices.Clone(start)
	for k := 0; k < 64; k += 2 {
		image[k], image[k+1] = to(start[k], start[k+1])
	}
	a, err := NewEnsemble(round, 1, 0, 2, start)
	if err != nil {
		t.Fatal(err)
	}
	b, err := NewEnsemble(stretched, 1, 0, 2, image)
	if err != nil {
		t.Fatal(err)
	}
	for range 100 {
		a.Step()
		b.Step()
	}
	for k := 0; k < 64; k += 2 {
		x, y := to(a.Positions()[k], a.Positions()[k+1])
		if x != b.Positions()[k] || y != b.Positions()[k+1] {
			t.Fatalf("walker %d: image of the step %v %v, step of the image %v", k/2, x, y, b.Positions()[k:k+2])
		}
	}
}

// A walker moves along the line to one of the other half, or by 1.68 times the
// difference of two of them, each in half of the cases: with the halves a thousand
// apart, and one ten times wider, every proposal tells which.
func TestHalvesMoveAgainstEachOther(t *testing.T) {
	start := []float64{0, 0.3, 0.7, 1, 1000, 1003, 1007, 1010}
	var proposals []float64
	d := func(x []float64) float64 {
		proposals = append(proposals, x[0])
		if len(proposals) > len(start) {
			return math.Inf(-1) // refuse, so that the halves stay where they are
		}
		return 0
	}
	e, err := NewEnsemble(d, 1, 0, 1, start)
	if err != nil {
		t.Fatal(err)
	}
	for range 250 {
		e.Step()
	}
	byDifference := 0
	for i, y := range proposals[len(start):] {
		own, others := start[i%8], start[4:]
		if i%8 >= 4 {
			others = start[:4]
		}
		if isDifference((y-own)/(2.38/math.Sqrt2), others) {
			byDifference++
			continue
		}
		// From half way to the other half to as far again beyond.
		if along := (y - own) / (others[0] - own); along < -1.01 || along > 0.51 {
			t.Fatalf("walker %d, at %v, proposes %v", i%8, own, y)
		}
	}
	// 2000 cases: ½ ± 0.011.
	near(t, "share of moves by a difference", float64(byDifference)/2000, 0.5, 0.04)
}

func isDifference(x float64, of []float64) bool {
	for i := range of {
		for j := range of {
			if i != j && math.Abs(x-(of[i]-of[j])) < 1e-9 {
				return true
			}
		}
	}
	return false
}

// NaN, −Inf and +Inf are no places to go.
func TestWalkersStayWhereTheDensityIsFinite(t *testing.T) {
	for _, outside := range []float64{math.NaN(), math.Inf(-1), math.Inf(1)} {
		d := func(x []float64) float64 {
			if x[0] < 0 || x[0] > 1 {
				return outside
			}
			return 0
		}
		start := make([]float64, 8)
		for k := range start {
			start[k] = 0.1 + 0.1*float64(k)
		}
		e, err := NewEnsemble(d, 1, 0, 1, start)
		if err != nil {
			t.Fatal(err)
		}
		for range 1000 {
			e.Step()
		}
		for _, x := range e.Positions() {
			if x < 0 || x > 1 {
				t.Errorf("density %v outside: a walker at %v", outside, x)
			}
		}
		if e.accepted == 0 {
			t.Error("no walker moved")
		}
	}
}

func TestNewEnsembleErrors(t *testing.T) {
	flat := func(x []float64) float64 {
		if x[0] > 90 {
			return math.Inf(-1)
		}
		return 0
	}
	for _, c := range []struct {
		dim   int
		start []float64
		want  string
	}{
		{0, nil, "0 parameters"},
		{2, make([]float64, 13), "no whole number of walkers"},
		{2, make([]float64, 14), "7 walkers, need an even number, at least 6"},
		{2, make([]float64, 8), "4 walkers, need an even number, at least 6"},
		{1, []float64{1, 2, 99, 3}, "walker 2 starts at [99] where the log-density is -Inf"},
	} {
		_, err := NewEnsemble(flat, 1, 0, c.dim, c.start)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%d numbers in %d dimensions: error %v, want one with %q", len(c.start), c.dim, err, c.want)
		}
	}
}
