package likelihood

import (
	"fmt"

	"omen/data"

	"gonum.org/v1/gonum/floats"
)

// Ages compares the ages of objects seen at z with the age of the universe
// then, in Gyr. A lower bound t ± s counts as a one-sided Gaussian: no penalty
// for an older universe, ((t − t_universe)/s)² for a younger one.
type Ages struct {
	z, age []float64
	bound  []data.Bound
	noise  Noise
}

var (
	_ Term    = (*Ages)(nil)
	_ needer  = (*Ages)(nil)
	_ bounded = (*Ages)(nil)
)

// NewAges builds the term. A nil noise is the table's own errors; lower bounds
// cannot be correlated with anything.
func NewAges(a *data.Ages, noise Noise) (*Ages, error) {
	if noise != nil && lower(a.Bound) > 0 {
		return nil, fmt.Errorf("a lower bound on an age cannot carry a covariance; remove the covariance or the bounds")
	}
	noise, err := noiseOr(noise, a.Err, len(a.Z))
	if err != nil {
		return nil, err
	}
	return &Ages{z: a.Z, age: a.Age, bound: a.Bound, noise: noise}, nil
}

// lower counts the lower bounds.
func lower(list []data.Bound) (n int) {
	for _, b := range list {
		if b == data.LowerBound {
			n++
		}
	}
	return n
}

func (a *Ages) bounds() int { return lower(a.bound) }

// Redshifts is empty: ages need no distances.
func (a *Ages) Redshifts() []float64 { return nil }

// Rows counts the objects.
func (a *Ages) Rows() int { return len(a.z) }

// Offsets is zero.
func (a *Ages) Offsets() int { return 0 }

// Needs says that ages in Gyr need H0.
func (a *Ages) Needs() Needs { return Needs{H0: true} }

// Chi2 is −2 ln L of the ages up to a constant.
func (a *Ages) Chi2(p *Prediction) float64 {
	r := p.work[:a.noise.width()]
	for i := range a.z {
		r[i] = a.age[i] - p.Universe.Age(a.z[i])
		if a.bound[i] == data.LowerBound && r[i] < 0 {
			r[i] = 0
		}
	}
	a.noise.whiten(r)
	return floats.Dot(r, r)
}

// Residuals lists every age against the universe at p.
func (a *Ages) Residuals(p *Prediction) []Residual {
	out := make([]Residual, len(a.z))
	for i := range out {
		t := p.Universe.Age(a.z[i])
		d := a.age[i] - t
		if a.bound[i] == data.LowerBound && d < 0 {
			d = 0
		}
		out[i] = Residual{Z: a.z[i], Measured: a.age[i], Predicted: t, Sigmas: d / a.noise.Sigma(i)}
	}
	return out
}

func (a *Ages) scratch() int { return a.noise.width() }
