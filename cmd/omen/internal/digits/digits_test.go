package digits

import (
	"fmt"
	"math"
	"testing"
)

func TestValue(t *testing.T) {
	for _, c := range []struct {
		x, sd, mcse float64
		want        string
	}{
		{0.827, 0.119, 1e-6, "0.83 ± 0.12"},
		{0.0485, 0.0363, 0.0006, "0.049 ± 0.036"}, // the third digit may differ by one with another seed
		{0.0485, 0.0363, 0.0016, "0.05 ± 0.04"},
		{14.674, 0.996, 1e-6, "14.7 ± 1.0"},
		{0.29321, 0.01141, 1e-6, "0.293 ± 0.011"},
		{0.29321, 0.01141, 0.0018, "0.29 ± 0.01"}, // the Monte Carlo error forbids the third
		{68.512, 0.583, 0.009, "68.51 ± 0.58"},
		{68.512, 0.583, 0.012, "68.5 ± 0.6"},
		{-0.0002, 0.0354, 1e-6, "0.000 ± 0.035"},
		{1234.5, 213, 1, "1230 ± 210"},
		{5, 0, 0, "5.000000 ± 0.000000"},
		{math.NaN(), 1, 1e-3, "– ± 1.0"},
	} {
		if got := Value(c.x, c.sd, c.mcse); got != c.want {
			t.Errorf("Value(%v, %v, %v) = %q, want %q", c.x, c.sd, c.mcse, got, c.want)
		}
	}
}

// The first two are the Particle Data Group's own examples (from memory).
func TestSpread(t *testing.T) {
	for sd, want := range map[float64]int{0.119: -2, 0.367: -1, 0.964: -1, 0.0354: -3, 0.0355: -2, 9.996: 0, 213: 1} {
		if got, ok := Spread(sd); got != want || !ok {
			t.Errorf("Spread(%v) = %v, want %v", sd, got, want)
		}
	}
}

func TestShare(t *testing.T) {
	for _, c := range []struct {
		p, e float64
		want string
	}{{0.08501, 0.0028, "0.085 ± 0.003"}, {0.274, 0.0096, "0.27 ± 0.01"}, {0.5, 0.02, "0.50 ± 0.02"}, {0.9996, 0.0003, "0.9996 ± 0.0003"}} {
		if got := Share(c.p, c.e); got != c.want {
			t.Errorf("Share(%v, %v) = %q, want %q", c.p, c.e, got, c.want)
		}
	}
}

// No printed digit may be finer than the Monte Carlo error, at any scale.
func TestPlaceNeverFinerThanMonteCarlo(t *testing.T) {
	for e := -8; e < 8; e++ {
		for _, m := range []float64{1, 1.5, 3.4, 9.4, 9.6, 9.99} {
			sd := m * math.Pow10(e)
			for _, ratio := range []float64{0.5, 0.1, 0.016, 0.001} {
				if p := Place(sd, sd*ratio); math.Pow10(p) < sd*ratio*0.999 {
					t.Errorf("Place(%g, %g) = %d prints digits below the error", sd, sd*ratio, p)
				}
			}
		}
	}
}

func TestError(t *testing.T) {
	for e, want := range map[float64]string{0.00123: "0.0012", 0.0042: "0.0042", 0.0971: "0.097", 31.7: "32", 0.0999: "0.10"} {
		if got := Error(e); got != want {
			t.Errorf("Error(%g) = %q, want %q", e, got, want)
		}
	}
}

// A spread is never written as nothing.
func TestValueOfFewDraws(t *testing.T) {
	for _, c := range []struct {
		x, spread, mcse float64
		want            string
	}{
		{-0.4951, 0.032, 0.011, "-0.5 ± 0.03"},
		{0.3291, 0.0214, 0.0076, "0.33 ± 0.02"},
		{0.3, 0, 0.01, "0.30 ± 0.00"},
	} {
		if got := Value(c.x, c.spread, c.mcse); got != c.want {
			t.Errorf("Value(%g, %g, %g) = %q, expected %q", c.x, c.spread, c.mcse, got, c.want)
		}
	}
}

// Both ends have as many decimals as the less certain one supports, and no fewer.
func TestEnds(t *testing.T) {
	for _, c := range []struct {
		lo, hi, sd float64
		mcse       [2]float64
		want       string
	}{
		{99.104, 102.03, 0.74, [2]float64{0.009, 0.012}, "99.1 … 102.0"},
		{99.104, 102.03, 0.74, [2]float64{0.009, 0.008}, "99.10 … 102.03"},
		{-1.384, -0.511, 0.23, [2]float64{0.02, 0.006}, "-1.4 … -0.5"},
		{0.0351, 0.2263, 0.053, [2]float64{0.0008, 0.0011}, "0.04 … 0.23"},
		{0.0351, 0.2263, 0.053, [2]float64{0, math.NaN()}, "0.035 … 0.226"}, // of an integral
		{0.27123, 0.40211, math.NaN(), [2]float64{0.0011, 0.0004}, "0.27 … 0.40"},
	} {
		p := Ends(c.sd, c.mcse)
		if got := Format(c.lo, p) + " … " + Format(c.hi, p); got != c.want {
			t.Errorf("Ends(%g, %g): %q, expected %q", c.sd, c.mcse, got, c.want)
		}
	}
}

func ExampleValue() {
	fmt.Println(Value(0.29321, 0.01141, 0.0002))
	// Output: 0.293 ± 0.011
}
