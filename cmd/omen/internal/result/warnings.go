package result

import (
	"fmt"
	"math"
	"sort"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/runfile"
	"omen/likelihood"
	"omen/sampler"
	"omen/sampler/quadrature"
)

// warnings lists the soft problems of a result, each with the number behind it
// and what to do about it.
func warnings(r Run, s *Summary, view sampler.View) []string {
	var out []string
	add := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	if why := r.Ended(); why != "" {
		add("unfinished: %s after %s, before the goal was met; omen resume goes on", why, digits.Count(r.Chain.Steps(), "step"))
	}
	if r.Chain != nil {
		out = append(out, chainWarnings(r)...)
	}
	out = append(out, condensedWarnings(r.Job)...)
	out = append(out, exactWarnings(r, s)...)
	out = append(out, priorWarnings(r, s, view)...)
	return append(out, fitWarnings(s.Fit)...)
}

func chainWarnings(r Run) []string {
	var out []string
	add := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	check := r.Outcome.Check
	if rhat := check.RHat(); !(rhat < 1.01) {
		add("R-hat is %.3f, above 1.01: the ensembles disagree; run longer, or look for a second peak", rhat)
	}
	switch unknown := check.ESS() == 0 || check.Times == 0; {
	case unknown && check.Sample.Steps()*check.Sample.Spacing() < longEnough:
		add("the chain is too short for its autocorrelation to be known: intervals and errors are uncertain; run longer")
		return out
	case unknown:
		add("the ensembles have not seen the same posterior, so that no error can be told: %s; most likely there is a second region that walkers seldom reach or leave, which more steps do not mend: look at the figure of convergence, narrow a prior, or take the integral's numbers if there is one", blame(r))
		return out
	}
	switch goal := float64(r.Job.Run.Sampling.EffectiveSamples); {
	case math.IsNaN(check.ESS()):
		add("the effective samples cannot be told from so short a chain: intervals are uncertain; run longer")
	case check.ESS() < goal:
		add("effective samples %.0f, below the goal of %.0f: intervals are uncertain; run longer", math.Floor(check.ESS()), goal)
	}
	if !(check.Times >= sampler.Trust) {
		add("the chain is %.0f autocorrelation times long, below %d: Monte Carlo errors may be too small; run longer", math.Floor(check.Times), sampler.Trust)
	}
	return out
}

// condensedWarnings are about tables that stand for others: few numbers hold what a
// family with few parameters takes from many rows, and no more.
func condensedWarnings(j *job.Job) []string {
	var out []string
	for _, t := range j.Tables {
		if t.Spec.StandsFor != nil && j.Space.Family().DarkEnergy != likelihood.Constant {
			out = append(out, fmt.Sprintf("%s stands for %d rows: with w free that is good only if it was condensed for it; use the whole table", t.Name, t.Spec.StandsFor.Rows))
		}
	}
	return out
}

// longEnough is the number of steps from which on a chain whose autocorrelation is
// still not known is more likely to be stuck than short.
const longEnough = 5000

// blame names the parameters of which no effective samples are known.
func blame(r Run) string {
	var names []string
	for i, p := range r.Outcome.Check.Parameters {
		if p.ESS == 0 {
			names = append(names, r.Job.Space.Free()[i].Name)
		}
	}
	if names == nil {
		return "walkers stay where they are for the whole run"
	}
	return "see " + strings.Join(names, ", ")
}

// tooManySigmas is how many of its standard errors a statistic of the chain may differ
// from the integral. There are dozens of them, and their errors are themselves
// estimates.
const tooManySigmas = 5

// exactWarnings compares chain and integral, and hands on what went wrong beside the
// chain.
func exactWarnings(r Run, s *Summary) []string {
	var out []string
	if d := s.Engine.Largest; d != nil && d.Sigmas > tooManySigmas && d.Widths > 0.01 {
		out = append(out, fmt.Sprintf("chain and quadrature disagree: %s by %.1f of its Monte Carlo errors (the largest difference is %.2g widths, in %s, %s); run longer, or look for a second peak",
			d.Of, float64(d.Sigmas), float64(d.Widths), d.Quantity, d.Statistic))
	}
	for _, why := range []string{r.givenUp, r.notCompared} {
		if why != "" {
			out = append(out, why)
		}
	}
	if r.Exact != nil {
		if by := r.Exact.Unresolved(); by > 0 {
			out = append(out, fmt.Sprintf("quadrature: probabilities are only known to ±%.1g; sample with a chain as well (engine = \"both\")", by))
		}
		for _, w := range r.Exact.Warnings {
			out = append(out, "quadrature: "+w)
		}
	}
	if r.Nested == nil && r.Job.Run.Fates.Nested && r.Ended() != "" {
		out = append(out, "the nested universes were not compared, for the run was interrupted; omen resume does it")
	}
	if r.Nested != nil {
		for _, m := range r.Nested.Models {
			for _, w := range m.Warnings {
				if !m.Own || r.Exact == nil {
					out = append(out, m.Words+": "+w)
				}
			}
		}
	}
	return out
}

