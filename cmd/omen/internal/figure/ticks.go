package figure

import (
	"math"
	"slices"
	"strconv"
	"strings"
)

func sortFloats(x []float64) { slices.Sort(x) }

// tick is a mark on an axis; minor ones have no label.
type tick struct {
	at    float64
	label Label
}

// linearTicks returns about n labelled ticks at multiples of 1, 2 or 5 times a power of ten.
func linearTicks(lo, hi float64, n int) []tick {
	step := niceStep((hi - lo) / float64(n))
	decimals := max(0, int(-math.Floor(math.Log10(step)*(1+1e-12)+1e-9)))
	var out []tick
	for k := math.Ceil(lo/step - 1e-9); k*step <= hi+1e-9*step; k++ {
		out = append(out, tick{k * step, Plain(decimal(k*step, decimals))})
	}
	return out
}

// someTicks are linear ticks, at least so many.
func someTicks(lo, hi float64, n, least int) []tick {
	for {
		t := linearTicks(lo, hi, n)
		if len(t) >= least || n > 12 {
			return t
		}
		n++
	}
}

// niceStep is the smallest of 1, 2, 5 times a power of ten not below v.
func niceStep(v float64) float64 {
	p := math.Pow(10, math.Floor(math.Log10(v)))
	for _, m := range [3]float64{1, 2, 5} {
		if m*p >= v*(1-1e-9) {
			return m * p
		}
	}
	return 10 * p
}

// decimal writes a number with a true minus sign.
func decimal(v float64, decimals int) string {
	s := strconv.FormatFloat(v, 'f', decimals, 64)
	if strings.Trim(s, "-0.") == "" {
		s = strings.TrimPrefix(s, "-")
	}
	return strings.Replace(s, "-", "−", 1)
}

// logTicks labels powers of ten on an axis w points long, and 2 and 5 times them where it spans less than two
// decades.
func logTicks(lo, hi, w float64) []tick {
	var out []tick
	decades := math.Log10(hi / lo)
	every := max(1, int(math.Ceil(decades*26/w))) // a label takes 26 points at most
	for e := int(math.Floor(math.Log10(lo) - 1e-9)); e <= int(math.Ceil(math.Log10(hi)))+1; e++ {
		for m := 1; m < 10; m++ {
			v := float64(m) * math.Pow(10, float64(e))
			if v < lo*(1-1e-9) || v > hi*(1+1e-9) {
				continue
			}
			t := tick{at: v}
			switch {
			case m == 1 && e%every == 0, decades < 2 && (m == 2 || m == 5):
				t.label = power(m, e)
			case m != 1 && decades > w/25:
				continue
			}
			out = append(out, t)
		}
	}
	return out
}

// power is m × 10^e, as a plain decimal while that is short.
func power(m, e int) Label {
	if e >= -3 && e <= 3 {
		return Plain(decimal(float64(m)*math.Pow(10, float64(e)), max(0, -e)))
	}
	l := Markup("10^{" + strings.Replace(strconv.Itoa(e), "-", "−", 1) + "}")
	if m > 1 {
		l = append(Plain(strconv.Itoa(m)+"×"), l...)
	}
	return l
}
