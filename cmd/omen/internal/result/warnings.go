package result

import (
	"fmt"
	"math"

	"omen/cmd/omen/internal/runfile"
	"omen/likelihood"
	"omen/sampler"
)

// warnings lists the soft problems of a result, each with the number behind it
// and what to do about it.
func warnings(r Run, s *Summary, view sampler.View) []string {
	var out []string
	add := func(format string, args ...any) { out = append(out, fmt.Sprintf(format, args...)) }
	if why := r.Ended(); why != "" {
		add("unfinished: %s after %d steps, before the goal was met; omen resume goes on", why, r.Chain.Steps())
	}
	check := r.Outcome.Check
	if rhat := check.RHat(); !(rhat < 1.01) {
		add("R-hat is %.3f, above 1.01: the ensembles disagree; run longer, or look for a second peak", rhat)
	}
	if goal := float64(r.Job.Run.Sampling.EffectiveSamples); check.ESS() < goal {
		add("effective samples %.0f, below the goal of %.0f: intervals are uncertain; run longer", math.Floor(check.ESS()), goal)
	}
	out = append(out, priorWarnings(r, s, view)...)
	return append(out, fitWarnings(s.Fit)...)
}

func priorWarnings(r Run, s *Summary, view sampler.View) []string {
	var out []string
	for i, free := range r.Job.Space.Free() {
		q := s.Parameters[i]
		switch {
		case !q.Constrained:
			out = append(out, fmt.Sprintf("%s is not constrained by these data: its 68%% interval is as wide as the prior's; quote no value for it", q.Name))
			continue
		case free.Prior.Informative() && float64(q.SD) > asWide*free.Prior.SD():
			out = append(out, fmt.Sprintf("%s is decided by its prior: sd %.3g, prior %.3g; the data add little", q.Name, float64(q.SD), free.Prior.SD()))
			continue
		}
		out = append(out, edgeWarnings(free.Prior, q, view.Coordinate(i))...)
	}
	return out
}

// edgeDensity is the density at a prior's edge, relative to the peak of a
// Gaussian of the same width, above which the edge is said to cut the interval:
// that of a Gaussian 2.1 standard deviations from its peak.
const edgeDensity = 0.1

// edgeWarnings looks at the density of draws next to each end of a prior's range.
func edgeWarnings(p likelihood.Prior, q Quantity, d sampler.Draws) []string {
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
	var out []string
	for _, end := range []struct {
		count, edge float64
		name        string
	}{{below, lo, "lower"}, {above, hi, "upper"}} {
		if end.count > edgeDensity*peak {
			out = append(out, fmt.Sprintf("%s runs into the %s end of its prior, %g (density there %.0f%% of a Gaussian's peak): widen the prior, or call the result a limit",
				q.Name, end.name, end.edge, 100*end.count/peak))
		}
	}
	return out
}

func fitWarnings(f Fit) []string {
	switch p := float64(f.Probability); {
	case f.DoF <= 0:
		return []string{fmt.Sprintf("%d degrees of freedom: there are no more data than parameters, and chi-squared tests nothing", f.DoF)}
	case p < 0.001:
		return []string{fmt.Sprintf("chi-squared %.1f for %d degrees of freedom is improbably high (%.1g): errors too small, an outlier, or a model that cannot fit; see omen inspect", float64(f.Chi2), f.DoF, p)}
	case p > 0.999:
		return []string{fmt.Sprintf("chi-squared %.1f for %d degrees of freedom is improbably low (%.1g): the errors look too large", float64(f.Chi2), f.DoF, 1-p)}
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
