// Package digits decides how many digits of a number deserve to be printed.
//
// Two rules meet. The spread of a quantity asks for two significant digits. Its
// Monte Carlo error forbids any digit that another seed would change by more than
// one. They hold wherever a quantity is printed: on the terminal, on a page, in LaTeX.
package digits

import (
	"math"
	"strconv"
)

// Place is the power of ten of the last digit to print for a quantity with the
// given spread and Monte Carlo error: the second significant digit of the spread,
// or coarser where [MonteCarlo] says so. A zero or NaN argument has no say; with
// neither, Place is −6.
func Place(spread, mcse float64) int {
	place, ok := exponent(spread)
	place--
	if !ok {
		place = math.MinInt
	}
	if mc, known := exponent(mcse); known || ok {
		if known && mc >= place {
			place = max(place, MonteCarlo(mcse))
		}
		return place
	}
	return -6
}

// exponent is the power of ten of the first of two significant digits of x.
func exponent(x float64) (exp int, ok bool) {
	if !(x > 0) || math.IsInf(x, 0) {
		return 0, false
	}
	exp = int(math.Floor(math.Log10(x)))
	if math.Round(x/math.Pow10(exp-1)) >= 100 { // 9.96 rounds to 10
		exp++
	}
	return exp, true
}

// Spread is the last place to print of a limit, which needs no second digit where its
// first is large: the Particle Data Group's rule for errors. Of three leading digits,
// 100–354 keep two, 355–949 keep one, 950–999 round up to 1000 and keep two.
func Spread(sd float64) (place int, ok bool) {
	if !(sd > 0) || math.IsInf(sd, 0) {
		return 0, false
	}
	exp := int(math.Floor(math.Log10(sd)))
	lead := math.Round(sd / math.Pow10(exp-2))
	if lead >= 1000 { // 9.999 rounds into the next decade
		exp, lead = exp+1, 100
	}
	if lead <= 354 {
		return exp - 1, true
	}
	return exp, true // 950–999 round up to 10, two digits of the next decade
}

// MonteCarlo is the finest place that a Monte Carlo error supports: one unit of
// it is at least the error.
func MonteCarlo(mcse float64) int {
	return int(math.Ceil(math.Log10(mcse) - 1e-9))
}

// Format writes x with its last digit at 10^place, NaN as "–".
func Format(x float64, place int) string {
	if math.IsNaN(x) {
		return "–"
	}
	if math.IsInf(x, 0) {
		return map[bool]string{true: "∞", false: "−∞"}[x > 0]
	}
	if place > 0 {
		unit := math.Pow10(place)
		x, place = math.Round(x/unit)*unit, 0
	}
	s := strconv.FormatFloat(x, 'f', -place, 64)
	if v, _ := strconv.ParseFloat(s, 64); v == 0 && s[0] == '-' {
		return s[1:]
	}
	return s
}

// Value writes a quantity with its spread, "0.293 ± 0.011".
func Value(x, spread, mcse float64) string {
	p := Place(spread, mcse)
	return Format(x, p) + " ± " + Width(spread, p)
}

// Width writes a spread with its last digit at 10^place. One that the Monte Carlo error
// of so few draws would round to nothing keeps its first digit.
func Width(spread float64, place int) string {
	if first, ok := exponent(spread); ok && math.Round(spread/math.Pow10(place)) == 0 {
		place = first
	}
	return Format(spread, place)
}

// Ends is the last place to print of both ends of an interval about a quantity with the
// given spread: they have one number of decimals, which is what the less certain of the
// two supports.
func Ends(spread float64, mcse [2]float64) int {
	return max(Place(spread, mcse[0]), Place(spread, mcse[1]))
}

// Error writes an error with two significant digits.
func Error(e float64) string {
	exp, ok := exponent(e)
	if !ok {
		return Format(e, 0)
	}
	return Format(e, exp-1)
}

// Share writes a probability with its Monte Carlo error, to the first digit of
// the error and no further.
func Share(p, e float64) string {
	exp, ok := exponent(e)
	if !ok {
		return Format(p, -6)
	}
	if math.Round(e/math.Pow10(exp)) >= 10 {
		exp++
	}
	return Format(p, exp) + " ± " + Format(e, exp)
}
