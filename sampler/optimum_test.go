package sampler

import (
	"math"
	"slices"
	"strings"
	"testing"
)

// rosenbrock is the valley of Rosenbrock (1960, Comput. J. 3, 175) as a
// log-density; its maximum is 0 at (1, …, 1).
func rosenbrock(x []float64) float64 {
	sum := 0.0
	for i := range len(x) - 1 {
		a, b := 1-x[i], x[i+1]-x[i]*x[i]
		sum += a*a + 100*b*b
	}
	return -sum / 2
}

func fill(n int, v float64) []float64 {
	return slices.Repeat([]float64{v}, n)
}

func TestMaximise(t *testing.T) {
	narrow := []float64{0.2, -0.7, 0.9, 0.01, -0.5, 0.33}
	half := func(x []float64) float64 { // −Inf on more than half of the box
		if x[0]+x[1] > 0.1 || x[0] < -0.9 {
			return math.Inf(-1)
		}
		return -50 * ((x[0]-0.3)*(x[0]-0.3) + (x[1]+0.2)*(x[1]+0.2))
	}
	for _, c := range []struct {
		name   string
		d      Density
		lo, hi []float64
		best   []float64 // nil if not unique
		logp   float64
	}{
		{"gaussian of unequal scales", gaussian().new(), gaussian().lo, gaussian().hi, gaussian().mean, 0},
		{"ridge", ridge().new(), ridge().lo, ridge().hi, []float64{0, 0}, 0},
		{"valley in 2", rosenbrock, fill(2, -5), fill(2, 5), fill(2, 1), 0},
		{"valley in 4", rosenbrock, fill(4, -2), fill(4, 2), fill(4, 1), 0},
		{"valley in 6", rosenbrock, fill(6, 0.2), fill(6, 8), fill(6, 1), 0},
		{"narrow in 6", func(x []float64) float64 {
			sum := 0.0
			for i := range x {
				z := (x[i] - narrow[i]) / 1e-3
				if i > 0 {
					z -= 2 * (x[i-1] - narrow[i-1]) / 1e-3
				}
				sum -= z * z / 2
			}
			return sum
		}, fill(6, -1), fill(6, 1), narrow, 0},
		{"in a corner", truncated().new(), truncated().lo, truncated().hi, []float64{0, 0}, 0},
		{"on a side", func(x []float64) float64 {
			return -100 * ((x[0]-2)*(x[0]-2) + (x[1]-0.5*x[0])*(x[1]-0.5*x[0]))
		}, fill(2, -1), fill(2, 1), []float64{1, 0.5}, -100},
		{"at an edge inside the box", half, fill(2, -1), fill(2, 1), []float64{0.3, -0.2}, 0},
		{"the higher of two", func(x []float64) float64 {
			a := -((x[0]+5)*(x[0]+5) + x[1]*x[1]) / 2
			b := 1 - ((x[0]-5)*(x[0]-5)+x[1]*x[1])/2
			return max(a, b)
		}, fill(2, -10), fill(2, 10), []float64{5, 0}, 1},
		{"the higher and narrower of two", func(x []float64) float64 {
			a := -((x[0]+5)*(x[0]+5) + x[1]*x[1]) / 32
			b := 1 - 2*((x[0]-6)*(x[0]-6)+x[1]*x[1])
			return max(a, b)
		}, fill(2, -10), fill(2, 10), []float64{6, 0}, 1},
		{"a plateau", func(x []float64) float64 { return -max(0, math.Hypot(x[0], x[1])-1) }, fill(2, -9), fill(2, 9), nil, 0},
		{"flat", func([]float64) float64 { return -3 }, fill(3, -1), fill(3, 1), nil, -3},
		{"a direction without information", func(x []float64) float64 { return -1e4 * (x[0] - 0.5) * (x[0] - 0.5) }, fill(2, 0), []float64{1, 100}, nil, 0},
	} {
		for seed := range uint64(3) {
			x, logp, err := Maximise(c.d, c.lo, c.hi, seed)
			if err != nil {
				t.Fatalf("%s: %v", c.name, err)
			}
			if !(logp > c.logp-1e-6) || logp > c.logp+1e-9 || c.d(x) != logp {
				t.Errorf("%s, seed %d: ln p = %v at %v (there %v), want %v", c.name, seed, logp, x, c.d(x), c.logp)
			}
			for i := range c.best {
				if width := c.hi[i] - c.lo[i]; math.Abs(x[i]-c.best[i]) > 1e-3*width {
					t.Errorf("%s, seed %d: found %v, want %v", c.name, seed, x, c.best)
				}
			}
			for i := range x {
				if x[i] < c.lo[i] || x[i] > c.hi[i] {
					t.Errorf("%s, seed %d: %v outside the box", c.name, seed, x)
				}
			}
		}
	}
}

func TestMaximiseDependsOnTheSeedAlone(t *testing.T) {
	a, _, _ := Maximise(rosenbrock, fill(3, -2), fill(3, 2), 5)
	b, _, _ := Maximise(rosenbrock, fill(3, -2), fill(3, 2), 5)
	if !slices.Equal(a, b) {
		t.Errorf("%v, then %v", a, b)
	}
}

func TestMaximiseErrors(t *testing.T) {
	flat := func([]float64) float64 { return 0 }
	for _, c := range []struct {
		d      Density
		lo, hi []float64
		want   string
	}{
		{flat, nil, nil, "0 lower and 0 upper"},
		{flat, fill(2, 0), fill(1, 1), "2 lower and 1 upper"},
		{flat, fill(2, 0), []float64{1, 0}, "side 1 of the box runs from 0 to 0"},
		{flat, []float64{math.Inf(-1)}, fill(1, 0), "runs from -Inf"},
		{flat, []float64{math.NaN()}, fill(1, 0), "runs from NaN"},
		{func([]float64) float64 { return math.NaN() }, fill(1, 0), fill(1, 1), "zero at every place"},
	} {
		if _, _, err := Maximise(c.d, c.lo, c.hi, 1); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
	}
}

// How many evaluations a maximum costs: what the user waits for before an
// expensive run begins.
func TestMaximiseIsFrugal(t *testing.T) {
	for _, g := range []target{gaussian(), ridge(), truncated()} {
		n := 0
		d := g.new()
		_, _, err := Maximise(func(x []float64) float64 { n++; return d(x) }, g.lo, g.hi, 1)
		if err != nil {
			t.Fatal(err)
		}
		t.Logf("%s: %d evaluations", g.name, n)
		if n > 4000 {
			t.Errorf("%s: %d evaluations", g.name, n)
		}
	}
}

// The starts of the climbs are the highest places, but not all on one hill.
func TestSeparateStarts(t *testing.T) {
	at := func(x, y float64) []float64 { return []float64{math.Asin(x), math.Asin(y)} }
	found := []peak{{at(0, 0), 9}, {at(0.1, 0.1), 8}, {at(0.1, -0.9), 7}, {at(-0.3, 0.3), 6}, {at(0.9, 0), 5}, {at(0.6, 0), 4}, {at(-0.9, 0), 3}, {at(0.9, 0.9), 2}}
	want := [][]float64{at(0, 0), at(0.1, -0.9), at(0.9, 0), at(-0.9, 0)}
	if got := separate(found); !slices.EqualFunc(got, want, slices.Equal) {
		t.Errorf("picked %v, want %v", got, want)
	}
}
