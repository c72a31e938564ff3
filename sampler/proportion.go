package sampler

import (
	"math"

	"gonum.org/v1/gonum/mathext"
)

// Share is the probability of something that each draw either has or has not.
type Share struct {
	P     float64 // the fraction of the draws
	Error float64 // its Monte Carlo standard error; NaN if no draw, or every draw, has it
	ESS   float64 // effective sample size

	// One-sided 95% limits from the ESS alone. They say what a fraction of 0 or
	// 1 means: not seen in ESS draws is below 3/ESS, not impossible.
	Lower95, Upper95 float64
}

// Proportion returns the probability of an indicator: draws of 0 and 1.
//
// An indicator that never changes has no effective sample size of its own; it
// gets ess, for which the smallest effective sample size of the parameters is
// a fair choice. Then the limit is 3/ess, the "rule of three": (1−p)ⁿ = 0.05
// (Hanley & Lippman-Hand 1983, JAMA 249, 1743). Otherwise the limits are those
// of Clopper & Pearson (1934, Biometrika 26, 404) for P·ESS successes in ESS
// trials, which become the rule of three as P goes to 0. A draw that is neither
// 0 nor 1 is a misuse and panics.
func Proportion(d Draws, ess float64) Share {
	d.each(func(x, _ float64) {
		if x != 0 && x != 1 {
			panic("sampler: Proportion of draws that are neither 0 nor 1")
		}
	})
	m := measure(d)
	s := Share{P: m.mean, Error: m.mcse, ESS: m.ess()}
	switch s.P {
	case 0:
		s.Error, s.ESS, s.Upper95 = math.NaN(), ess, min(3/ess, 1)
	case 1:
		s.Error, s.ESS, s.Lower95, s.Upper95 = math.NaN(), ess, max(1-3/ess, 0), 1
	default:
		yes, no := s.P*s.ESS, (1-s.P)*s.ESS
		s.Lower95, s.Upper95 = betaQuantile(yes, no+1, 0.05), betaQuantile(yes+1, no, 0.95)
	}
	return s
}

// betaQuantile returns NaN where the distribution is undefined, which is where
// the effective sample size is 0 or unknown.
func betaQuantile(a, b, p float64) float64 {
	if !(a > 0 && b > 0) || math.IsInf(a+b, 1) {
		return math.NaN()
	}
	return mathext.InvRegIncBeta(a, b, p)
}
