package likelihood

// Prediction is what a Term is handed: a point of parameter space and the
// distances at the redshifts the term asked for, in the order it asked.
type Prediction struct {
	Point
	DM, DH []float64 // transverse comoving and Hubble distance, in units of c/H0
	work   []float64 // scratch, as long as the term's redshifts
}

// Term is one set of measurements as a Gaussian likelihood.
type Term interface {
	// Redshifts says where the term needs distances.
	Redshifts() []float64
	// Chi2 is −2 ln L up to a constant that no parameter changes; NaN outside
	// the domain. It may use p's scratch and must not keep p.
	Chi2(p *Prediction) float64
	// Rows counts the measurements that the term stands for, and Offsets the
	// nuisance offsets that it marginalises, for the degrees of freedom.
	Rows() int
	Offsets() int

	scratch() int // how many numbers Chi2 needs in p.work
}

// Residual is one measurement beside its best prediction.
type Residual struct {
	Z                           float64
	Measured, Predicted, Sigmas float64 // Sigmas: difference over its own error
}

// Needs says which parameters a term cannot do without.
type Needs struct{ H0, HRd, M bool }

// needer is implemented by terms that need more than the shape of E(z).
type needer interface{ Needs() Needs }

// bounded is implemented by terms of which some rows are bounds rather than
// measurements.
type bounded interface{ bounds() int }
