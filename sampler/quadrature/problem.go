package quadrature

import (
	"errors"
	"fmt"
	"math"
	"runtime"
)

// Density is the natural logarithm of an unnormalised density: ln(normalised prior) + ln L makes the integral
// the evidence. -Inf or NaN means outside the support. It may own scratch memory: each value is used by one
// goroutine at a time. It must not keep or change x.
type Density func(x []float64) float64

// Problem is a density on a box, and optionally a division of the box into classes.
type Problem struct {
	Density func() Density // makes one Density per goroutine; all must agree
	Lo, Hi  []float64      // edges of the box, finite, 1 to 3 coordinates
	Start   []float64      // a good point if one is known, or nil

	// Class tells to which of the Classes (at most 15) the point belongs, 0 … Classes-1; any other value is
	// none of them. It is called from several goroutines. Nil when there are no classes. A class is found if a
	// node falls into it, and then followed to where its mass is; one that is everywhere thinner than some 0.2
	// standard deviations may be missed.
	Class   func(x []float64) int
	Classes int
}

// Options say how hard to try. All errors asked for are relative.
type Options struct {
	Tolerance      float64 // of the evidence
	ClassTolerance float64 // of the probability of each class, relative to that probability
	Rarest         float64 // a class less probable than this is only known to ClassTolerance·Rarest
	MaxEvaluations int     // of the density in each of the dim passes, about; the errors stay honest
	Passes         int     // coordinates whose marginal is integrated; 0 for all. [Nodes.Marginal] has those of the others, less exactly
	// Enough, if set, looks at the probabilities of the classes after the first pass; the others are left out if
	// it says no, and the result has but the first marginal.
	Enough  func(classes []Estimate) bool
	Workers int // goroutines; 0 for as many as there are cores. Does not change the result
}

// DefaultOptions returns options good for publication.
func DefaultOptions() Options {
	return Options{Tolerance: 1e-6, ClassTolerance: 1e-3, Rarest: 1e-12, MaxEvaluations: 3_000_000}
}

// Estimate is a number and its standard or, for a quadrature, estimated largest error.
type Estimate struct{ Value, Err float64 }

// ErrNoSupport is returned when no point of the box with a finite log-density was found.
var ErrNoSupport = errors.New("the density is zero at every point tried: widen the box or give a starting point inside the support")

func (p Problem) check() error {
	d := len(p.Lo)
	switch {
	case p.Density == nil || len(p.Hi) != d || (p.Start != nil && len(p.Start) != d):
		panic("quadrature: a problem needs a density, and lo, hi and start of one length")
	case p.Classes < 0 || p.Classes > maxClasses || (p.Class == nil) != (p.Classes == 0):
		panic(fmt.Sprintf("quadrature: between 1 and %d classes and a function, or none", maxClasses))
	case d < 1 || d > 3:
		return fmt.Errorf("quadrature works for 1 to 3 parameters, not %d", d)
	}
	for i := range d {
		if w := p.Hi[i] - p.Lo[i]; !(w > 0) || math.IsInf(w, 0) {
			return fmt.Errorf("the box of coordinate %d, [%g, %g], is not finite and of positive width", i, p.Lo[i], p.Hi[i])
		}
	}
	return nil
}

func (o Options) check() (Options, error) {
	if !(o.Tolerance > 0 && o.ClassTolerance > 0 && o.Rarest > 0 && o.MaxEvaluations > 0) {
		return o, errors.New("quadrature: tolerances, rarest probability and evaluations must be positive; begin from DefaultOptions")
	}
	if o.Workers <= 0 {
		o.Workers = runtime.GOMAXPROCS(0)
	}
	return o, nil
}
