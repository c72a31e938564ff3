package data

import (
	"math"
	"math/rand/v2"
	"strconv"
	"testing"
)

// Every number must be the float64 that strconv finds, bit for bit, whichever path it takes.
func TestParseAgreesWithStrconv(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 8))
	for range 200_000 {
		v := math.Ldexp(rng.NormFloat64(), rng.IntN(200)-100)
		s := strconv.FormatFloat(v, "eg"[rng.IntN(2)], rng.IntN(22), 64)
		want, _ := strconv.ParseFloat(s, 64)
		if got, ok := parse([]byte(s)); !ok || math.Float64bits(got) != math.Float64bits(want) {
			t.Fatalf("%s: %v %v, want %v", s, got, ok, want)
		}
		s = strconv.FormatFloat(rng.NormFloat64(), 'f', rng.IntN(20), 64)
		want, _ = strconv.ParseFloat(s, 64)
		if got, ok := parse(s); !ok || got != want {
			t.Fatalf("%s: %v %v, want %v", s, got, ok, want)
		}
	}
}

func TestParse(t *testing.T) {
	inf, nan := math.Inf(1), math.NaN()
	tests := []struct {
		s    string
		want float64
		ok   bool
	}{
		{"0", 0, true}, {"-0", math.Copysign(0, -1), true}, {"+7", 7, true}, {".5", 0.5, true}, {"5.", 5, true},
		{"1e22", 1e22, true}, {"1e23", 1e23, true}, {"1e-22", 1e-22, true}, {"1E+05", 1e5, true}, {"1e-400", 0, true},
		{"9007199254740993", 9007199254740992, true}, {"0.00000000000000000000001", 1e-23, true},
		{"1.5D-03", 0.0015, true}, {"1d3", 1000, true}, {"12345678901234567890D-3", 12345678901234567.890, true},
		{"1e999", inf, true}, {"inf", inf, true}, {"-Inf", -inf, true}, {"NaN", nan, true},
		{"", nan, false}, {"-", nan, false}, {".", nan, false}, {"e5", nan, false}, {"1e", nan, false}, {"1e+", nan, false},
		{"1.2.3", nan, false}, {"1,5", nan, false}, {"1_000", nan, false}, {"0x1p-2", nan, false}, {"1 2", nan, false},
		{"12a", nan, false}, {"1f5", nan, false}, {"--1", nan, false}, {"1e0x", nan, false}, {"dd", nan, false}, {"1d2d3", nan, false},
	}
	for _, test := range tests {
		got, ok := parse(test.s)
		same := math.Float64bits(got) == math.Float64bits(test.want) || math.IsNaN(got) && math.IsNaN(test.want)
		if ok != test.ok || !same {
			t.Errorf("%q: %v %v, want %v %v", test.s, got, ok, test.want, test.ok)
		}
	}
}
