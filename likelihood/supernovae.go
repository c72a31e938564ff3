package likelihood

import (
	"fmt"
	"math"
	"sync"

	"omen/data"

	"gonum.org/v1/gonum/floats"
)

// OffsetKind says what is known of the common offset of supernova magnitudes,
// the sum of the absolute magnitude M and −5 log10 of H0.
type OffsetKind uint8

// The offset is free (marginalised with a flat prior), absent (M and H0 are
// parameters and taken as they are), or M has a normal prior of its own.
const (
	FreeOffset OffsetKind = iota
	AbsoluteOffset
	NormalOffset
)

// Offset is a kind with, for NormalOffset, the prior on M in mag.
type Offset struct {
	Kind     OffsetKind
	Mean, SD float64
}

// Standing declares what a condensed table stands for: so many measurements,
// whose chi-squared is Chi2 plus that of the condensed ones. The zero value
// declares nothing.
type Standing struct {
	Rows int
	Chi2 float64
}

// Supernovae compares standardised magnitudes or distance moduli with
//
//	m(z) = M + 5 log10[(1+z_hel) D_M(z) / Mpc] + 25
//
// With r the residuals for M = 0 and C their covariance, a free offset is
// marginalised over a flat prior in closed form:
//
//	chi² = rᵀC⁻¹r − (1ᵀC⁻¹r)² / (1ᵀC⁻¹1 + 1/s²)
//
// where s → ∞ for the flat prior and s is the width of a normal one, whose mean
// has been subtracted from r. For the flat prior this is also the minimum over
// the offset. (Completing the square; common practice.)
type Supernovae struct {
	z        []float64
	target   []float64 // magnitudes with 5 log10(1+z_hel) taken off
	measured []float64
	noise    Noise
	offset   Offset
	modulus  bool // the table holds mu, not mag
	standing Standing

	// shared is W1, what an offset does to every row, and 1ᵀC⁻¹1 + 1/s². Only an
	// evaluation over all rows asks for it.
	shared func() (ones []float64, weight float64)

	memory    Memory // of condensed forms, from run to run; nil for none
	lock      sync.Mutex
	triangles map[condensedKey][]float64 // see condensed
}

var (
	_ Term   = (*Supernovae)(nil)
	_ needer = (*Supernovae)(nil)
)

// NewSupernovae builds the term. A nil noise is the table's own errors.
func NewSupernovae(sn *data.Supernovae, noise Noise, offset Offset, standing Standing) (*Supernovae, error) {
	n := len(sn.Z)
	noise, err := noiseOr(noise, sn.Err, n)
	if err != nil {
		return nil, err
	}
	if offset.Kind == NormalOffset && !(offset.SD > 0) {
		return nil, fmt.Errorf("the normal prior on the offset needs a positive width, found %g", offset.SD)
	}
	s := &Supernovae{z: sn.Z, measured: sn.Value, noise: noise, offset: offset, triangles: map[condensedKey][]float64{},
		modulus: sn.Absolute, standing: standing, target: make([]float64, n)}
	zHel := sn.ZHel
	if zHel == nil {
		zHel = sn.Z // the difference is below 0.003 mag beyond z = 0.1
	}
	for i := range s.target {
		s.target[i] = sn.Value[i] - 5*math.Log10(1+zHel[i])
	}
	s.shared = sync.OnceValues(s.share)
	return s, nil
}

func (s *Supernovae) share() (ones []float64, weight float64) {
	ones = make([]float64, s.noise.width())
	for i := range s.z {
		ones[i] = 1
	}
	s.noise.whiten(ones)
	weight = floats.Dot(ones, ones)
	if s.offset.Kind == NormalOffset {
		weight += 1 / (s.offset.SD * s.offset.SD)
	}
	return ones, weight
}

// Redshifts are those of the supernovae, CMB frame.
func (s *Supernovae) Redshifts() []float64 { return s.z }

// Rows counts the supernovae, a normal prior on M as one measurement more.
func (s *Supernovae) Rows() int {
	n := len(s.z)
	if s.standing.Rows > 0 {
		n = s.standing.Rows
	}
	if s.offset.Kind == NormalOffset {
		n++
	}
	return n
}

// Offsets is one where the offset is marginalised.
func (s *Supernovae) Offsets() int {
	if s.offset.Kind == AbsoluteOffset {
		return 0
	}
	return 1
}

// Needs says that anything but a free offset needs H0, and absolute magnitudes
// need M too.
func (s *Supernovae) Needs() Needs {
	absolute := s.offset.Kind == AbsoluteOffset
	return Needs{H0: s.offset.Kind != FreeOffset, M: absolute && !s.modulus}
}

// Chi2 is the chi-squared of the supernovae with the offset marginalised.
func (s *Supernovae) Chi2(p *Prediction) float64 {
	r := s.whitened(p)
	chi2 := floats.Dot(r, r)
	if s.offset.Kind != AbsoluteOffset {
		ones, weight := s.shared()
		b := floats.Dot(ones, r)
		chi2 -= b * b / weight
	}
	return chi2 + s.standing.Chi2
}

// whitened is the residuals at p after the noise's map.
func (s *Supernovae) whitened(p *Prediction) []float64 {
	r := p.work[:s.noise.width()]
	base := s.zeroPoint(p)
	for i, dm := range p.DM {
		r[i] = s.target[i] - base - 5*math.Log10(dm)
	}
	s.noise.whiten(r)
	return r
}

// zeroPoint is 5 log10(c/H0/Mpc) + 25.
func zeroPoint(h0 float64) float64 { return 5*math.Log10(speedOfLight/h0) + 25 }

// zeroPoint is what is known of the offset: the universe's, and M.
func (s *Supernovae) zeroPoint(p *Prediction) float64 {
	if s.offset.Kind == FreeOffset {
		return 0
	}
	zero := zeroPoint(p.Universe.H0)
	if s.offset.Kind == NormalOffset {
		return zero + s.offset.Mean
	}
	if s.modulus {
		return zero
	}
	return zero + p.M
}

// Offset is the offset that fits best at p: the marginalised one's conditional
// mean, relative to the zero point of Chi2, in mag; 0 where it is absolute. With
// a free offset it is M − 5 log10(H0/(c/Mpc)) + 25 for magnitudes.
func (s *Supernovae) Offset(p *Prediction) float64 {
	if s.offset.Kind == AbsoluteOffset {
		return 0
	}
	r := s.whitened(p)
	ones, weight := s.shared()
	return floats.Dot(ones, r) / weight
}

// Residuals lists every supernova against the prediction at p with the offset
// that fits best.
func (s *Supernovae) Residuals(p *Prediction) []Residual {
	shift := s.zeroPoint(p) + s.Offset(p)
	out := make([]Residual, len(s.z))
	for i := range out {
		left := s.target[i] - shift - 5*math.Log10(p.DM[i])
		out[i] = Residual{Z: s.z[i], Measured: s.measured[i], Predicted: s.measured[i] - left,
			Sigmas: left / s.noise.Sigma(i)}
	}
	return out
}

func (s *Supernovae) scratch() int { return s.noise.width() }
