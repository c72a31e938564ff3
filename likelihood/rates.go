package likelihood

import (
	"omen/data"

	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/mat"
)

// Rates compares expansion rates H(z) in km/s/Mpc with H0 E(z).
type Rates struct {
	z, h  []float64
	noise noise
}

var (
	_ Term   = (*Rates)(nil)
	_ needer = (*Rates)(nil)
)

// NewRates builds the term. A nil cov uses the table's own errors.
func NewRates(t *data.Rates, cov *mat.SymDense) (*Rates, error) {
	noise, err := newNoise(t.Err, cov)
	if err != nil {
		return nil, err
	}
	return &Rates{z: t.Z, h: t.H, noise: noise}, nil
}

// Redshifts are those of the measured rates.
func (t *Rates) Redshifts() []float64 { return t.z }

// Rows counts the rates.
func (t *Rates) Rows() int { return len(t.z) }

// Offsets is zero.
func (t *Rates) Offsets() int { return 0 }

// Needs says that rates in km/s/Mpc need H0.
func (t *Rates) Needs() Needs { return Needs{H0: true} }

// Chi2 is the chi-squared of the rates.
func (t *Rates) Chi2(p *Prediction) float64 {
	r := p.work[:len(t.z)]
	for i := range r {
		r[i] = t.h[i] - p.Universe.H0/p.DH[i]
	}
	t.noise.whiten(r)
	return floats.Dot(r, r)
}

// Residuals lists every rate against the universe at p.
func (t *Rates) Residuals(p *Prediction) []Residual {
	out := make([]Residual, len(t.z))
	for i := range out {
		x := p.Universe.H0 / p.DH[i]
		out[i] = Residual{Z: t.z[i], Measured: t.h[i], Predicted: x, Sigmas: (t.h[i] - x) / t.noise.sigma(i)}
	}
	return out
}
