package sampler

import (
	"math"
	"slices"
	"strings"
	"testing"
)

// numbered returns a chain of 2 ensembles × 4 walkers × 1 parameter whose
// positions say where they are: step + ensemble/10 + walker/100.
func numbered(t *testing.T, steps, every, record int) *Chain {
	t.Helper()
	start := [][]float64{{1, 2, 3, 5}, {2, 3, 5, 7}}
	c, err := NewChain(1, start, every, record)
	if err != nil {
		t.Fatal(err)
	}
	for step := every; step <= steps; step += every {
		x, logp := make([][]float64, 2), make([][]float64, 2)
		for m := range x {
			for k := range 4 {
				x[m] = append(x[m], float64(step)+float64(m)/10+float64(k)/100)
				logp[m] = append(logp[m], -x[m][k])
			}
		}
		if err := c.Append(step, x, logp, -1); err != nil {
			t.Fatal(err)
		}
	}
	return c
}

// stepsOf returns the steps of a view and checks that every row is what its
// step, ensemble and walker say.
func stepsOf(t *testing.T, v View) []int {
	t.Helper()
	var steps []int
	for r := range v.Rows() {
		want := float64(r.Step) + float64(r.Ensemble)/10 + float64(r.Walker)/100
		if r.X[0] != want || r.LogP != -want {
			t.Fatalf("row %+v, want %v", r, want)
		}
		if r.Ensemble == 0 && r.Walker == 0 {
			steps = append(steps, r.Step)
		}
	}
	if len(steps) != v.Steps() {
		t.Fatalf("%d steps in a view of %d", len(steps), v.Steps())
	}
	return steps
}

func TestViews(t *testing.T) {
	v := numbered(t, 20, 2, DefaultRecord).View()
	for _, c := range []struct {
		name string
		view View
		want []int
	}{
		{"all", v, []int{2, 4, 6, 8, 10, 12, 14, 16, 18, 20}},
		{"after 0", v.After(0), []int{2, 4, 6, 8, 10, 12, 14, 16, 18, 20}},
		{"after 1", v.After(1), []int{2, 4, 6, 8, 10, 12, 14, 16, 18, 20}},
		{"after 2", v.After(2), []int{4, 6, 8, 10, 12, 14, 16, 18, 20}},
		{"after 13", v.After(13), []int{14, 16, 18, 20}},
		{"after the end", v.After(99), nil},
		{"every third", v.Thin(3), []int{6, 12, 18}},
		{"of a thinned one", v.Thin(3).After(6), []int{12, 18}},
		{"thinned twice", v.Thin(2).Thin(2), []int{8, 16}},
		{"thinned away", v.Thin(11), nil},
	} {
		if got := stepsOf(t, c.view); !slices.Equal(got, c.want) {
			t.Errorf("%s: steps %v, want %v", c.name, got, c.want)
		}
		var x []float64
		for m := range 2 {
			for _, step := range c.want {
				for k := range 4 {
					x = append(x, float64(step)+float64(m)/10+float64(k)/100)
				}
			}
		}
		if got := c.view.Coordinate(0).Values(); !slices.Equal(got, x) {
			t.Errorf("%s: draws %v, want %v", c.name, got, x)
		}
		minus := func(x float64) float64 { return -x }
		if got := c.view.LogDensity().Map(minus).Values(); !slices.Equal(got, x) {
			t.Errorf("%s: log-densities %v, want %v", c.name, got, x)
		}
	}
}

// A record that overflows keeps the steps that are multiples of its spacing,
// and a view made before stays what it was.
func TestRecordIsBounded(t *testing.T) {
	for steps := 3; steps < 300; steps += 3 {
		const perStep, bound = 2 * 4 * 2, 20 * 2 * 4 * 2
		c := numbered(t, steps, 3, bound)
		v := c.View()
		got := stepsOf(t, v)
		if len(got)*perStep > bound || steps > 60 && len(got) < 9 {
			t.Fatalf("%d steps: %d recorded", steps, len(got))
		}
		for i, step := range got {
			if step != (i+1)*v.Spacing() {
				t.Fatalf("%d steps: recorded %v at a spacing of %d", steps, got, v.Spacing())
			}
		}
		if last := got[len(got)-1]; last+v.Spacing() <= steps {
			t.Fatalf("%d steps: the record ends at %d with a spacing of %d", steps, last, v.Spacing())
		}
	}
	c := numbered(t, 60, 1, 64*16)
	before := c.View()
	for step := 61; step <= 100; step++ {
		x := [][]float64{{0, 0, 0, 0}, {0, 0, 0, 0}}
		if err := c.Append(step, x, x, 0); err != nil {
			t.Fatal(err)
		}
	}
	if c.View().Spacing() == 1 {
		t.Fatal("the record did not overflow")
	}
	if got := stepsOf(t, before); len(got) != 60 {
		t.Errorf("an earlier view changed: %v", got)
	}
}

