package nested

import (
	"math"
	"slices"

	"omen/cmd/omen/internal/outlook"
)

// Best is the place of the model with the largest evidence.
func (c *Comparison) Best() int {
	best := 0
	for i := range c.Models {
		if c.Models[i].LogEvidence.Value > c.Models[best].LogEvidence.Value {
			best = i
		}
	}
	return best
}

// Own is the place of the run's own family, -1 if it is not among the models.
func (c *Comparison) Own() int {
	for i := range c.Models {
		if c.Models[i].Own {
			return i
		}
	}
	return -1
}

// Average is the probability of a statement averaged over the models: Σ p_k P_k. Its
// error is that of the P_k and, to first order, that of the evidences,
// dP = Σ p_k (P_k - P) dlnZ_k. Models in which the count of draws is none or all
// contribute their limit to the limit.
func (c *Comparison) Average(holds func(outlook.Label) bool) outlook.Share {
	shares := make([]outlook.Share, len(c.Models))
	var p, upper, lower float64
	for i := range c.Models {
		m := &c.Models[i]
		if m.Belief == nil {
			continue
		}
		shares[i] = m.probability(holds)
		w := m.Probability.Value
		p += w * shares[i].P
		upper += w * or(shares[i].Upper, shares[i].P)
		lower += w * or(shares[i].Lower, shares[i].P)
	}
	s := outlook.Share{P: p, Upper: math.NaN(), Lower: math.NaN()}
	variance := 0.0
	for i := range c.Models {
		m := &c.Models[i]
		if m.Belief == nil {
			continue
		}
		variance += math.Pow(m.Probability.Value*or(shares[i].Err, 0), 2)
		variance += math.Pow(m.Probability.Value*(shares[i].P-p)*m.LogEvidence.Err, 2)
	}
	s.Err = math.Sqrt(variance)
	switch { // a limit counts where it is more than the rest
	case p == 0 && upper == 0 && c.Possible(holds): // the evidence is below the smallest number
		s.Upper = math.SmallestNonzeroFloat64
	case upper-p > p:
		s.P, s.Upper = 0, upper
	case p-lower > 1-p:
		s.P, s.Lower = 1, lower
	}
	return s
}

// probability is that of the belief, and exactly 0 or 1 where the model leaves no choice.
func (f *Fitted) probability(holds func(outlook.Label) bool) outlook.Share {
	switch {
	case !outlook.Possible(f.Family, holds):
		return outlook.Exactly(0)
	case !outlook.Possible(f.Family, func(l outlook.Label) bool { return !holds(l) }):
		return outlook.Exactly(1)
	}
	return f.Belief.Probability(holds)
}

// Possible tells whether a statement can hold in any of the models that have odds.
func (c *Comparison) Possible(holds func(outlook.Label) bool) bool {
	return slices.ContainsFunc(c.Models, func(m Fitted) bool {
		return m.Belief != nil && m.Odds > 0 && outlook.Possible(m.Family, holds)
	})
}

// Exact tells whether the model was integrated, so that no probability is a count.
func (f *Fitted) Exact() bool { return f.Method != bridged }

// Exact tells whether every model was.
func (c *Comparison) Exact() bool {
	return !slices.ContainsFunc(c.Models, func(m Fitted) bool { return !m.Exact() })
}

func or(x, otherwise float64) float64 {
	if math.IsNaN(x) {
		return otherwise
	}
	return x
}
