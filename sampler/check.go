package sampler

import (
	"math"
	"slices"
)

// What a chain must show before Run calls it converged.
const (
	// rhatLimit is the criterion of Vehtari et al. (2021).
	rhatLimit = 1.01
	// trustTimes is how many autocorrelation times all ensembles together must
	// be long: then τ itself is known to about 30%, and an error to half that
	// (see AutocorrelationTime). 50 is common practice for one series; with 100
	// runs ended where τ came out low, and errors were a fifth too small.
	trustTimes = 200
)

// Check is the state of a run at one step: how far the chain has converged.
type Check struct {
	Step        int           // steps done
	BurnIn      int           // steps to discard from the start, chosen from the chain
	Sample      View          // the rest, thinned if that loses nothing: what to summarise
	Parameters  []Convergence // one per parameter, after burn-in
	Longest     float64       // autocorrelation time that the length is judged by, see [Assess]
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

// To how many steps a chain is thinned, at least, before it is judged and
// summarised (enoughRows: a chain that passes is some 25 autocorrelation times
// long or more, so that neighbouring rows still repeat each other), and before it
// is glanced at: all walkers at glanceRows steps, their means at meanRows.
const (
	enoughRows = 1024
	glanceRows = 48
	meanRows   = 256
)

// Assess measures the convergence of a chain, on at most s.Threads goroutines.
// It reads the record alone, so a restored chain is judged like the original.
func Assess(c *Chain, s Settings) Check {
	check := assess(c, s, max(enoughRows, c.rowsFor(4*s.Effective)))
	check.Converged = check.passes(s)
	return check
}

// glance is Assess at a fraction of its cost, for chains that are clearly too
// short. Only the error needs many steps, and it comes from the ensembles' means,
// which the chain keeps. The effective sample sizes are noisier and a little too
// small: with steps enough for three draws for every effective one, some 4% of the
// information is lost between them (an AR(1) series at its goal).
func glance(c *Chain, s Settings) Check {
	check := assess(c, s, glanceRows)
	from := max(0, check.BurnIn/c.spacing)
	stride := max(1, (c.kept-from)/max(meanRows, c.rowsFor(3*s.Effective)))
	for i := range check.Parameters {
		var m moments
		m.mean, m.variance, _ = meanVariance(check.Sample.Coordinate(i))
		m.judge(c.means(i, from, stride), stride*c.spacing)
		check.Parameters[i].ESS, check.Parameters[i].Tau = m.ess(), m.tau
	}
	return check
}

// nearly is the fraction of the goal from which on a glance is not enough.
const nearly = 0.75

// hopeless reports whether a glance has shown that the goal is not met.
func (c Check) hopeless(s Settings) bool { return s.Effective <= 0 || c.ESS() < nearly*s.Effective }

// rowsFor is how many rows of a chain hold a number of draws.
func (c *Chain) rowsFor(draws float64) int { return int(draws / float64(len(c.x)*c.walkers)) }

// assess measures the convergence of a chain thinned to a number of rows.
func assess(c *Chain, s Settings, rows int) Check {
	v := c.View()
	v = v.Thin(max(1, v.n/rows))
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
	longest := make([]float64, v.dim+1)
	each(v.dim+1, s.Threads, func(i int) {
		if i == v.dim {
			longest[i] = measure(v.LogDensity().after(drop)).tau
			return
		}
		d := all[i].after(drop)
		m := measure(d)
		check.Parameters[i] = Convergence{ESS: m.ess(), RHat: RHat(d), Tau: m.tau}
		longest[i] = math.Max(m.tau, measure(m.squares(d)).tau)
	})
	check.Longest = slices.Max(longest) // NaN if one is
	return check
}

// passes applies the tests of convergence; the caller's own comes last because
// it may cost more than all others.
func (c Check) passes(s Settings) bool {
	if s.Effective <= 0 {
		return false
	}
	length := float64(c.Sample.Ensembles() * c.Sample.Steps() * c.Sample.Spacing())
	if !(length >= trustTimes*c.Longest) {
		return false
	}
	for _, p := range c.Parameters {
		if !(p.ESS >= s.Effective && p.RHat < rhatLimit) {
			return false
		}
	}
	return s.Enough == nil || s.Enough(c.Sample)
}
