package likelihood

import (
	"omen/data"

	"gonum.org/v1/gonum/floats"
)

// Rates compares expansion rates H(z) in km/s/Mpc with H0 E(z).
type Rates struct {
	z, h  []float64
	noise Noise
}

var (
	_ Term   = (*Rates)(nil)
	_ needer = (*Rates)(nil)
)

// NewRates builds the term. A nil noise is the table's own errors.
func NewRates(t *data.Rates, noise Noise) (*Rates, error) {
	noise, err := noiseOr(noise, t.Err, len(t.Z))
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
	r := p.work[:t.noise.width()]
	for i := range t.z {
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
		out[i] = Residual{Z: t.z[i], Measured: t.h[i], Predicted: x, Sigmas: (t.h[i] - x) / t.noise.Sigma(i)}
	}
	return out
}

func (t *Rates) scratch() int { return t.noise.width() }
