package sampler

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

// shifted returns four ensembles of AR(1) draws, the last changed by f.
func shifted(f func(step int, x float64) float64) Draws {
	rng := rand.New(rand.NewPCG(12, 13))
	var x [][]float64
	for range 4 {
		x = append(x, interleave(ar1(rng, 0.8, 8, 2000)...))
	}
	for i := range x[3] {
		x[3][i] = f(i/8, x[3][i])
	}
	return NewDraws(8, x...)
}

func TestRHat(t *testing.T) {
	same := func(_ int, x float64) float64 { return x }
	for _, c := range []struct {
		name        string
		draws       Draws
		least, most float64
	}{
		{"alike", shifted(same), 0.999, 1.004},
		{"cubed", shifted(same).Map(func(x float64) float64 { return x * x * x * 1e6 }), 0.999, 1.004},
		{"mean", shifted(func(_ int, x float64) float64 { return x + 1 }), 1.05, 2},
		{"scale only", shifted(func(_ int, x float64) float64 { return 2 * x }), 1.02, 2},
		{"drift", shifted(func(t int, x float64) float64 { return x + float64(t)/700 }), 1.02, 3},
		{"apart", shifted(func(_ int, x float64) float64 { return x + 1000 }), 1.3, 10},
	} {
		if r := RHat(c.draws); !(r >= c.least && r <= c.most) {
			t.Errorf("%s: R-hat %v, want %v to %v", c.name, r, c.least, c.most)
		}
	}
}

// Without the folded half, ensembles that differ in width alone look alike.
func TestRHatNeedsFolding(t *testing.T) {
	halves := split(shifted(func(_ int, x float64) float64 { return 2 * x }))
	bulk, folded := bulkAndFolded(halves)
	if bulk > 1.01 {
		t.Errorf("bulk R-hat of the same mean = %v, want < 1.01", bulk)
	}
	if folded < 1.02 {
		t.Errorf("folded R-hat of different widths = %v, want > 1.02", folded)
	}
}

// Folding must leave the values in order, whatever their number and ties.
func TestFold(t *testing.T) {
	for _, x := range [][]float64{{1, 2}, {3, 1, 2}, {5, -1, 7, 5}, {2, 2, 2, 9}, {8, 1, 4, 4, 0, 4, -3}} {
		folded, index := fold(x, order(x))
		sorted := slices.Clone(x)
		slices.Sort(sorted)
		median := (sorted[(len(x)-1)/2] + sorted[len(x)/2]) / 2
		seen := make([]bool, len(x))
		for i, at := range index {
			near(t, "distance", folded[at], math.Abs(x[at]-median), 0)
			if seen[at] || i > 0 && folded[index[i-1]] > folded[at] {
				t.Errorf("%v: distances %v in the order %v", x, folded, index)
			}
			seen[at] = true
		}
	}
}

func TestRHatThatCannotBeKnown(t *testing.T) {
	for name, d := range map[string]Draws{
		"none":     NewDraws(2),
		"short":    NewDraws(2, normals(1, 6), normals(2, 6)),
		"constant": NewDraws(1, make([]float64, 100)),
		"NaN":      NewDraws(1, []float64{1, 2, 3, 4, 5, 6, 7, math.NaN()}),
		"weighted": NewDraws(1, normals(1, 100)).Weighted(NewDraws(1, make([]float64, 100))),
	} {
		if r := RHat(d); !math.IsNaN(r) {
			t.Errorf("%s: R-hat %v, want NaN", name, r)
		}
	}
}

// The two halves meet in the middle and end where the draws end.
func TestSplit(t *testing.T) {
	x := make([]float64, 2*11)
	for i := range x {
		x[i] = float64(i / 2)
	}
	halves := split(NewDraws(2, x))
	want := [][]float64{{0, 0, 1, 1, 2, 2, 3, 3, 4, 4}, {6, 6, 7, 7, 8, 8, 9, 9, 10, 10}}
	for h := range want {
		for i := range want[h] {
			if halves[h][i] != want[h][i] {
				t.Fatalf("halves %v, want %v", halves, want)
			}
		}
	}
}

func TestNormalScores(t *testing.T) {
	// Φ⁻¹((r − 3/8)/(4 + 1/4)) for ranks 1, 2.5, 2.5, 4.
	all := []float64{5, -1, 7, 5}
	got := normalScores(all, order(all), scores(4), 2)
	want := [][]float64{{0, -1.0491314}, {1.0491314, 0}}
	for i := range want {
		for j := range want[i] {
			near(t, "score", got[i][j], want[i][j], 1e-6)
		}
	}
}

// rhat of two chains against the definition worked by hand: means 1 and 3,
// variances 1, n = 3: W = 1, B/n = 2.
func TestRHatByHand(t *testing.T) {
	near(t, "R-hat", rhat([][]float64{{0, 1, 2}, {2, 3, 4}}), math.Sqrt(2.0/3+2), 1e-15)
}
