package data

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"
	"strings"
	"testing"
)

// What plain reads it reads as strconv does, to the last bit, and no further than the number.
func TestPlain(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 7))
	check := func(word string) {
		t.Helper()
		want, err := strconv.ParseFloat(word, 64)
		for _, rest := range []string{"\n1", " 12345678", ",0.5\n", ";"} {
			v, end, ok := plain([]byte(word + rest + strings.Repeat(" ", 16)))
			if ok && (err != nil || math.Float64bits(v) != math.Float64bits(want) || end != len(word)) {
				t.Fatalf("%q: %v up to byte %d, want %v, %v", word+rest, v, end, want, err)
			}
		}
	}
	read := 0
	for range 20000 {
		x := rng.NormFloat64() * math.Pow(10, float64(rng.IntN(12)-6))
		for _, verb := range []string{"%.8f", "%.15g", "%.3e", "%g", "%.0f", "%.12e"} {
			word := fmt.Sprintf(verb, x)
			check(word)
			if _, _, ok := plain([]byte(word + "\n")); ok {
				read++
			}
		}
	}
	if read < 80000 {
		t.Errorf("only %d of 120000 numbers were plain", read)
	}
	for _, word := range []string{"", "-", ".", "-.5", "5.", "1e", "1e+", "1e400", "1e-5x", "0x1p3", "nan", "inf", "1_000", "--1", "1.2.3", "00000000000000000001", "123456789012345678901234567890",
		"12345678", "123456789", "1234567:", "1234567/", "9007199254740993", "1e22", "1e23", "1e-22", "4.9e-324", "99999999999999999999"} {
		check(word)
	}
}
