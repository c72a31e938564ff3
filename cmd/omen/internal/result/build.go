package result

import (
	"math"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/nested"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/sampler"

	"gonum.org/v1/gonum/stat/distuv"
)

// Run is what a summary is made from: a job, its chain and how the chain ended, and
// what was computed beside it.
type Run struct {
	Job     *job.Job
	Chain   *sampler.Chain // nil where the run asks for quadrature alone
	Outcome sampler.Outcome
	Best    []float64 // the point of highest posterior density
	Seconds float64
	Threads int // 0: one per processor; no result depends on it
	Version string

	OutOfTime bool // interrupted by the run's own limit of time

	Exact  *exact.Posterior   // the posterior integrated, if it was; see [Run.Investigate]
	Nested *nested.Comparison // the nested universes, if they were compared

	givenUp     string // why the chain is not accompanied by an integral, though it was asked for
	notCompared string // why the nested universes were not, though it was asked for
}

// Ended says in a word or two why a run is unfinished, nothing if it is not.
func (r Run) Ended() string {
	switch {
	case r.OutOfTime:
		return "time limit"
	case r.Chain == nil || r.Outcome.Stop == sampler.Converged:
		return ""
	}
	return r.Outcome.Stop.String()
}

// Build makes the summary of a run.
func Build(r Run) *Summary {
	s := &Summary{Schema: Schema, Title: r.Job.Run.Title, Version: r.Version, Complete: r.Ended() == ""}
	best := make(chan Fit, 1)
	go func() { best <- fit(r) }() // sums over all rows, for which a factor may have to be unpacked
	var view sampler.View
	var drawn *outlook.Drawn
	if r.Chain != nil {
		view = r.Chain.View().After(r.Outcome.Check.BurnIn)
		drawn = s.fromChain(r, view)
	}
	if r.Exact != nil {
		s.fromExact(r, drawn)
	}
	s.times(r, drawn)
	s.nested(r)
	s.Fit = <-best
	s.Assumptions = assumptions(r)
	for _, in := range r.Job.Inputs {
		s.Inputs = append(s.Inputs, InputFile(in))
	}
	s.Warnings = warnings(r, s, view)
	return s
}

// fromChain fills in what the chain says.
func (s *Summary) fromChain(r Run, view sampler.View) *outlook.Drawn {
	check := r.Outcome.Check
	s.Engine.Name = "chain"
	s.Parameters = parameters(r, view)
	d := derive(r.Job.Space, thinForDerived(view, check), r.Threads)
	for i, sum := range sampler.SummarizeAll(d.draws, r.Threads) {
		s.Derived = append(s.Derived, quantity(d.names[i], sum))
	}
	drawn := d.belief(check.ESS())
	s.Fates, s.FatesHeldW, s.Today = tables(drawn, d.family)
	s.Sampling = sampling(r, view)
	s.Sampling.DirectShare = directShare(r.Job.Posterior, d.view, r.Threads)
	return drawn
}

// parameters summarises the free parameters.
func parameters(r Run, view sampler.View) []Quantity {
	free := r.Job.Space.Free()
	draws := make([]sampler.Draws, len(free))
	for i := range free {
		draws[i] = view.Coordinate(i)
	}
	var out []Quantity
	for i, sum := range sampler.SummarizeAll(draws, r.Threads) {
		q := quantity(free[i].Name, sum)
		q.Constrained = constrained(free[i].Prior, q)
		out = append(out, q)
	}
	return out
}

// asWide is how wide, as a fraction of the prior's 68% interval, a marginal
// posterior must be to count as not constrained. A flat prior that the data
// narrow by a tenth has learnt next to nothing.
const asWide = 0.9

// constrained compares the posterior's central 68% interval with the prior's. A
// normal prior is knowledge of its own: what it alone decides is constrained.
func constrained(p likelihood.Prior, q Quantity) bool {
	if p.Informative() {
		return true
	}
	return float64(q.Interval68[1]-q.Interval68[0]) < asWide*(p.Quantile(0.84)-p.Quantile(0.16))
}

func pair(v [2]float64) [2]Number { return [2]Number{Number(v[0]), Number(v[1])} }

func quantity(name string, s sampler.Summary) Quantity {
	return Quantity{Name: name, Unit: likelihood.Unit(name), Mean: Number(s.Mean), SD: Number(s.SD), Median: Number(s.Median),
		Interval68: pair(s.Interval68), Interval95: pair(s.Interval95), HDI68: pair(s.HDI68),
		MCSE: Number(s.MCSE), MCSE68: pair(s.MCSE68), MCSE95: pair(s.MCSE95),
		ESS: Number(s.ESS), RHat: Number(s.RHat), Constrained: true, mcseSD: s.MCSESD, mcseMedian: s.MCSEMedian}
}

// fit evaluates the best point table by table.
func fit(r Run) Fit {
	p := r.Job.Posterior
	each := make([]float64, len(p.Terms()))
	p.Evaluator().TermChi2(r.Best, each)
	f := Fit{DoF: p.DegreesOfFreedom(), Rows: p.Rows(), Best: map[string]Number{}, Probability: Number(math.NaN())}
	sum := 0.0
	for i, t := range p.Terms() {
		sum += each[i]
		f.Tables = append(f.Tables, TableFit{r.Job.Tables[i].Name, r.Job.Tables[i].Spec.Kind, t.Rows(), Number(each[i])})
	}
	f.Chi2 = Number(sum)
	for i, free := range r.Job.Space.Free() {
		f.Best[free.Name] = Number(r.Best[i])
	}
	if f.DoF > 0 && sum >= 0 {
		f.Probability = Number(distuv.ChiSquared{K: float64(f.DoF)}.Survival(sum))
	}
	return f
}

// directDraws is how many draws directShare looks at, about.
const directDraws = 10_000

// directShare is the fraction of a view for which the condensed form of the
// supernovae was not good enough. It is found from the view and not counted along
// the way, so that it does not depend on interruptions.
func directShare(p *likelihood.Posterior, view sampler.View, threads int) Number {
	view = view.Thin(max(1, view.Steps()*view.Ensembles()*view.Walkers()/directDraws))
	before := p.DirectEvaluations()
	view.MapAll(1, threads, func() func(x, y []float64) {
		e := p.Evaluator()
		return func(x, y []float64) { y[0] = e.LogDensity(x) }
	})
	draws := view.Steps() * view.Ensembles() * view.Walkers()
	return Number(float64(p.DirectEvaluations()-before) / float64(max(draws, 1)))
}

func sampling(r Run, view sampler.View) Sampling {
	check := r.Outcome.Check
	return Sampling{Ensembles: view.Ensembles(), Walkers: view.Walkers(), Steps: r.Chain.Steps(), BurnIn: check.BurnIn,
		Acceptance: Number(check.Acceptance), Evaluations: check.Evaluations, Seconds: r.Seconds,
		Seed: r.Job.Run.Sampling.Seed, MinESS: Number(check.ESS()), MaxRHat: Number(check.RHat()),
		Goal: r.Job.Run.Sampling.EffectiveSamples}
}
