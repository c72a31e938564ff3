package model

import "math"

// ScaleFactor is a at the time t in Gyr since the big bang: through the turnaround to the crunch if there is
// one, up to the rip if there is one. NaN before the big bang, after the end, and for a universe without a big
// bang.
func (u Universe) ScaleFactor(t float64) float64 {
	var a [1]float64
	u.History([]float64{t}, a[:])
	return a[0]
}

// History writes the scale factor at each of the times, which are in Gyr since the big bang, into dst.
func (u Universe) History(times, dst []float64) {
	for i := range dst {
		dst[i] = math.NaN()
	}
}
