package outlook

import (
	"math"

	"omen/sampler"
)

// Share is the probability of a statement. Where P says no more than that it is
// small, Upper is its 95% upper limit; where it says no more than that it is nearly
// one, Lower is the lower limit. They are NaN elsewhere.
type Share struct {
	P, Err       float64
	Upper, Lower float64
}

// Exactly is a share that is known without error.
func Exactly(p float64) Share { return Share{P: p, Upper: math.NaN(), Lower: math.NaN()} }

// Belief is a posterior as far as labels go.
type Belief interface {
	// Probability of a statement about the label.
	Probability(holds func(Label) bool) Share
	// Reweighted is the belief under another prior, ratio being the new prior
	// density over the old one at the free parameters.
	Reweighted(ratio func(x []float64) float64) (Reweighted, error)
}

// Reweighted is a belief under another prior.
type Reweighted struct {
	Belief
	LogMean, Err float64 // ln of the posterior mean of the ratio: what the evidence gains
	Effective    float64 // share of the sample that is left of it, 0 to 1 (Kish 1965, Survey Sampling, §11.7)
}

// Certain is the belief in a single universe.
type Certain struct{ Label Label }

var _ Belief = Certain{}

// Probability is 0 or 1.
func (c Certain) Probability(holds func(Label) bool) Share {
	if holds(c.Label) {
		return Exactly(1)
	}
	return Exactly(0)
}

// Reweighted changes nothing.
func (c Certain) Reweighted(func(x []float64) float64) (Reweighted, error) {
	return Reweighted{Belief: c, Effective: 1}, nil
}

// Drawn is a belief made of draws.
type Drawn struct {
	View  sampler.View
	Codes sampler.Draws // [Label.Code] along View
	ESS   float64       // of the parameters, for what no draw shows
}

var _ Belief = Drawn{}

// fewSigmas is how many of its errors a probability must be away from 0 and 1 to be
// told as a number: four effective draws.
const fewSigmas = 2

// Probability counts draws; next to none or next to all leave a limit, unless there are
// so few that both would.
func (d Drawn) Probability(holds func(Label) bool) Share {
	p := sampler.Proportion(d.Codes.Map(func(code float64) float64 { return indicator(holds(Decode(code))) }), d.ESS)
	s := Share{P: p.P, Err: p.Error, Upper: math.NaN(), Lower: math.NaN()}
	none, all := p.P == 0 || p.P < fewSigmas*p.Error, p.P == 1 || 1-p.P < fewSigmas*p.Error
	switch {
	case none && all:
	case none:
		s.P, s.Upper = 0, p.Upper95
		if math.IsNaN(s.Upper) {
			s.Upper = 1
		}
	case all:
		s.P, s.Lower = 1, p.Lower95
		if math.IsNaN(s.Lower) {
			s.Lower = 0
		}
	}
	return s
}

func indicator(yes bool) float64 {
	if yes {
		return 1
	}
	return 0
}

// Reweighted weighs the draws.
func (d Drawn) Reweighted(ratio func(x []float64) float64) (Reweighted, error) {
	w := d.View.Map(ratio)
	s := sampler.Summarize(w)
	kept := 1 / (1 + s.SD*s.SD/(s.Mean*s.Mean))
	d.Codes, d.ESS = d.Codes.Weighted(w), d.ESS*kept
	return Reweighted{Belief: d, LogMean: math.Log(s.Mean), Err: zeroNaN(s.MCSE / s.Mean), Effective: kept}, nil
}

// zeroNaN is the error of a constant, which draws cannot tell.
func zeroNaN(x float64) float64 {
	if math.IsNaN(x) {
		return 0
	}
	return x
}
