package gather

import (
	"math"

	"omen/cmd/omen/internal/density"
	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
	"omen/sampler"
)

// marginalDraws is how many draws the densities are made of.
const marginalDraws = 16000

// mostMarginals is how many parameters a page can show.
const mostMarginals = 6

// sameThing is the correlation beyond which a derived quantity is another name
// for one that is shown already.
const sameThing = 0.99

// marginals is all free parameters and the derived quantities that add to them.
func (r *Run) marginals() (*Picture, error) {
	columns, ess := r.draws(marginalDraws)
	in := figure.Marginals{ESS: ess, Unfinished: r.Unfinished()}
	var names []string
	var draws []sampler.Draws
	free := r.Job.Space.Free()
	for i, p := range free {
		names, draws = append(names, p.Name), append(draws, sampler.NewDraws(1, columns[i]))
	}
	left := max(0, len(free)-mostMarginals)
	for i := range min(len(free), mostMarginals) {
		in.Parameters = append(in.Parameters, parameter(names[i], draws[i]))
		p := &in.Parameters[i]
		p.Edges, p.Best = edges(free[i].Prior), r.Best[i]
		p.PriorX, p.PriorP = priorCurve(free[i].Prior, r.Summary.Parameters[i])
		if r.Chain == nil {
			m := r.Exact.Marginal(i)
			c, err := density.NewCurve(m.X, m.Density)
			if err != nil {
				return nil, err
			}
			p.Density = c
		}
	}
	derived, values := r.derived()
	for i, name := range derived {
		if len(in.Parameters) < mostMarginals && worthShowing(values[i], draws) {
			draws, names = append(draws, values[i]), append(names, name)
			in.Parameters = append(in.Parameters, parameter(name, values[i]))
		}
	}
	caption := "Marginal posterior densities: on the diagonal of each quantity, below it of each pair. Shaded: the intervals and regions of highest density that hold 68% and 95%; " +
		"the intervals in the tables are central. Grey with a dotted line: the prior. Triangles and crosses: the best fit."
	if left > 0 {
		caption += " " + digits.Count(left, "parameter") + " more would not fit."
	}
	return &Picture{Caption: caption, Alt: "Marginal posteriors with intervals and regions of highest density: " + r.Values(names...) + ".", Wide: len(in.Parameters) > 3,
		draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawMarginals(in, w) }}, nil
}

// derived is the derived quantities of the draws; of an integral they are tabled
// but not drawn.
func (r *Run) derived() ([]string, []sampler.Draws) {
	if r.Chain == nil {
		return nil, nil
	}
	names, values := result.DerivedDraws(r.Job.Space, r.sample(marginalDraws), r.Threads)
	for i, d := range values {
		values[i] = sampler.NewDraws(1, d.Values())
	}
	return names, values
}

func parameter(name string, d sampler.Draws) figure.Parameter {
	symbol, unit := Symbol(name)
	return figure.Parameter{Symbol: symbol, Unit: unit, Draws: d.Values(), Best: math.NaN()}
}

// worthShowing reports whether a quantity varies and is not another one again.
func worthShowing(d sampler.Draws, shown []sampler.Draws) bool {
	for _, s := range shown {
		if !(math.Abs(sampler.Correlation(d, s)) < sameThing) {
			return false
		}
	}
	return true
}

// priorCurve tabulates a prior about the posterior.
func priorCurve(p likelihood.Prior, q result.Quantity) (x, y []float64) {
	lo, hi := p.Range()
	lo, hi = max(lo, float64(q.Mean-10*q.SD)), min(hi, float64(q.Mean+10*q.SD))
	x = grid(lo, hi, 200, false)
	y = make([]float64, len(x))
	for i := range x {
		y[i] = math.Exp(p.LogDensity(x[i]))
	}
	return x, y
}
