package sampler

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"
)

func normals(seed uint64, n int) []float64 {
	rng := rand.New(rand.NewPCG(seed, 99))
	x := make([]float64, n)
	for i := range x {
		x[i] = rng.NormFloat64()
	}
	return x
}

func near(t *testing.T, what string, got, want, tolerance float64) {
	t.Helper()
	if !(math.Abs(got-want) <= tolerance) {
		t.Errorf("%s = %v, want %v ± %v", what, got, want, tolerance)
	}
}

func TestESSOfIndependentDraws(t *testing.T) {
	d := NewDraws(4, normals(1, 20000), normals(2, 20000))
	near(t, "ESS of 40000 independent draws", ESS(d), 40000, 4000)
	near(t, "MCSE", MCSE(d), 1/200.0, 0.0005)
}

// Walkers that move together are one walker: their number must not count.
func TestESSOfWalkersThatMoveTogether(t *testing.T) {
	one := normals(3, 5000)
	d := NewDraws(8, interleave(one, one, one, one, one, one, one, one))
	near(t, "ESS of 8 equal walkers", ESS(d), 5000, 750)
}

func TestESSCountsSteps(t *testing.T) {
	rng := rand.New(rand.NewPCG(5, 6))
	d := NewDraws(1, ar1(rng, 0.9, 4, 20000)...)
	near(t, "ESS of AR(1)", ESS(d), 4*20000/19.0, 800)
	d.spacing = 10
	near(t, "τ at a spacing of 10", measure(d).tau, 190, 30)
}

// Ensembles that sit in different places know the mean no better than their
// number allows, however long they are.
func TestErrorSeesEnsemblesThatDisagree(t *testing.T) {
	x := [][]float64{normals(1, 8000), normals(2, 8000), normals(3, 8000), normals(4, 8000)}
	for m, shift := range []float64{-0.15, -0.05, 0.05, 0.15} {
		for i := range x[m] {
			x[m][i] += shift
		}
	}
	d := NewDraws(4, x...)
	want := math.Sqrt((0.15*0.15 + 0.05*0.05) * 2 / 3 / 4)
	near(t, "MCSE", MCSE(d), want, 0.15*want)
}

func TestESSThatCannotBeKnown(t *testing.T) {
	for name, d := range map[string]Draws{
		"none":     NewDraws(2),
		"empty":    NewDraws(2, nil, nil),
		"short":    NewDraws(1, normals(1, 7)),
		"zero":     NewDraws(1, make([]float64, 100)),
		"constant": NewDraws(1, slices.Repeat([]float64{0.3}, 3000)),
		"NaN":      NewDraws(1, append(normals(1, 100), math.NaN())),
		"infinite": NewDraws(1, append(normals(1, 100), math.Inf(1))),
	} {
		if s := Summarize(d); !math.IsNaN(s.ESS) || !math.IsNaN(s.MCSE) || !math.IsNaN(s.MCSESD) {
			t.Errorf("%s: ESS %v, MCSE %v %v, want NaN", name, s.ESS, s.MCSE, s.MCSESD)
		}
	}
}

// For independent weighted draws the effective sample size is near Kish's
// (Σw)²/Σw² where weights have nothing to do with values.
func TestESSOfWeightedDraws(t *testing.T) {
	x, w := normals(1, 40000), normals(2, 40000)
	var sum, squares float64
	for i := range w {
		w[i] = math.Exp(0.7 * w[i])
		sum += w[i]
		squares += w[i] * w[i]
	}
	kish := sum * sum / squares
	s := Summarize(NewDraws(1, x).Weighted(NewDraws(1, w)))
	near(t, "ESS", s.ESS, kish, 0.15*kish)
	near(t, "mean", s.Mean, 0, 4/math.Sqrt(kish))
	near(t, "sd", s.SD, 1, 4/math.Sqrt(2*kish))
	near(t, "upper 68%", s.Interval68[1], 0.9945, 0.05)
}

// Importance weights turn one Gaussian into another.
func TestReweighting(t *testing.T) {
	d := NewDraws(4, normals(8, 40000), normals(9, 40000))
	s := Summarize(d.Weighted(d.Map(func(x float64) float64 { return math.Exp(0.5 * x) })))
	near(t, "mean", s.Mean, 0.5, 4.5*s.MCSE)
	near(t, "sd", s.SD, 1, 4.5*s.MCSESD)
	near(t, "median", s.Median, 0.5, 4.5*s.MCSEMedian)
	near(t, "MCSE", s.MCSE, 0.0045, 0.001)
}

// Weights multiply: a condition on reweighted draws keeps both.
func TestWeightsMultiply(t *testing.T) {
	d := NewDraws(1, []float64{1, 2, 4})
	w := d.Weighted(NewDraws(1, []float64{1, 0, 3})).Weighted(NewDraws(1, []float64{6, 1, 1}))
	mean, _, _ := meanVariance(w)
	near(t, "mean", mean, (6*1+3*4)/9.0, 1e-15)
}

// A quantity that is NaN for some draws can be summarised where it is not.
func TestConditionalSummary(t *testing.T) {
	d := NewDraws(4, normals(8, 20000), normals(9, 20000))
	root := d.Map(math.Sqrt)
	if s := Summarize(root); !math.IsNaN(s.Mean) || !math.IsNaN(s.Median) || !math.IsNaN(s.HDI68[0]) {
		t.Errorf("draws with NaN have mean %v and median %v", s.Mean, s.Median)
	}
	s := Summarize(root.Weighted(d.Map(func(x float64) float64 {
		if x > 0 {
			return 1
		}
		return 0
	})))
	// E √|x| of a unit normal is 2^¼ Γ(¾)/√π.
	near(t, "mean", s.Mean, math.Pow(2, 0.25)*math.Gamma(0.75)/math.SqrtPi, 4.5*s.MCSE)
	near(t, "ESS", s.ESS, 20000, 3000)
}
