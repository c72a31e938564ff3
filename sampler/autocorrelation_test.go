package sampler

import (
	"math"
	"math/rand/v2"
	"testing"
)

// An AR(1) series has τ = (1+ρ)/(1−ρ) exactly.
func TestAutocorrelationTimeOfAR1(t *testing.T) {
	for _, c := range []struct {
		rho, tau  float64
		series, n int
	}{
		{0, 1, 1, 50000},
		{0.5, 3, 4, 50000},
		{0.9, 19, 1, 200000},
		{0.9, 19, 4, 50000},
		{-0.5, 1.0 / 3, 4, 50000},
		{0.99, 199, 8, 30000},
	} {
		rng := rand.New(rand.NewPCG(7, 11))
		series := ar1(rng, c.rho, c.series, c.n)
		for _, s := range series {
			for i := range s {
				s[i] += 50 // a mean is no correlation
			}
		}
		tau := AutocorrelationTime(series...)
		relative := math.Sqrt((4*5*max(c.tau, 1) + 2) / float64(c.series*c.n))
		// What is beyond the window: 0.7% for a long τ, 2ρ⁶/(1−ρ) for a short.
		beyond := max(0.007, 2*math.Abs(math.Pow(c.rho, 6)/(1-c.rho))/c.tau)
		if math.Abs(tau/c.tau-1) > 3*relative+beyond {
			t.Errorf("ρ = %v, %d × %d: τ = %v, want %v ± %.1f%%", c.rho, c.series, c.n, tau, c.tau, 100*relative)
		}
	}
}

func TestAutocorrelationTimeThatCannotBeKnown(t *testing.T) {
	rng := rand.New(rand.NewPCG(1, 2))
	if tau := AutocorrelationTime(ar1(rng, 0, 1, 7)...); !math.IsNaN(tau) {
		t.Errorf("7 values: τ = %v, want NaN", tau)
	}
	if tau := AutocorrelationTime(make([]float64, 100)); !math.IsNaN(tau) {
		t.Errorf("constant: τ = %v, want NaN", tau)
	}
	if tau := AutocorrelationTime(append(normals(1, 50), math.NaN())); !math.IsNaN(tau) {
		t.Errorf("a NaN: τ = %v, want NaN", tau)
	}
	// Two series that sit apart never forget which they are.
	apart := [][]float64{normals(1, 100), normals(2, 100)}
	for i := range apart[0] {
		apart[0][i] += 10
	}
	if tau := AutocorrelationTime(apart...); !math.IsInf(tau, 1) {
		t.Errorf("series apart: τ = %v, want +Inf", tau)
	}
	// A series much shorter than its τ of 1999 cannot know it, but must not
	// look long enough.
	if tau := AutocorrelationTime(ar1(rng, 0.999, 1, 2000)...); Trust*tau < 2000 {
		t.Errorf("2000 values of ρ = 0.999: τ = %v looks trustworthy", tau)
	}
	if tau := AutocorrelationTime(); !math.IsNaN(tau) {
		t.Errorf("no series: τ = %v, want NaN", tau)
	}
}

// The transform must give what the definition gives, and so must lag after lag
// where the transform takes over.
func TestAutocovarianceIsItsDefinition(t *testing.T) {
	rng := rand.New(rand.NewPCG(3, 4))
	for _, n := range []int{8, 37, 64, 100, fewLags + 2} {
		series := ar1(rng, 0.6, 3, n)
		got := autocovariance(series)
		c := lags{series: series}
		for l := range n {
			want := 0.0
			for _, s := range series {
				for i := range n - l {
					want += s[i] * s[i+l] / float64(3*n)
				}
			}
			if one := c.at(l); math.Abs(got[l]-want) > 1e-13 || math.Abs(one-want) > 1e-13 {
				t.Errorf("n = %d, lag %d: %v and %v, want %v", n, l, got[l], one, want)
			}
		}
		if (c.all != nil) != (n > fewLags) {
			t.Errorf("n = %d: transformed %t", n, c.all != nil)
		}
	}
}
