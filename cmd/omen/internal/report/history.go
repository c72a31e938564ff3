package report

import (
	"bytes"
	"encoding/csv"
	"fmt"
	"math"
	"strconv"

	"omen/cmd/omen/internal/outlook"
)

// History writes history.csv: the scale factor against time from today.
//
//	time                  Gyr, or 1/H0 where H0 is not known: the comment above says which
//	a_best                the best fit; empty before its big bang and after its end
//	a_median              half of the posterior lies below at this time
//	a_low68, a_high68     the central 68% of it
//	a_low95, a_high95     the central 95%
//
// In the last five a universe that has not begun, or is over, counts as 0, and one that
// was torn apart as inf.
func History(t *outlook.Trace) []byte {
	var b bytes.Buffer
	in := "1/H0, for H0 is not known"
	if t.Gyr {
		in = "Gyr"
	}
	fmt.Fprintf(&b, "# scale factor of the universe, 1 today; time from today in %s\n", in)
	fmt.Fprintf(&b, "# best fit and posterior bands: not begun or over counts as 0, torn apart as inf\n")
	w := csv.NewWriter(&b)
	w.Write([]string{"time", "a_best", "a_median", "a_low68", "a_high68", "a_low95", "a_high95"})
	for i := range t.Time {
		row := []string{short(t.Time[i])}
		for _, v := range []float64{t.Best[i], t.Median[i], t.Low68[i], t.High68[i], t.Low95[i], t.High95[i]} {
			row = append(row, short(v))
		}
		w.Write(row)
	}
	w.Flush()
	return b.Bytes()
}

// short is a number in seven digits, nothing for NaN.
func short(v float64) string {
	switch {
	case math.IsNaN(v):
		return ""
	case math.IsInf(v, 1):
		return "inf"
	}
	return strconv.FormatFloat(v, 'g', 7, 64)
}