func priorWarnings(r Run, s *Summary, view sampler.View) []string {
	var out []string
	for i, free := range r.Job.Space.Free() {
		q := s.Parameters[i]
		away := pull(free.Prior, q)
		switch {
		case away > contradiction:
			out = append(out, fmt.Sprintf("%s lies %.1f standard deviations from the mean of its normal prior: data and prior contradict each other, and what both together say means nothing", q.Name, away))
			continue
		case !q.Constrained:
			out = append(out, fmt.Sprintf("%s is not constrained by these data: its 68%% interval is as wide as the prior's; quote no value for it", q.Name))
			continue
		case free.Prior.Informative() && float64(q.SD) > asWide*free.Prior.SD():
			out = append(out, fmt.Sprintf("%s is decided by its prior: sd %.3g, prior %.3g; the data add little", q.Name, float64(q.SD), free.Prior.SD()))
			continue
		}
		var cut []string
		if r.Exact != nil {
			m := r.Exact.Marginal(i)
			cut = edgeWarnings(free.Prior, q, exactEdges(free.Prior, &m))
		} else {
			cut = edgeWarnings(free.Prior, q, drawnEdges(free.Prior, q, view.Coordinate(i)))
		}
		s.Parameters[i].CutByPrior = len(cut) > 0
		out = append(out, cut...)
	}
	return out
}

// contradiction is how many standard deviations of a normal prior the data may pull
// before they are said to contradict it.
const contradiction = 4

// pull is how many standard deviations of a normal prior the posterior lies from its
// mean; 0 of other priors.
func pull(p likelihood.Prior, q Quantity) float64 {
	if !p.Informative() {
		return 0
	}
	return math.Abs(float64(q.Mean)-p.Quantile(0.5)) / p.SD()
}

// edgeDensity is the density at a prior's edge, relative to the peak of a
// Gaussian of the same width, above which the edge is said to cut the interval:
// that of a Gaussian 2.1 standard deviations from its peak.
const edgeDensity = 0.1

// drawnEdges is the density of draws next to each end of a prior's range, relative to
// the peak of a Gaussian of the same width.
func drawnEdges(p likelihood.Prior, q Quantity, d sampler.Draws) [2]float64 {
	lo, hi := p.Range()
	sd := float64(q.SD)
	strip := sd / 4
	var below, above, n float64
	for _, x := range d.Values() {
		n++
		below += indicator(x-lo < strip)
		above += indicator(hi-x < strip)
	}
	peak := n * strip / (sd * math.Sqrt(2*math.Pi))
	return [2]float64{below / peak, above / peak}
}

// exactEdges is the same of an integrated marginal.
func exactEdges(p likelihood.Prior, m *quadrature.Marginal) [2]float64 {
	lo, hi := p.Range()
	strip := m.SD / 4
	expected := strip / (m.SD * math.Sqrt(2*math.Pi))
	return [2]float64{below(m, lo+strip) / expected, (1 - below(m, hi-strip)) / expected}
}

// below is the probability below x.
func below(m *quadrature.Marginal, x float64) float64 {
	i := sort.SearchFloat64s(m.X, x)
	switch {
	case i == 0:
		return 0
	case i == len(m.X):
		return 1
	}
	return m.CDF[i-1] + (m.CDF[i]-m.CDF[i-1])*(x-m.X[i-1])/(m.X[i]-m.X[i-1])
}

// edgeWarnings says where a prior's range cuts the posterior.
func edgeWarnings(p likelihood.Prior, q Quantity, density [2]float64) []string {
	lo, hi := p.Range()
	var out []string
	for i, end := range []struct {
		edge float64
		name string
	}{{lo, "lower"}, {hi, "upper"}} {
		if density[i] > edgeDensity {
			out = append(out, fmt.Sprintf("%s runs into the %s end of its prior, %g (its density there is %.0f%% of the peak of a Gaussian as wide): %s",
				q.Name, end.name, end.edge, 100*density[i], edgeAdvice(q.Name, end.edge)))
		}
	}
	return out
}

// edgeAdvice is what to do about a prior that ends at some value. Matter and the Hubble
// constant have none below zero.
func edgeAdvice(name string, edge float64) string {
	if edge == 0 && name != "OL" && name != "wa" {
		return "quote an upper limit"
	}
	return "widen the prior, or call the result a limit"
}

func fitWarnings(f Fit) []string {
	switch p := float64(f.Probability); {
	case f.DoF <= 0:
		return []string{digits.Count(f.DoF, "degree of freedom") + ": there are no more data than parameters, and chi-squared tests nothing"}
	case p < 0.001:
		return []string{fmt.Sprintf("chi-squared %.1f for %s is improbably high (%.1g): errors too small, an outlier, or a model that cannot fit; see omen inspect", float64(f.Chi2), digits.Count(f.DoF, "degree of freedom"), p)}
	case p > 0.999:
		return []string{fmt.Sprintf("chi-squared %.1f for %s is improbably low (%.1g): the errors look too large", float64(f.Chi2), digits.Count(f.DoF, "degree of freedom"), 1-p)}
	}
	return nil
}

// offsetWords says how the magnitudes' zero point was treated.
func offsetWords(name string, run *runfile.Run, i int) string {
	o, _ := run.Offset(i)
	switch o.Kind {
	case likelihood.AbsoluteOffset:
		return name + ": distances are taken as absolute"
	case likelihood.NormalOffset:
		return fmt.Sprintf("%s: M is normal, %g ± %g mag, and marginalised", name, o.Mean, o.SD)
	}
	return name + ": the common offset (M and H0) is free and marginalised"
}
