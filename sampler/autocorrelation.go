package sampler

import (
	"math"
	"math/bits"

	"gonum.org/v1/gonum/dsp/fourier"
	"gonum.org/v1/gonum/floats"
)

// sokal is the c of the window: the sum over lags stops at the first lag
// M ≥ c·τ(M). c = 5 is common practice.
const sokal = 5

// AutocorrelationTime returns the integrated autocorrelation time
//
//	τ = 1 + 2 Σ ρ(l),  l = 1 … M,
//
// of one or more series of the same process, in steps of the series, with
// Sokal's self-consistent window M ≥ 5τ(M), at least 5 (Sokal 1997, in: Functional
// Integration, NATO ASI Ser. B 361, 131). The relative error is about
// √((4M+2)/n) for n values in all (ibid.; from memory).
//
// The autocovariances are taken about the common mean and averaged over the
// series, as Goodman & Weare (2010) do for ensemble means; series that disagree
// about the mean therefore look correlated, which they are.
//
// It returns NaN for fewer than 8 values per series, a constant, or values that
// are not finite, and +Inf if the series are too short for their correlation,
// so that no window fits.
func AutocorrelationTime(series ...[]float64) float64 {
	mean := 0.0
	for _, s := range series {
		mean += meanOf(s) / float64(len(series))
	}
	centred := cloneAll(series)
	for _, s := range centred {
		for t := range s {
			s[t] -= mean
		}
	}
	_, tau := correlation(centred)
	return tau
}

// autocovariance returns the autocovariance, about zero, at lags 0 ≤ l < n,
// averaged over series of length n, each sum divided by n.
//
// It goes through the power spectrum (Wiener–Khinchin), with the series padded
// by as many zeros so that its end does not meet its start.
func autocovariance(series [][]float64) []float64 {
	n := len(series[0])
	size := 1 << bits.Len(uint(2*n-1))
	transform := fourier.NewFFT(size)
	padded := make([]float64, size)
	power := make([]complex128, size/2+1)
	coefficients := make([]complex128, size/2+1)
	for _, s := range series {
		clear(padded[copy(padded, s):])
		transform.Coefficients(coefficients, padded)
		for i, c := range coefficients {
			power[i] += complex(real(c)*real(c)+imag(c)*imag(c), 0)
		}
	}
	covariance := transform.Sequence(padded, power)[:n]
	for l := range covariance {
		covariance[l] /= float64(size) * float64(n) * float64(len(series))
	}
	return covariance
}

// fewLags is how many lags are summed one by one before all of them are computed
// through the spectrum. Most windows close much earlier, and then this is several
// times faster.
const fewLags = 256

// lags is the autocovariance of some series as [autocovariance] has it.
type lags struct {
	series [][]float64
	all    []float64 // nil until a long one is asked for
}

func (c *lags) at(l int) float64 {
	if l >= fewLags && c.all == nil {
		c.all = autocovariance(c.series)
	}
	if c.all != nil {
		return c.all[l]
	}
	sum := 0.0
	for _, s := range c.series {
		sum += floats.Dot(s[l:], s[:len(s)-l])
	}
	return sum / float64(len(c.series)*len(c.series[0]))
}

// correlation returns the variance, about zero, and the autocorrelation time of
// some series of one length, by the sum of their mean autocovariance up to Sokal's
// window M. That it was taken about the mean of the n values themselves makes it too
// small by σ²τ/n at every lag and the sum by the fraction (2M+1)/n (Wolff 2004,
// Comput. Phys. Commun. 156, 143, §3; from memory), which is put back. NaN and
// infinities are those of [AutocorrelationTime].
func correlation(series [][]float64) (variance, tau float64) {
	if len(series) == 0 || len(series[0]) < 8 {
		return math.NaN(), math.NaN()
	}
	c := lags{series: series}
	variance = c.at(0)
	if !(variance > 0) || math.IsInf(variance, 1) {
		return variance, math.NaN()
	}
	steps := len(series[0])
	tau = 1
	for m := 1; m < steps; m++ {
		tau += 2 * c.at(m) / variance
		if float64(m) >= sokal*max(tau, 1) { // an alternating chain has τ < 1
			n := float64(steps * len(series))
			return variance, max(tau*(1+float64(2*m+1)/n), shortest(steps))
		}
	}
	return variance, math.Inf(1)
}

// shortest is the least autocorrelation time believed of n steps, 1/log₁₀ n:
// a chain that alternates looks better than independent draws, and by chance
// without limit (the bound is that of Vehtari et al. 2021, Bayesian Anal. 16,
// 667, on the effective sample size; from memory).
func shortest(n int) float64 { return 1 / math.Log10(float64(n)) }

func meanOf(x []float64) float64 {
	sum := 0.0
	for _, v := range x {
		sum += v
	}
	return sum / float64(len(x))
}
