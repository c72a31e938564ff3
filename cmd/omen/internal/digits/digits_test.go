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
		// The first four are the Particle Data Group's own examples, with the
		// errors of a chain long enough not to matter.
		{0.827, 0.119, 1e-6, "0.83 ± 0.12"},
		{0.827, 0.367, 1e-6, "0.8 ± 0.4"},
		{14.674, 0.964, 1e-6, "14.7 ± 1.0"},
		{0.29321, 0.01141, 1e-6, "0.293 ± 0.011"},
		{0.29321, 0.01141, 0.0018, "0.29 ± 0.01"}, // the Monte Carlo error forbids the third
		{68.512, 0.583, 0.009, "68.5 ± 0.6"},
		{-0.0002, 0.0354, 1e-6, "0.000 ± 0.035"},
		{1234.5, 213, 1, "1230 ± 210"},
		{5, 0, 0, "5.000000 ± 0.000000"},
		{math.NaN(), 1, 1, "– ± 1"},
	} {
		if got := Value(c.x, c.sd, c.mcse); got != c.want {
			t.Errorf("Value(%v, %v, %v) = %q, want %q", c.x, c.sd, c.mcse, got, c.want)
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
	for e, want := range map[float64]string{0.00123: "0.0012", 0.0042: "0.004", 0.0971: "0.10", 31.7: "32"} {
		if got := Error(e); got != want {
			t.Errorf("Error(%g) = %q, want %q", e, got, want)
		}
	}
}

func ExampleValue() {
	fmt.Println(Value(0.29321, 0.01141, 0.0002))
	// Output: 0.293 ± 0.011
}
