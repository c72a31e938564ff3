package sampler

import "math"

// burnTimes is how many autocorrelation times are discarded at least. An
// exponential relaxation has an integrated time of twice its decay time, so
// that after five the walkers remember e⁻¹⁰ of their start.
const burnTimes = 5

// mserTolerance is by how much the squared standard error may exceed its least
// value. Where a stationary series has the least is chance, and often far in;
// the first truncation that does almost as well discards less, and in tests on
// AR(1) series still all of a transient.
const mserTolerance = 0.2

// burnIn returns the number of rows to discard from the start of a chain: the
// larger of
//
//   - twice the truncation of [mser], the largest over the log-density, every
//     parameter and its squared distance from where it ended, each averaged over
//     all ensembles. The squares and the log-density see a start that is centred
//     but too wide. Twice, since at the truncation the memory of the start is
//     down to the noise of a step, but all on one side; as it decays
//     exponentially, the same time again squares what it has decayed by;
//   - five autocorrelation times of the slowest parameter after that,
//
// but at most half of the rows. A chain so short that the half decides is too
// short to be called converged as well.
func burnIn(logp Draws, parameters []Draws) int {
	half := logp.steps() / 2
	drop := mser(stepMeans(logp))
	for _, d := range parameters {
		late, _, _ := meanVariance(d.after(half))
		drop = max(drop, mser(stepMeans(d)), mser(stepSquares(d, late)))
	}
	longest := 0.0
	for _, d := range parameters {
		if tau := measure(d.after(2 * drop)).tau; !math.IsNaN(tau) {
			longest = max(longest, tau)
		}
	}
	need := math.Ceil(burnTimes * longest / float64(logp.spacing))
	return int(min(max(need, 2*float64(drop)), float64(half)))
}

// stepMeans returns the mean over all ensembles and walkers at each step.
func stepMeans(d Draws) []float64 {
	means := make([]float64, d.steps())
	for _, series := range influence(d, 0, 1) {
		for t, v := range series {
			means[t] += v / float64(len(d.x))
		}
	}
	return means
}

// stepSquares returns the mean squared distance from a value at each step, of
// draws without weights.
func stepSquares(d Draws, from float64) []float64 {
	squares := make([]float64, d.steps())
	for _, x := range d.x {
		for i, v := range x {
			squares[i/d.walkers] += (v - from) * (v - from) / float64(len(d.x)*d.walkers)
		}
	}
	return squares
}

// mser truncates a series by the marginal standard error rule of White (1997,
// Simulation 69, 323): the squared standard error that the rest s[d:] would have
// if its values were independent, Σ(s − mean)²/(n−d)², is least where dropping
// more loses more to the shorter series than it gains. It returns the first
// d ≤ n/2 within mserTolerance of the least.
func mser(s []float64) int {
	rule := make([]float64, len(s))
	least := math.Inf(1)
	var count, mean, squares float64
	// From the end, so that one pass gives all sums (Welford 1962, Technometrics
	// 4, 419).
	for i := len(s) - 1; i >= 0; i-- {
		count++
		delta := s[i] - mean
		mean += delta / count
		squares += delta * (s[i] - mean)
		rule[i] = squares / (count * count)
		if i <= len(s)/2 {
			least = min(least, rule[i])
		}
	}
	for i, r := range rule {
		if r <= least*(1+mserTolerance) {
			return i
		}
	}
	return 0
}
