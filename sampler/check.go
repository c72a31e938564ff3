package sampler

import "math"

// What a chain must show before Run calls it converged.
const (
	// rhatLimit is the criterion of Vehtari et al. (2021).
	rhatLimit = 1.01
	// trustTimes is how many autocorrelation times all ensembles together must
	// be long: then τ itself is known to about 45%, and an error to half that
	// (see AutocorrelationTime). 50 is common practice for one series.
	trustTimes = 100
)

// Check is the state of a run at one step: how far the chain has converged.
type Check struct {
	Step        int           // steps done
	BurnIn      int           // steps to discard from the start, chosen from the chain
	Sample      View          // the rest, thinned if that loses nothing: what to summarise
	Parameters  []Convergence // one per parameter, after burn-in
	Acceptance  float64       // fraction of proposals accepted
	Evaluations int           // of the density, so far
	Converged   bool          // all tests passed, the caller's own included
}

// Convergence is what [Run] judges one parameter by.
type Convergence struct {
	ESS, RHat float64
	Tau       float64 // autocorrelation time in steps
}

// ESS returns the effective sample size of the slowest parameter, 0 if one is
// not known yet.
func (c Check) ESS() float64 {
	least := math.Inf(1)
	for _, p := range c.Parameters {
		if math.IsNaN(p.ESS) {
			return 0
		}
		least = min(least, p.ESS)
	}
	return least
}

// RHat returns the largest R-hat of the parameters, +Inf if one is not known
// yet.
func (c Check) RHat() float64 {
	worst := 1.0
	for _, p := range c.Parameters {
		if math.IsNaN(p.RHat) {
			return math.Inf(1)
		}
		worst = max(worst, p.RHat)
	}
	return worst
}

// enoughRows is to how many steps a chain is thinned before it is judged and
// summarised, at least. A chain that passes is some 25 autocorrelation times
// long or more, so that neighbouring rows still repeat each other.
const enoughRows = 1024

// Assess measures the convergence of a chain, on at most s.Threads goroutines.
// It reads the record alone, so a restored chain is judged like the original.
func Assess(c *Chain, s Settings) Check {
	v := c.View()
	v = v.Thin(max(1, v.n/v.rowsFor(s.Effective)))
	all := make([]Draws, v.dim)
	each(v.dim, s.Threads, func(i int) { all[i] = v.Coordinate(i) })
	drop := burnIn(v.LogDensity(), all)
	check := Check{
		Step:        c.Steps(),
		BurnIn:      v.first + (drop-1)*v.spacing,
		Sample:      v.skip(drop),
		Parameters:  make([]Convergence, v.dim),
		Acceptance:  c.Acceptance(),
		Evaluations: c.Evaluations(),
	}
	each(v.dim, s.Threads, func(i int) {
		d := all[i].after(drop)
		m := measure(d)
		check.Parameters[i] = Convergence{ESS: m.ess(), RHat: RHat(d), Tau: m.tau}
	})
	check.Converged = check.passes(s)
	return check
}

// rowsFor is how many rows of a view hold some effective samples with room to
// spare: eight times as many draws.
func (v View) rowsFor(ess float64) int {
	return max(enoughRows, int(8*ess/float64(len(v.x)*v.walkers)))
}

// passes applies the tests of convergence; the caller's own comes last because
// it may cost more than all others.
func (c Check) passes(s Settings) bool {
	if s.Effective <= 0 {
		return false
	}
	length := float64(c.Sample.Ensembles() * c.Sample.Steps() * c.Sample.Spacing())
	for _, p := range c.Parameters {
		if !(p.ESS >= s.Effective && p.RHat < rhatLimit && length >= trustTimes*p.Tau) {
			return false
		}
	}
	return s.Enough == nil || s.Enough(c.Sample)
}
