package sampler

import "math"

// What a chain must show before Run calls it converged.
const (
	// rhatLimit is the criterion of Vehtari et al. (2021).
	rhatLimit = 1.01

	// Trust is how many times longer than the longest autocorrelation time τ all
	// ensembles together must be. Then τ is known to 22% and an error to 11% (see
	// [AutocorrelationTime]). With 100, runs ended where τ came out low: deviations
	// from exact results were up to 1.2 reported errors in round posteriors and 2.7
	// on the curved ridge of w0 and wa; with 400 they are 1.0 to 1.1 and 1.0 to
	// 1.3. 50 is common practice for one series.
	Trust = 400
	// squaresTrust is the same for the squared distances from the mean, on which
	// the errors of standard deviations rest: τ to 45%, and of rare visits to a
	// tail dozens. In a heavy tail their τ is many times longer, and more than this
	// would cost more than it gains.
	squaresTrust = 100
)

// Check is the state of a run at one step: how far the chain has converged.
type Check struct {
	Step        int           // steps done
	BurnIn      int           // steps to discard from the start, chosen from the chain
	Sample      View          // the rest, thinned if that loses nothing: what to summarise
	Parameters  []Convergence // one per parameter, after burn-in
	Times       float64       // length of Sample, all ensembles together, in autocorrelation times: see [Trust]
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

// Progress returns how much is there, 0 to 1, of the effective samples that are
// asked for and of the length that it takes to trust them.
func (c Check) Progress(goal float64) float64 {
	if math.IsNaN(c.Times) {
		return 0
	}
	return min(c.ESS()/goal, c.Times/Trust, 1)
}

// To how many steps a chain is thinned, at least, before it is judged and
// summarised (enoughRows: each ensemble of a chain that passes is some 100
// autocorrelation times long or more, ten rows to each), and before it
// is glanced at: all walkers at glanceRows steps, their means at meanRows.
const (
	enoughRows = 1024
	glanceRows = 48
	meanRows   = 1024
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
	slowest := 0.0
	fine := c.View().skip(min(from, c.kept)).Thin(max(1, (c.kept-from)/meanRows))
	for i := range check.Parameters {
		var m moments
		m.mean, m.variance, _ = meanVariance(check.Sample.Coordinate(i))
		m.judge(c.means(i, from, stride), stride*c.spacing)
		check.Parameters[i].ESS, check.Parameters[i].Tau = m.ess(), m.tau
		slowest = longest(slowest, m.tau, walkersTime(fine.coordinate(i, min(glanceWalkers, fine.walkers))))
	}
	check.Times = check.Sample.length() / slowest
	return check
}

// nearly is the fraction of the goal from which on a glance is not enough.
const nearly = 0.75

// hopeless reports whether a glance has shown that the goal is not met.
func (c Check) hopeless(s Settings) bool {
	return s.Effective <= 0 || c.Progress(s.Effective) < nearly
}

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
	taus := make([]float64, v.dim+1)
	each(v.dim+1, s.Threads, func(i int) {
		if i == v.dim {
			taus[i] = measure(v.LogDensity().after(drop)).tau
			return
		}
		d := all[i].after(drop)
		m := measure(d)
		check.Parameters[i] = Convergence{ESS: m.ess(), RHat: RHat(d), Tau: m.tau}
		squares := m.squares(d)
		taus[i] = longest(m.tau, walkersTime(d),
			squaresTrust*measure(squares).tau/Trust, squaresTrust*walkersTime(squares)/Trust)
	})
	check.Times = check.Sample.length() / longest(taus...)
	return check
}

// How many walkers of each ensemble are followed one by one, and how many by a
// glance.
const (
	fewWalkers    = 8
	glanceWalkers = 2
)

// walkersTime is the autocorrelation time of draws as the first few walkers of each
// ensemble show it, in steps of the run. It leaves out how walkers depend on each
// other, so errors cannot rest on it, but from so many series it is known so well
// that a run cannot end where the time of the ensembles' means happens to come out
// low.
func walkersTime(d Draws) float64 {
	var series [][]float64
	for _, x := range d.x {
		for k := range min(fewWalkers, d.walkers) {
			one := make([]float64, d.steps())
			for t := range one {
				one[t] = x[t*d.walkers+k]
			}
			series = append(series, one)
		}
	}
	return AutocorrelationTime(series...) * float64(d.spacing)
}

// longest is the longest of autocorrelation times, those left out that are NaN, as
// that of a density which is the same everywhere is.
func longest(taus ...float64) float64 {
	most := 0.0
	for _, tau := range taus {
		if tau > most {
			most = tau
		}
	}
	return most
}

// passes applies the tests of convergence; the caller's own comes last because
// it may cost more than all others.
func (c Check) passes(s Settings) bool {
	if s.Effective <= 0 {
		return false
	}
	if !(c.Times >= Trust) {
		return false
	}
	for _, p := range c.Parameters {
		if !(p.ESS >= s.Effective && p.RHat < rhatLimit) {
			return false
		}
	}
	return s.Enough == nil || s.Enough(c.Sample)
}
