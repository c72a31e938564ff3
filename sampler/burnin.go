package sampler

import (
	"math"
)

// burnTimes is how many autocorrelation times are discarded at least. An
// exponential relaxation has an integrated time of twice its decay time, so
// that after five the walkers remember e⁻¹⁰ of their start.
const burnTimes = 5

// mserBatches is into how many batches BurnIn divides the record, and so the
// resolution of the burn-in.
const mserBatches = 200

// BurnIn reads off a view of the whole chain how many steps to discard, for use
// with [View.After]. It is the larger of
//
//   - the truncation that minimises the standard error of the mean of what
//     remains, the "marginal standard error rule" of White (1997, Simulation 69,
//     323), the largest over the log-density, every parameter and its squared
//     distance from where it ended, each averaged over the ensemble. The squares
//     and the log-density see a start that is too wide but centred;
//   - five autocorrelation times of the slowest parameter after that,
//
// but at most half of the chain. A chain so short that the half decides does
// not pass the tests of [Run].
func BurnIn(v View) int {
	all := make([]Draws, v.dim)
	for i := range all {
		all[i] = v.Coordinate(i)
	}
	times := func(i, drop int) float64 { return measure(all[i].after(drop)).tau }
	return v.stepAt(burnRows(v.LogDensity(), all, times))
}

// stepAt returns the number of the last step of the first rows of a view.
func (v View) stepAt(rows int) int {
	return v.first + (rows-1)*v.spacing
}

// burnRows returns the number of rows to discard. tau(i, drop) is the
// autocorrelation time of parameter i, in steps, after dropping rows.
func burnRows(logp Draws, parameters []Draws, tau func(i, drop int) float64) int {
	half := logp.steps() / 2
	drop := truncation(logp)
	for _, d := range parameters {
		late, _, _ := meanVariance(d.after(half))
		square := d.Map(func(x float64) float64 { return (x - late) * (x - late) })
		drop = max(drop, truncation(d), truncation(square))
	}
	longest := 0.0
	for i := range parameters {
		if t := tau(i, drop); !math.IsNaN(t) {
			longest = max(longest, t)
		}
	}
	need := math.Ceil(burnTimes * longest / float64(logp.spacing))
	if need > float64(half) {
		return half
	}
	return max(drop, int(need))
}

// truncation returns the largest, over the ensembles, of the rows to drop from
// the series of ensemble means.
func truncation(d Draws) int {
	drop := 0
	for _, s := range influence(d, 0, 1) {
		drop = max(drop, mser(s))
	}
	return drop
}

// mser returns the d ≤ n/2 that minimises Σ(s − mean)²/(n−d)² over s[d:], in
// whole batches of the series.
func mser(s []float64) int {
	batch := max(1, len(s)/mserBatches)
	n := len(s) / batch
	best, drop := math.Inf(1), 0
	var count, mean, squares float64
	// From the end, so that each batch updates the sums (Welford 1962).
	for i := n - 1; i >= 0; i-- {
		start := len(s) - (n-i)*batch
		x := meanOf(s[start : start+batch])
		count++
		delta := x - mean
		mean += delta / count
		squares += delta * (x - mean)
		if i <= n/2 && squares/(count*count) <= best {
			best, drop = squares/(count*count), start
		}
	}
	// The rows before the first whole batch are no reason to drop anything.
	if drop < batch {
		return 0
	}
	return drop
}
