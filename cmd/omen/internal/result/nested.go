package result

import (
	"omen/cmd/omen/internal/nested"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/sampler/evidence"
)

// nested fills in the nested universes and what they change.
func (s *Summary) nested(r Run) {
	c := r.Nested
	if c == nil {
		return
	}
	best := c.Models[c.Best()].LogEvidence
	for i := range c.Models {
		s.Nested = append(s.Nested, nestedOf(&c.Models[i], best, i == c.Best()))
	}
	f := r.Job.Space.Family()
	s.Averaged = averaged(c, f)
	for _, a := range nested.Alternatives(f) {
		s.Priors = append(s.Priors, priorOf(c, a, f))
	}
}

func nestedOf(m *nested.Fitted, best evidence.Estimate, isBest bool) Nested {
	n := Nested{Name: m.Name, Words: m.Words, Own: m.Own, Parameters: m.Parameters, Best: map[string]Number{}, Chi2: Number(m.Chi2),
		AIC: Number(m.AIC()), BIC: Number(m.BIC()), LogEvidence: Number(m.LogEvidence.Value), Error: Number(m.LogEvidence.Err),
		Method: m.Method, Admitted: Number(m.Admitted), Odds: Number(m.Odds),
		Probability: Number(m.Probability.Value), ProbabilityErr: Number(m.Probability.Err), Ruled: m.Why}
	if !isBest {
		b := evidence.LogBayesFactor(m.LogEvidence, best)
		n.LogBayesFactor, n.BayesError = Number(b.Value), Number(b.Err)
	}
	for i, p := range m.Family.Free {
		if i < len(m.Best) {
			n.Best[p.Name] = Number(m.Best[i])
		}
	}
	return n
}

// averaged are the tables over all models.
func averaged(c *nested.Comparison, f likelihood.Family) *Averaged {
	a := &Averaged{}
	exact := c.Exact()
	add := func(to *[]Fate, list []outlook.Statement) {
		for _, s := range list {
			if share := c.Average(s.Holds); c.Possible(s.Holds) {
				f := fateOf(s.Name, share)
				f.Exact = exact
				*to = append(*to, f)
			}
		}
	}
	add(&a.Fates, outlook.Fates())
	if f.DarkEnergy == likelihood.W0Wa {
		add(&a.FatesHeldW, outlook.HeldFates())
	}
	if !f.Flat {
		add(&a.Today, outlook.Today())
	} else {
		add(&a.Today, outlook.Today()[:1])
	}
	return a
}

// priorOf is the result under another prior.
func priorOf(c *nested.Comparison, a nested.Alternative, f likelihood.Family) Prior {
	p := Prior{Name: a.Words, Same: !c.Changes(a), Effective: 1}
	if p.Same {
		return p
	}
	under, least, err := c.Under(a)
	if err != nil { // the ratio vanishes wherever there is mass: there is nothing to say
		p.Effective = 0
		return p
	}
	p.Effective, p.Averaged = Number(least), averaged(under, f)
	if own := under.Own(); own >= 0 {
		p.Fates, p.Held, p.Today = tables(under.Models[own].Belief, f)
		for _, list := range [][]Fate{p.Fates, p.Held, p.Today} {
			for i := range list {
				list[i].Exact = under.Models[own].Exact()
			}
		}
	}
	return p
}