// Thinning must leave autocorrelation times in steps of the run.
func TestSpacingCountsInTau(t *testing.T) {
	x := [][]float64{normals(1, 4000), normals(2, 4000)}
	start := [][]float64{{1, 2, 3, 5}, {2, 3, 5, 7}}
	c, err := NewChain(1, start, 1, 500*16)
	if err != nil {
		t.Fatal(err)
	}
	for step := 1; step <= 1000; step++ {
		row := [][]float64{x[0][4*step-4 : 4*step], x[1][4*step-4 : 4*step]}
		if err := c.Append(step, row, row, -1); err != nil {
			t.Fatal(err)
		}
	}
	spacing := c.View().Spacing()
	if spacing < 2 {
		t.Fatal("the record did not overflow")
	}
	tau := Summarize(c.View().Coordinate(0)).Tau
	near(t, "τ of independent rows", tau, float64(spacing), 0.5*float64(spacing))
}

func TestAppendErrors(t *testing.T) {
	row := [][]float64{{1, 2, 3, 4}, {1, 2, 3, 4}}
	for _, c := range []struct {
		step    int
		x, logp [][]float64
		want    string
	}{
		{16, row, row, "found step 16 after step 10, expected 12"},
		{10, row, row, "found step 10 after step 10, expected 12"},
		{12, row[:1], row[:1], "has 1 ensembles, expected 2"},
		{12, row, [][]float64{{1}, {1}}, "ensemble 0 has"},
	} {
		chain := numbered(t, 10, 2, DefaultRecord)
		err := chain.Append(c.step, c.x, c.logp, -1)
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
		if chain.Steps() != 10 || chain.View().Steps() != 5 {
			t.Errorf("a refused step changed the chain")
		}
	}
}

func TestNewChainErrors(t *testing.T) {
	line := make([]float64, 24)
	for k := range 12 {
		line[2*k], line[2*k+1] = float64(k), 1e-3*float64(k)+5
	}
	for _, c := range []struct {
		start [][]float64
		every int
		want  string
	}{
		{nil, 1, "at least one ensemble"},
		{[][]float64{normals(1, 24), normals(1, 28)}, 1, "ensemble 1 has 28 numbers"},
		{[][]float64{normals(1, 24), line}, 1, "walkers of ensemble 1 do not span"},
		{[][]float64{make([]float64, 24)}, 1, "walkers of ensemble 0 do not span"},
		{[][]float64{normals(1, 26)}, 1, "13 walkers"},
		{[][]float64{normals(1, 24)}, 0, "every 0 steps"},
	} {
		if _, err := NewChain(2, c.start, c.every, DefaultRecord); err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("error %v, want one with %q", err, c.want)
		}
	}
}

// Walkers that lie close to a line in a wildly scaled space still span it.
func TestSpansIsScaleFree(t *testing.T) {
	x := normals(1, 64)
	for k := 0; k < 64; k += 2 {
		x[k+1] = 1e9*x[k] + 1e5*x[k+1] + 1e12
	}
	if !spans(2, x) {
		t.Error("walkers on a narrow ridge are refused")
	}
}

func TestMapAllDoesNotDependOnThreads(t *testing.T) {
	c, densities := small().newChain(t, 3, 1, 1, DefaultRecord)
	mustRun(t, t.Context(), densities, c, Settings{Seed: 1, MaxSteps: 150}, nil)
	v := c.View().Thin(2)
	New := func() func(x, y []float64) {
		scratch := make([]float64, 3)
		return func(x, y []float64) {
			copy(scratch, x)
			y[0], y[1] = scratch[0]+scratch[1], math.Sin(scratch[2])
		}
	}
	want := v.MapAll(2, 1, New)
	for _, threads := range []int{2, 8, 0} {
		got := v.MapAll(2, threads, New)
		for q := range want {
			if !slices.Equal(got[q].Values(), want[q].Values()) {
				t.Errorf("%d threads: quantity %d differs", threads, q)
			}
		}
	}
	sum := v.Map(func(x []float64) float64 { return x[0] + x[1] })
	if !slices.Equal(sum.Values(), want[0].Values()) {
		t.Error("Map and MapAll differ")
	}
	i := 0
	a, b := v.Coordinate(0).Values(), v.Coordinate(1).Values()
	for _, got := range sum.Values() {
		if got != a[i]+b[i] {
			t.Fatalf("draw %d: %v, want %v", i, got, a[i]+b[i])
		}
		i++
	}
}
