package sampler

import (
	"fmt"
	"math"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

const (
	overDispersion = 2.5 // standard deviations of the start, in those of the density
	deepestStart   = 30  // how far below the best fit a walker may start in ln p, plus 10 per parameter
)

// Scatter returns positions for the walkers of one ensemble, a row of numbers
// for each, drawn about 2.5 times wider than the density is around its highest
// point best, within the box lo ≤ x ≤ hi. Wider, so that ensembles which end up
// alike have forgotten their start (Gelman & Rubin 1992, Stat. Sci. 7, 457).
//
// A walker that would start where the density is zero or hopelessly low moves
// towards best until it does not. The widths come from the curvature of the
// density at best, or where that says nothing, from how far it takes to fall,
// or the box. Positions depend on the seed and the ensemble's index alone. It
// is an error if the density at best is not finite.
func Scatter(d Density, best, lo, hi []float64, walkers int, seed uint64, ensemble int) ([]float64, error) {
	if err := checkBox(lo, hi); err != nil {
		return nil, err
	}
	top := d(best)
	if !finite(top) {
		return nil, fmt.Errorf("sampler: the log-density at the start %v is %v", best, top)
	}
	dim := len(best)
	root := spread(d, best, lo, hi)
	lowest := top - deepestStart - 10*float64(dim)
	// Step 0 is the start: the steps of the chain begin at 1.
	var s stream
	s.seek(seed, ensemble, 0)
	x := make([]float64, 0, walkers*dim)
	for range walkers {
		y := standing(d, best, lo, hi, root, lowest, &s)
		if y == nil {
			return nil, fmt.Errorf("sampler: found no finite density near the start %v", best)
		}
		x = append(x, y...)
	}
	return x, nil
}

// standing draws a position at which the density is not too low: a direction, and
// the largest of shrinking distances along it. Directions that leave the box
// are reflected at its sides; one that leads out of the density's own domain at
// once is given up for another. nil if none of many is any good.
func standing(d Density, best, lo, hi []float64, root *mat.TriDense, lowest float64, s *stream) []float64 {
	v := make([]float64, len(best))
	for range 1000 {
		for i := range v {
			v[i] = overDispersion * s.normal()
		}
		for range 30 {
			y := displaced(best, root, v)
			mirror(y, lo, hi)
			if d(y) >= lowest {
				return y
			}
			for i := range v {
				v[i] *= 0.7
			}
		}
	}
	return nil
}

// mirror folds x into a box as by mirrors at its sides.
func mirror(x, lo, hi []float64) {
	for i := range x {
		side := hi[i] - lo[i]
		t := math.Mod(math.Abs(x[i]-lo[i]), 2*side)
		x[i] = min(lo[i]+min(t, 2*side-t), hi[i])
	}
}

// normal returns a standard normal number, by inversion: one number from the
// stream, and the same on every platform and for every version of a library.
func (s *stream) normal() float64 {
	return distuv.UnitNormal.Quantile(s.uniform() + math.SmallestNonzeroFloat64)
}
