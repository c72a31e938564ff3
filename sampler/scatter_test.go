package sampler

import (
	"math"
	"slices"
	"strings"
	"testing"
)

// scattered returns many walkers around the best fit of a target.
func scattered(t *testing.T, g target, walkers int) Draws {
	t.Helper()
	best, _, err := Maximise(g.new(), g.lo, g.hi, 1)
	if err != nil {
		t.Fatal(err)
	}
	x, err := Scatter(g.new(), best, g.lo, g.hi, walkers, 1, 0)
	if err != nil {
		t.Fatal(err)
	}
	d := g.new()
	for k := 0; k < len(x); k += len(best) {
		if y := x[k : k+len(best)]; !finite(d(y)) || !inside(y, g.lo, g.hi) {
			t.Errorf("%s: a walker starts at %v", g.name, y)
		}
	}
	return NewDraws(len(best), x)
}

// inside reports whether x is in a box.
func inside(x, lo, hi []float64) bool {
	for i := range x {
		if !(x[i] >= lo[i] && x[i] <= hi[i]) {
			return false
		}
	}
	return true
}

// coordinate returns one coordinate of scattered walkers.
func coordinate(d Draws, i int) Draws {
	var x []float64
	for k := i; k < len(d.x[0]); k += d.walkers {
		x = append(x, d.x[0][k])
	}
	return NewDraws(1, x)
}

func TestScatterIsWiderThanTheDensity(t *testing.T) {
	g := gaussian()
	d := scattered(t, g, 4000)
	for i, sd := range g.sd {
		_, variance, _ := meanVariance(coordinate(d, i))
		// 2.5 less what is drawn in from too low a density.
		if ratio := math.Sqrt(variance) / sd; ratio < 2 || ratio > 2.6 {
			t.Errorf("coordinate %d: %v times as wide as the density", i, ratio)
		}
	}
	for _, c := range g.corr {
		r := Correlation(coordinate(d, int(c[0])), coordinate(d, int(c[1])))
		near(t, "correlation of the start", r, c[2], 0.1)
	}
	for _, g := range []target{ridge(), truncated()} {
		d := scattered(t, g, 4000)
		for i, sd := range g.sd {
			_, variance, _ := meanVariance(coordinate(d, i))
			if ratio := math.Sqrt(variance) / sd; ratio < 0.4 || ratio > 5 {
				t.Errorf("%s, coordinate %d: %v times as wide as the density", g.name, i, ratio)
			}
		}
	}
}

// Where the density says nothing about a direction, walkers fill the box.
func TestScatterFillsUnconstrainedDirections(t *testing.T) {
	d := func(x []float64) float64 { return -1e6 * (x[0] - x[1]) * (x[0] - x[1]) }
	x, err := Scatter(d, []float64{0.4, 0.4}, fill(2, 0), fill(2, 1), 400, 1, 0)
	if err != nil {
		t.Fatal(err)
	}
	_, variance, _ := meanVariance(coordinate(NewDraws(2, x), 0))
	if sd := math.Sqrt(variance); sd < 0.15 {
		t.Errorf("walkers spread over %v of the box", sd)
	}
}

func TestScatterDependsOnSeedAndEnsembleAlone(t *testing.T) {
	g := gaussian()
	at := func(seed uint64, ensemble int) []float64 {
		x, err := Scatter(g.new(), g.mean, g.lo, g.hi, 32, seed, ensemble)
		if err != nil {
			t.Fatal(err)
		}
		return x
	}
	first := at(1, 0)
	if !slices.Equal(first, at(1, 0)) {
		t.Error("not reproducible")
	}
	if slices.Equal(first, at(1, 1)) || slices.Equal(first, at(2, 0)) {
		t.Error("two ensembles start alike")
	}
}

// A best fit in a wedge that few directions enter.
func TestScatterInAWedge(t *testing.T) {
	wedge := func(x []float64) float64 {
		if x[1] < 0 || x[1] > 0.05*x[0] {
			return math.Inf(-1)
		}
		return -x[0]
	}
	x, err := Scatter(wedge, []float64{0, 0}, fill(2, -10), fill(2, 10), 32, 1, 0)
	if err != nil {
		t.Fatal(err)
	}
	if _, err := NewChain(2, [][]float64{x}, 1, DefaultRecord); err != nil {
		t.Error(err)
	}
}

// A best fit in the corner of a box: the walkers are mirrored into it rather
// than drawn until they happen to fall there, one in 64.
func TestScatterInACornerIsFrugal(t *testing.T) {
	n := 0
	d := func(x []float64) float64 {
		n++
		sum := 0.0
		for _, v := range x {
			sum -= v // rises for ever outside the box
		}
		return sum
	}
	x, err := Scatter(d, fill(6, 0), fill(6, 0), fill(6, 100), 32, 1, 0)
	if err != nil {
		t.Fatal(err)
	}
	for k := 0; k < len(x); k += 6 {
		if !inside(x[k:k+6], fill(6, 0), fill(6, 100)) {
			t.Errorf("a walker starts at %v, outside the box", x[k:k+6])
		}
	}
	if n > 1000 {
		t.Errorf("%d evaluations", n)
	}
}

func TestScatterErrors(t *testing.T) {
	spike := func(x []float64) float64 {
		if x[0] == 0.5 {
			return 0
		}
		return math.NaN()
	}
	for _, c := range []struct {
		best []float64
		want string
	}{
		{[]float64{0.3}, "log-density at the start [0.3] is NaN"},
		{[]float64{0.5}, "no finite density near the start [0.5]"},
	} {
		if _, err := Scatter(spike, c.best, fill(1, 0), fill(1, 1), 4, 1, 0); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
	}
}

func TestMirror(t *testing.T) {
	for x, want := range map[float64]float64{1.5: 1.5, 0.5: 1.5, 3.5: 2.5, 5.5: 1.5, -0.5: 2.5, 1: 1, 3: 3} {
		got := []float64{x}
		mirror(got, []float64{1}, []float64{3})
		near(t, "mirrored", got[0], want, 1e-12)
	}
}

// Curvature of a Gaussian is its covariance exactly.
func TestSpreadOfAGaussian(t *testing.T) {
	g := gaussian()
	root := spread(g.new(), g.mean, g.lo, g.hi)
	for i := range 3 {
		sum := 0.0
		for j := range i + 1 {
			sum += root.At(i, j) * root.At(i, j)
		}
		near(t, "standard deviation from curvature", math.Sqrt(sum)/g.sd[i], 1, 0.01)
	}
}
