package sampler

import (
	"math"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

func TestOrderSorts(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		x := rapid.SliceOf(rapid.Float64()).Draw(t, "x")
		var got []float64
		for _, i := range order(x) {
			got = append(got, x[i])
		}
		want := slices.Clone(x)
		slices.Sort(want)
		if !slices.Equal(got, want) {
			t.Fatalf("order gives %v, want %v", got, want)
		}
	})
}

func TestQuantile(t *testing.T) {
	d := NewDraws(1, []float64{30, 10, 20, 40})
	for p, want := range map[float64]float64{0: 10, 0.1: 10, 0.125: 10, 0.25: 15, 0.5: 25, 0.875: 40, 1: 40} {
		near(t, "quantile", Quantile(d, p)[0], want, 1e-12)
	}
	if q := Quantile(NewDraws(1, []float64{1, math.NaN()}), 0.5)[0]; !math.IsNaN(q) {
		t.Errorf("median with a NaN = %v", q)
	}
	if q := Quantile(NewDraws(1), 0.5)[0]; !math.IsNaN(q) {
		t.Errorf("median of nothing = %v", q)
	}
}

// A weight of 2 is the draw twice, a weight of 0 is none.
func TestWeightsRepeat(t *testing.T) {
	x := normals(4, 3000)
	w := make([]float64, len(x))
	var repeated []float64
	for i := range w {
		w[i] = float64(i % 3)
		for range i % 3 {
			repeated = append(repeated, x[i])
		}
	}
	got := Summarize(NewDraws(1, x).Weighted(NewDraws(1, w)))
	want := Summarize(NewDraws(1, repeated))
	near(t, "mean", got.Mean, want.Mean, 1e-12)
	near(t, "sd", got.SD, want.SD, 1e-12)
	near(t, "median", got.Median, want.Median, 0.002)
	near(t, "2.5%", got.Interval95[0], want.Interval95[0], 0.01)
	near(t, "HDI", got.HDI68[1]-got.HDI68[0], want.HDI68[1]-want.HDI68[0], 0.01)
}

// grid returns quantiles of a distribution at even probabilities: draws without
// noise.
func grid(n int, inverse func(p float64) float64) Draws {
	x := make([]float64, n)
	for i := range x {
		x[i] = inverse((float64(i) + 0.5) / float64(n))
	}
	return NewDraws(1, x)
}

func TestIntervalsOfTheExponential(t *testing.T) {
	s := Summarize(grid(20000, func(p float64) float64 { return -math.Log1p(-p) }))
	near(t, "mean", s.Mean, 1, 1e-3)
	near(t, "sd", s.SD, 1, 1e-3)
	near(t, "median", s.Median, math.Ln2, 1e-6)
	near(t, "lower 68%", s.Interval68[0], -math.Log(0.84), 1e-6)
	near(t, "upper 68%", s.Interval68[1], -math.Log(0.16), 1e-6)
	near(t, "lower 95%", s.Interval95[0], -math.Log(0.975), 1e-6)
	near(t, "upper 95%", s.Interval95[1], -math.Log(0.025), 1e-5)
	// Densest where the density is highest: from zero on.
	near(t, "lower HDI", s.HDI68[0], 0, 1e-4)
	near(t, "upper HDI", s.HDI68[1], -math.Log(0.32), 1e-3)
	// And where it rises instead, at the other end.
	s = Summarize(grid(20000, math.Log))
	near(t, "lower HDI of the mirrored", s.HDI68[0], math.Log(0.32), 1e-3)
	near(t, "upper HDI of the mirrored", s.HDI68[1], 0, 1e-4)
}

// The error of a quantile of n independent draws is √(p(1−p)/n)/density.
func TestQuantileError(t *testing.T) {
	const n = 40000
	d := NewDraws(1, normals(21, n))
	s := Summarize(d)
	near(t, "error of the median", s.MCSEMedian, math.Sqrt(0.25*2*math.Pi/n), 0.2*s.MCSEMedian)
	density := math.Exp(-1.959964*1.959964/2) / math.Sqrt(2*math.Pi)
	near(t, "error of 2.5%", s.MCSE95[0], math.Sqrt(0.025*0.975/n)/density, 0.2*s.MCSE95[0])
	density = math.Exp(-0.994458*0.994458/2) / math.Sqrt(2*math.Pi)
	near(t, "error of 84%", s.MCSE68[1], math.Sqrt(0.16*0.84/n)/density, 0.2*s.MCSE68[1])
	near(t, "error of sd", s.MCSESD, math.Sqrt(0.5/n), 0.1*s.MCSESD)
}

func TestCorrelation(t *testing.T) {
	a, b := normals(1, 20000), normals(2, 20000)
	mixed := make([]float64, len(a))
	for i := range a {
		mixed[i] = -0.6*a[i] + 0.8*b[i]
	}
	near(t, "correlation", Correlation(NewDraws(1, a), NewDraws(1, mixed)), -0.6, 0.02)
	near(t, "with itself", Correlation(NewDraws(1, a), NewDraws(1, a)), 1, 1e-12)
	if r := Correlation(NewDraws(1, a), NewDraws(1, make([]float64, len(a)))); !math.IsNaN(r) {
		t.Errorf("correlation with a constant = %v, want NaN", r)
	}
}
