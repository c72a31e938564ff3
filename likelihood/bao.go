package likelihood

import (
	"math"

	"omen/data"

	"gonum.org/v1/gonum/floats"
)

// BAO compares ratios of distances to the sound horizon,
//
//	D_M/rd, D_H/rd, D_V/rd, D_M/D_H
//
// with D_V = (z D_M² D_H)^(1/3) (Eisenstein et al. 2005, ApJ 633:560). In units
// of c/H0 every ratio is (c/100)/hrd times a number that E(z) alone decides.
type BAO struct {
	z, value []float64
	quantity []data.Quantity
	noise    Noise
}

var (
	_ Term   = (*BAO)(nil)
	_ needer = (*BAO)(nil)
)

// NewBAO builds the term. A nil noise is the table's own errors.
func NewBAO(b *data.BAO, noise Noise) (*BAO, error) {
	noise, err := noiseOr(noise, b.Err, len(b.Z))
	if err != nil {
		return nil, err
	}
	return &BAO{z: b.Z, value: b.Value, quantity: b.Quantity, noise: noise}, nil
}

// Redshifts are the effective redshifts, one for each ratio.
func (b *BAO) Redshifts() []float64 { return b.z }

// Rows counts the ratios.
func (b *BAO) Rows() int { return len(b.z) }

// Offsets is zero.
func (b *BAO) Offsets() int { return 0 }

// Needs says that ratios to rd need it.
func (b *BAO) Needs() Needs {
	for _, q := range b.quantity {
		if q != data.DMOverDH {
			return Needs{HRd: true}
		}
	}
	return Needs{}
}

// Chi2 is the chi-squared of the ratios.
func (b *BAO) Chi2(p *Prediction) float64 {
	r := p.work[:b.noise.width()]
	for i := range b.z {
		r[i] = b.value[i] - b.predict(p, i)
	}
	b.noise.whiten(r)
	return floats.Dot(r, r)
}

func (b *BAO) predict(p *Prediction, i int) float64 {
	scale := speedOfLight / 100 / p.HRd
	dm, dh := p.DM[i], p.DH[i]
	switch b.quantity[i] {
	case data.DMOverRd:
		return scale * dm
	case data.DHOverRd:
		return scale * dh
	case data.DVOverRd:
		return scale * math.Cbrt(b.z[i]*dm*dm*dh)
	default:
		return dm / dh
	}
}

// Residuals lists every ratio against the prediction at p.
func (b *BAO) Residuals(p *Prediction) []Residual {
	out := make([]Residual, len(b.z))
	for i := range out {
		x := b.predict(p, i)
		out[i] = Residual{Z: b.z[i], Measured: b.value[i], Predicted: x, Sigmas: (b.value[i] - x) / b.noise.Sigma(i)}
	}
	return out
}

func (b *BAO) scratch() int { return b.noise.width() }
