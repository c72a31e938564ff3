package sampler

import "math"

// Summary is what draws say about one quantity, all in its own unit except ESS,
// RHat (numbers) and Tau (steps). The intervals hold exactly 68% and 95% of the
// probability. What the draws cannot tell is NaN.
type Summary struct {
	Mean, SD, Median float64
	Interval68       [2]float64 // central: 16% on either side
	Interval95       [2]float64 // central: 2.5% on either side
	HDI68            [2]float64 // the shortest that holds 68%

	MCSE       float64 // Monte Carlo standard error of the mean
	MCSESD     float64 // of the standard deviation
	MCSEMedian float64 // of the median
	MCSE68     [2]float64
	MCSE95     [2]float64

	ESS  float64 // effective sample size of the mean
	RHat float64 // see [RHat]
	Tau  float64 // integrated autocorrelation time of the ensemble means, steps of the run
}

// Summarize reduces draws to a summary.
func Summarize(d Draws) Summary {
	m := measure(d)
	o := sorted(d)
	s := Summary{
		Mean:       m.mean,
		SD:         math.Sqrt(m.variance),
		Median:     o.quantile(0.5),
		Interval68: o.central(0.68),
		Interval95: o.central(0.95),
		HDI68:      o.densest(0.68),
		MCSE:       m.mcse,
		MCSESD:     mcseSD(d, m),
		MCSEMedian: o.mcse(d, 0.5),
		MCSE68:     [2]float64{o.mcse(d, 0.16), o.mcse(d, 0.84)},
		MCSE95:     [2]float64{o.mcse(d, 0.025), o.mcse(d, 0.975)},
		ESS:        m.ess(),
		RHat:       RHat(d),
		Tau:        m.tau,
	}
	return s
}

// SummarizeAll summarises several quantities, on at most threads goroutines (0:
// one per processor).
func SummarizeAll(all []Draws, threads int) []Summary {
	summaries := make([]Summary, len(all))
	each(len(all), threads, func(i int) { summaries[i] = Summarize(all[i]) })
	return summaries
}

// Correlation returns the correlation coefficient of two quantities along the
// same view, −1 to 1; NaN if one is constant. It panics if their shapes differ.
func Correlation(a, b Draws) float64 {
	if a.Len() != b.Len() || len(a.x) != len(b.x) {
		panic("sampler: Correlation of draws of different shapes")
	}
	meanA, varA, weight := meanVariance(a)
	meanB, varB, _ := meanVariance(b)
	sum := 0.0
	for m := range a.x {
		for i := range a.x[m] {
			w := 1.0
			if a.w != nil {
				w = a.w[m][i]
			}
			if w > 0 {
				sum += w * (a.x[m][i] - meanA) * (b.x[m][i] - meanB)
			}
		}
	}
	return sum / (weight * float64(a.Len())) / math.Sqrt(varA*varB)
}
