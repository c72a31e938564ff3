package nested

import (
	"fmt"
	"math"
	"slices"

	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
)

// Alternative is another choice of the two coordinates in which a prior is flat.
type Alternative struct {
	Words string // "flat in (Om, Ok)"
	// replaced is the parameter whose place the new coordinate takes in a family, ""
	// if the family has no such freedom; jacobian is |∂new/∂replaced|, nil where it
	// is the same everywhere.
	replaced func(likelihood.Family) (name string, jacobian func(*likelihood.Point) float64)
}

// Alternatives lists the priors that a result in a family is held against: those whose coordinates are
// free in it.
func Alternatives(own likelihood.Family) []Alternative {
	var out []Alternative
	for _, a := range []Alternative{
		{Words: "flat in (Om, Ok)", replaced: curvature},
		{Words: "flat in (Om, q0)", replaced: deceleration},
	} {
		if name, _ := a.replaced(own); name != "" && name != "Om" {
			out = append(out, a)
		}
	}
	return out
}

// curvature takes the place of OL: Ok = 1 - Om - OL - Or, |∂Ok/∂OL| = 1.
func curvature(f likelihood.Family) (string, func(*likelihood.Point) float64) {
	if free(f, "OL") {
		return "OL", nil
	}
	return "", nil
}

// deceleration takes the place of OL, or of w0 in a flat family: q0 = Or + Om/2 + (1+3w0) OL/2. For a cosmological
// constant ∂q0/∂OL = -1.
func deceleration(f likelihood.Family) (string, func(*likelihood.Point) float64) {
	switch {
	case free(f, "OL") && free(f, "w0"):
		return "OL", func(p *likelihood.Point) float64 { return math.Abs(1+3*p.Universe.W0) / 2 }
	case free(f, "OL"):
		return "OL", nil
	case f.Flat && free(f, "w0"):
		return "w0", func(p *likelihood.Point) float64 { return 1.5 * math.Abs(p.Universe.OL) }
	case f.Flat && free(f, "Om"):
		return "Om", nil
	}
	return "", nil
}

// ratio is the new prior density over the old one at x, up to a constant; nil where
// it is constant. A prior with a shape that was measured (a normal one) is kept; one
// that is flat in the logarithm is made flat.
func (a Alternative) ratio(space *likelihood.Space) func(x []float64) float64 {
	name, jacobian := a.replaced(space.Family())
	var uneven []int
	for i, p := range space.Free() {
		lo, _ := p.Prior.Range()
		if (p.Name == "Om" || p.Name == name) && !p.Prior.Informative() && p.Prior.LogDensity(lo) != p.Prior.LogDensity(p.Prior.Quantile(0.5)) {
			uneven = append(uneven, i)
		}
	}
	if jacobian == nil && uneven == nil {
		return nil
	}
	free := space.Free()
	return func(x []float64) float64 {
		r := 1.0
		if jacobian != nil {
			var p likelihood.Point
			space.Point(x, &p)
			r = jacobian(&p)
		}
		for _, i := range uneven {
			r *= math.Exp(-free[i].Prior.LogDensity(x[i]))
		}
		return r
	}
}

// Changes reports whether another prior is another density in any of the models. The
// support is that of the run's own priors: a reweighting cannot look beyond it.
func (c *Comparison) Changes(a Alternative) bool {
	return slices.ContainsFunc(c.Models, func(m Fitted) bool { return m.Belief != nil && a.ratio(m.space) != nil })
}

// Under is the comparison with another prior, by reweighting, and the smallest share of
// a sample that is left effective.
func (c *Comparison) Under(a Alternative) (*Comparison, float64, error) {
	again := &Comparison{Models: slices.Clone(c.Models)}
	least := 1.0
	for i := range again.Models {
		m := &again.Models[i]
		if m.Belief == nil {
			continue
		}
		r := a.ratio(m.space)
		if r == nil {
			continue
		}
		w, err := m.Belief.Reweighted(r)
		if err != nil {
			return nil, 0, fmt.Errorf("%s, prior %s: %w", m.Words, a.Words, err)
		}
		m.Belief = w.Belief
		m.LogEvidence.Value += w.LogMean - logPriorMean(m.space, r)
		m.LogEvidence.Err = math.Hypot(m.LogEvidence.Err, w.Err)
		least = math.Min(least, w.Effective)
	}
	return again, least, again.weigh()
}

// logPriorMean is ln of the mean of a ratio over the prior that a family admits,
// from evenly spread points.
func logPriorMean(space *likelihood.Space, ratio func(x []float64) float64) float64 {
	var sum, n float64
	var p likelihood.Point
	outlook.Spread(space, 1<<16, func(x []float64) {
		space.Point(x, &p)
		if space.Allows(&p.Universe) {
			sum, n = sum+ratio(x), n+1
		}
	})
	return math.Log(sum / n)
}
