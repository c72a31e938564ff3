package gather

import (
	"fmt"
	"math"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/figure"
	"omen/sampler"
)

// How often convergence is looked at over the course of the run, and of how many
// draws.
const (
	looks     = 12
	lookDraws = 40000
)

// rhatGoal is the criterion of Vehtari et al. (2021, Bayesian Anal. 16, 667).
const rhatGoal = 1.01

// mostTraces is how many parameters can be followed on one figure.
const mostTraces = 6

// convergence is how the chain came to its result.
func (r *Run) convergence() (*Picture, error) {
	if r.Chain == nil {
		return absent("the posterior was integrated, without a chain"), nil
	}
	v := r.Chain.View()
	if v.Steps() < 2 {
		return absent("the chain has a single step"), nil
	}
	check := r.Outcome.Check
	in := figure.Convergence{Every: float64(v.Spacing()), BurnIn: float64(check.BurnIn), RhatGoal: rhatGoal,
		ESSGoal: float64(r.Job.Run.Sampling.EffectiveSamples), Unfinished: r.Unfinished()}
	for i, p := range r.Job.Space.Free()[:min(mostTraces, v.Dim())] {
		symbol, _ := Symbol(p.Name)
		t := figure.Trace{Symbol: symbol, Ensembles: means(v, i), Time: check.Parameters[i].Tau / float64(v.Spacing())}
		t.Autocorrelation = autocorrelation(t.Ensembles, (check.BurnIn-v.Number(0))/v.Spacing()+1, t.Time)
		in.Traces = append(in.Traces, t)
	}
	in.Checks = r.checks()
	m := r.Summary.Sampling
	caption := "Above, the mean of the walkers of each independent ensemble at every recorded step; shaded steps are discarded as burn-in. " +
		"Below, the autocorrelation of these means, and over the steps the largest R-hat and the smallest number of effective samples of all parameters, with their goals."
	alt := fmt.Sprintf("Traces of %d ensembles over %s, the first %d burn-in. Effective samples %.0f at least, goal %d; R-hat %.4f at most.",
		m.Ensembles, digits.Count(m.Steps, "step"), m.BurnIn, math.Floor(float64(m.MinESS)), m.Goal, float64(m.MaxRHat))
	return &Picture{Caption: caption, Alt: alt, Wide: true, draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawConvergence(in, w) }}, nil
}

// means are the means over the walkers of each ensemble at every step.
func means(v sampler.View, i int) [][]float64 {
	all := v.Coordinate(i).Values()
	steps, walkers := v.Steps(), v.Walkers()
	out := make([][]float64, v.Ensembles())
	for e := range out {
		out[e] = make([]float64, steps)
		for s := range out[e] {
			at := (e*steps + s) * walkers
			sum := 0.0
			for _, x := range all[at : at+walkers] {
				sum += x
			}
			out[e][s] = sum / float64(walkers)
		}
	}
	return out
}

// autocorrelation is that of the means after the first skip steps, about their
// common mean, to some times their autocorrelation time.
func autocorrelation(ensembles [][]float64, skip int, tau float64) []float64 {
	var parts [][]float64
	mean, n := 0.0, 0
	for _, e := range ensembles {
		part := e[min(max(skip, 0), len(e)):]
		parts = append(parts, part)
		for _, x := range part {
			mean += x
		}
		n += len(part)
	}
	if n == 0 || math.IsNaN(tau) || math.IsInf(tau, 0) {
		return nil
	}
	mean /= float64(n)
	lags := min(int(12*tau)+8, len(parts[0]))
	out := make([]float64, lags)
	for lag := range out {
		for _, p := range parts {
			for i := lag; i < len(p); i++ {
				out[lag] += (p[i] - mean) * (p[i-lag] - mean)
			}
		}
		out[lag] /= float64(n - lag*len(parts))
	}
	for lag := len(out) - 1; lag >= 0; lag-- {
		out[lag] /= out[0]
	}
	return out
}

// checks are R-hat and effective samples after growing parts of the run, each
// without the burn-in that the whole shows.
func (r *Run) checks() []figure.Check {
	v := r.Chain.View().After(r.Outcome.Check.BurnIn)
	steps, walkers := v.Steps(), v.Walkers()
	all := make([][]float64, v.Dim())
	for i := range all {
		all[i] = v.Coordinate(i).Values()
	}
	var out []figure.Check
	for k := 1; k <= looks; k++ {
		n := steps * k / looks
		if n < 8 {
			continue
		}
		thin := max(1, n*walkers*v.Ensembles()/lookDraws)
		c := figure.Check{Step: float64(v.Number(n - 1)), Rhat: 1, ESS: math.Inf(1)}
		for i := range all {
			d := beginning(all[i], v.Ensembles(), steps, walkers, n, thin)
			c.Rhat = max(c.Rhat, sampler.RHat(d))
			c.ESS = min(c.ESS, sampler.ESS(d))
		}
		if k == looks { // as the run's own check has it, which looks at more draws
			c.Rhat, c.ESS = r.Outcome.Check.RHat(), r.Outcome.Check.ESS()
		}
		if c.ESS > 0 && !math.IsInf(c.ESS, 0) && c.Rhat >= 1 && !math.IsInf(c.Rhat, 0) { // what a short part cannot tell is left out
			out = append(out, c)
		}
	}
	return out
}

// beginning is the first n steps of draws, every thin-th of them.
func beginning(all []float64, ensembles, steps, walkers, n, thin int) sampler.Draws {
	parts := make([][]float64, ensembles)
	for e := range parts {
		for s := n - 1 - (n-1)/thin*thin; s < n; s += thin {
			at := (e*steps + s) * walkers
			parts[e] = append(parts[e], all[at:at+walkers]...)
		}
	}
	return sampler.NewDraws(walkers, parts...)
}
