package gather

import (
	"math"
	"slices"

	"omen/cmd/omen/internal/figure"
)

// bandDraws is how many draws a band is made of. The ends of its 95% interval
// then lie within some 1% of the right percentiles.
const bandDraws = 300

// band collects one curve of every draw over the same abscissae.
type band struct {
	x      []float64
	curves [][]float64
}

// figure is the best fit with the central intervals of the curves. Where too few
// of them exist there is no band.
func (b *band) figure(best []float64) figure.Band {
	n := len(b.x)
	f := figure.Band{X: b.x, Best: best, Lo68: make([]float64, n), Hi68: make([]float64, n), Lo95: make([]float64, n), Hi95: make([]float64, n)}
	column := make([]float64, 0, len(b.curves))
	for i := range b.x {
		column = column[:0]
		for _, c := range b.curves {
			if !math.IsNaN(c[i]) {
				column = append(column, c[i])
			}
		}
		slices.Sort(column)
		if len(column) < len(b.curves)*9/10 {
			column = column[:0]
		}
		f.Lo95[i], f.Lo68[i] = quantile(column, 0.025), quantile(column, 0.16)
		f.Hi68[i], f.Hi95[i] = quantile(column, 0.84), quantile(column, 0.975)
	}
	return f
}

// quantile interpolates between sorted values, NaN if there are none.
func quantile(sorted []float64, p float64) float64 {
	if len(sorted) == 0 {
		return math.NaN()
	}
	at := p * float64(len(sorted)-1)
	i := min(int(at), len(sorted)-1)
	j := min(i+1, len(sorted)-1)
	if sorted[i] == sorted[j] {
		return sorted[i]
	}
	return sorted[i] + (at-float64(i))*(sorted[j]-sorted[i])
}

// grid is n values from lo to hi, evenly spaced, in the logarithm if log.
func grid(lo, hi float64, n int, log bool) []float64 {
	x := make([]float64, n)
	for i := range x {
		t := float64(i) / float64(n-1)
		if log {
			x[i] = lo * math.Pow(hi/lo, t)
		} else {
			x[i] = lo + t*(hi-lo)
		}
	}
	return x
}
