package likelihood

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// priorKind tells the shapes of priors apart.
type priorKind uint8

const (
	flatPrior priorKind = iota
	normalPrior
	logFlatPrior
)

// Prior is a normalised one-dimensional prior density on a finite range. The zero
// Prior is not usable; see [Flat], [Normal], [Truncated] and [LogFlat].
type Prior struct {
	kind     priorKind
	lo, hi   float64
	mean, sd float64
	logNorm  float64 // added to the shape so that the density integrates to one
	within   string  // the cut of a truncated prior, for String
}

// normalReach is where normal priors end, in standard deviations: 1e-15 lies beyond.
// Data that want more contradict the prior, and that shows at its end.
const normalReach = 8

// Flat is uniform on [lo, hi].
func Flat(lo, hi float64) (Prior, error) {
	if err := checkRange(lo, hi); err != nil {
		return Prior{}, err
	}
	return Prior{kind: flatPrior, lo: lo, hi: hi, logNorm: -math.Log(hi - lo)}, nil
}

// LogFlat is uniform in ln x on [lo, hi], lo > 0.
func LogFlat(lo, hi float64) (Prior, error) {
	if err := checkRange(lo, hi); err != nil {
		return Prior{}, err
	}
	if lo <= 0 {
		return Prior{}, fmt.Errorf("a log-flat prior needs a positive lower end, found %g", lo)
	}
	return Prior{kind: logFlatPrior, lo: lo, hi: hi, logNorm: -math.Log(math.Log(hi / lo))}, nil
}

// Normal is Gaussian with the given mean and standard deviation, out to eight of
// these on either side.
func Normal(mean, sd float64) (Prior, error) {
	return Truncated(mean, sd, math.Inf(-1), math.Inf(1))
}

// Truncated is a Gaussian cut to [lo, hi] and renormalised there. It is an error
// if the cut leaves less than 1e-12 of the Gaussian: such a prior was not meant.
func Truncated(mean, sd, lo, hi float64) (Prior, error) {
	if !(sd > 0) || math.IsInf(sd, 0) || math.IsNaN(mean) || math.IsInf(mean, 0) {
		return Prior{}, fmt.Errorf("a normal prior needs a finite mean and a positive standard deviation, found [%g, %g]", mean, sd)
	}
	if math.IsNaN(lo) || math.IsNaN(hi) || !(lo < hi) {
		return Prior{}, fmt.Errorf("a prior needs its lower end below its upper end, found [%g, %g]", lo, hi)
	}
	within := ""
	if !math.IsInf(lo, -1) || !math.IsInf(hi, 1) {
		within = fmt.Sprintf(", within [%g, %g]", lo, hi)
	}
	g := distuv.Normal{Mu: mean, Sigma: sd}
	mass := g.CDF(hi) - g.CDF(lo)
	if lo > mean { // the other tail keeps its digits
		mass = g.Survival(lo) - g.Survival(hi)
	}
	if mass < 1e-12 {
		return Prior{}, fmt.Errorf("the range [%g, %g] lies %.1f standard deviations from the mean of the normal prior [%g, %g]", lo, hi, gap(mean, lo, hi)/sd, mean, sd)
	}
	lo, hi = math.Max(lo, mean-normalReach*sd), math.Min(hi, mean+normalReach*sd)
	norm := -math.Log(sd*math.Sqrt(2*math.Pi)) - math.Log(mass)
	return Prior{kind: normalPrior, lo: lo, hi: hi, mean: mean, sd: sd, logNorm: norm, within: within}, nil
}

func gap(x, lo, hi float64) float64 { return math.Max(lo-x, x-hi) }

func checkRange(lo, hi float64) error {
	if math.IsNaN(lo) || math.IsNaN(hi) || math.IsInf(lo, 0) || math.IsInf(hi, 0) {
		return fmt.Errorf("a prior needs finite ends, found [%g, %g]", lo, hi)
	}
	if lo == hi {
		return fmt.Errorf("a prior on [%g, %g] is empty; write the number alone to hold the parameter fixed", lo, hi)
	}
	if lo > hi {
		return fmt.Errorf("a prior needs its lower end below its upper end, found [%g, %g]", lo, hi)
	}
	return nil
}

// LogDensity is the natural logarithm of the normalised density at x, -Inf
// outside the range and for NaN.
func (p *Prior) LogDensity(x float64) float64 {
	if !(x >= p.lo && x <= p.hi) {
		return math.Inf(-1)
	}
	switch p.kind {
	case flatPrior:
		return p.logNorm
	case logFlatPrior:
		return p.logNorm - math.Log(x)
	default:
		u := (x - p.mean) / p.sd
		return p.logNorm - 0.5*u*u
	}
}

// Range is the support of the prior.
func (p *Prior) Range() (lo, hi float64) { return p.lo, p.hi }

// Quantile is the inverse of the cumulative distribution, for probabilities in
// [0, 1]; NaN outside.
func (p *Prior) Quantile(q float64) float64 {
	if !(q >= 0 && q <= 1) {
		return math.NaN()
	}
	switch p.kind {
	case flatPrior:
		return p.lo + q*(p.hi-p.lo)
	case logFlatPrior:
		return p.lo * math.Pow(p.hi/p.lo, q)
	}
	g := distuv.Normal{Mu: p.mean, Sigma: p.sd}
	a, b := g.CDF(p.lo), g.CDF(p.hi)
	return math.Min(math.Max(g.Quantile(a+q*(b-a)), p.lo), p.hi)
}

// Informative reports whether the prior has a shape of its own (a normal prior),
// as opposed to a range inside which it leaves the answer to the data.
func (p *Prior) Informative() bool { return p.kind == normalPrior }

// String writes the prior in words, such as "flat on [0, 1.5]".
func (p *Prior) String() string {
	switch p.kind {
	case flatPrior:
		return fmt.Sprintf("flat on [%g, %g]", p.lo, p.hi)
	case logFlatPrior:
		return fmt.Sprintf("flat in the logarithm on [%g, %g]", p.lo, p.hi)
	}
	return fmt.Sprintf("normal, %g ± %g", p.mean, p.sd) + p.within
}

// SD is the standard deviation of the prior. That of a truncated normal prior is
// the width of the Gaussian it was cut from.
func (p *Prior) SD() float64 {
	switch p.kind {
	case flatPrior:
		return (p.hi - p.lo) / math.Sqrt(12)
	case logFlatPrior:
		l := math.Log(p.hi / p.lo)
		mean := (p.hi - p.lo) / l
		return math.Sqrt((p.hi*p.hi-p.lo*p.lo)/(2*l) - mean*mean)
	}
	return p.sd
}
