package sampler

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// moments of draws and what is known about their error.
type moments struct {
	mean, variance float64
	mcse           float64 // Monte Carlo standard error of the mean
	tau            float64 // autocorrelation time of the ensemble means, in steps of the run
}

// ess is the number of independent draws that would give the mean the same
// error: the variance over the squared error.
func (m moments) ess() float64 { return m.variance / (m.mcse * m.mcse) }

// measure computes the moments of draws.
//
// The walkers of one ensemble are not independent, so the error comes from the
// series of ensemble means f_m(t) alone, as in §5 of Goodman & Weare (2010): for
// M ensembles of N steps
//
//	MCSE² = Var(f) τ(f) / (M N).
//
// For weighted draws f is the ensemble mean of w(x − mean)/⟨w⟩, the first-order
// error of a ratio of two means (delta method, common practice), which is the
// same thing for weights of one.
func measure(d Draws) moments {
	mean, variance, weight := meanVariance(d)
	m := moments{mean: mean, variance: variance}
	m.judge(influence(d, mean, weight), d.spacing)
	return m
}

// judge sets what the series of ensemble means, taken about the mean of all and
// some steps of the run apart, say about the error; NaN if nothing.
func (m *moments) judge(series [][]float64, spacing int) {
	variance, tau := correlation(series)
	if !(m.variance > 0) || math.IsInf(m.variance, 1) || math.IsNaN(tau) {
		m.mcse, m.tau = math.NaN(), math.NaN()
		return
	}
	m.tau = tau * float64(spacing)
	squared := variance * tau / float64(len(series)*len(series[0]))
	m.mcse = math.Sqrt(guard(squared, series))
}

// meanVariance returns the weighted mean and variance of draws, and the mean
// weight. Two passes, so that a mean far from zero costs no digits. The variance of a
// constant is zero, whatever the rounding of its mean.
func meanVariance(d Draws) (mean, variance, weight float64) {
	var sum, sumW float64
	least, most := math.Inf(1), math.Inf(-1)
	d.each(func(x, w float64) {
		sum += w * x
		sumW += w
		least, most = min(least, x), max(most, x)
	})
	mean = sum / sumW
	if least == most {
		return least, 0, sumW / float64(d.Len())
	}
	d.each(func(x, w float64) { variance += w * (x - mean) * (x - mean) })
	return mean, variance / sumW, sumW / float64(d.Len())
}

// influence returns, for each ensemble, the series of the mean over walkers of
// w(x − mean)/weight: how each step pulls the mean.
func influence(d Draws, mean, weight float64) [][]float64 {
	series := make([][]float64, len(d.x))
	for m := range series {
		series[m] = make([]float64, d.steps())
		for t := range series[m] {
			series[m][t] = d.pull(m, t, mean) / (float64(d.walkers) * weight)
		}
	}
	return series
}

// pull returns Σ w(x − mean) over the walkers of ensemble m at step t.
func (d Draws) pull(m, t int, mean float64) float64 {
	sum := 0.0
	row := d.x[m][t*d.walkers : (t+1)*d.walkers]
	if d.w == nil {
		for _, x := range row {
			sum += x - mean
		}
		return sum
	}
	for k, w := range d.w[m][t*d.walkers : (t+1)*d.walkers] {
		if w > 0 {
			sum += w * (row[k] - mean)
		}
	}
	return sum
}

// guard compares the squared error from the autocorrelation with the scatter of
// the ensembles' own means. The scatter of few means is itself uncertain, so it
// takes over only where chance would make it so large once in a thousand times:
// then the ensembles have not seen the same distribution.
func guard(squared float64, series [][]float64) float64 {
	degrees := float64(len(series) - 1)
	if degrees < 1 {
		return squared
	}
	sum := 0.0 // of the squared deviations from the grand mean, which is zero
	for _, s := range series {
		mean := meanOf(s)
		sum += mean * mean
	}
	limit := distuv.ChiSquared{K: degrees}.Quantile(0.999)
	if sum > limit*squared*float64(len(series)) {
		return sum / degrees / float64(len(series))
	}
	return squared
}

// ESS returns the effective sample size of draws for their mean: how many
// independent draws would know the mean as well. NaN if the draws are constant,
// not finite or fewer than 8 steps, 0 if too few for their correlation.
func ESS(d Draws) float64 { return measure(d).ess() }

// MCSE returns the Monte Carlo standard error of the mean of draws. NaN where
// [ESS] is, +Inf where it is 0.
func MCSE(d Draws) float64 { return measure(d).mcse }

// mcseSD returns the Monte Carlo standard error of the standard deviation: that
// of the mean square deviation, over twice the standard deviation (delta
// method, common practice).
func mcseSD(d Draws, m moments) float64 {
	return MCSE(m.squares(d)) / (2 * math.Sqrt(m.variance))
}

// squares returns the squared distances of draws from their mean.
func (m moments) squares(d Draws) Draws {
	return d.Map(func(x float64) float64 { return (x - m.mean) * (x - m.mean) })
}
