package sampler

import (
	"fmt"
	"math"
	"slices"
)

// Draws is one scalar quantity along a chain: ensembles × steps × walkers,
// optionally weighted. A draw of weight zero counts for nothing, whatever its
// value, so a quantity that is undefined for some positions (NaN there) can be
// summarised where it is defined by [Draws.Weighted] with an indicator.
type Draws struct {
	walkers int
	spacing int         // steps of the run between the steps here
	x       [][]float64 // by ensemble: steps × walkers
	w       [][]float64 // the same, or nil for weights of one
}

// NewDraws makes draws from values of one ensemble each, steps × walkers. It
// panics if they are not of one shape. NewDraws(1, x) is a single sequence, as
// for a sample that someone else published.
func NewDraws(walkers int, ensembles ...[]float64) Draws {
	for _, x := range ensembles {
		if walkers < 1 || len(x) != len(ensembles[0]) || len(x)%walkers != 0 {
			panic(fmt.Sprintf("sampler: NewDraws: %d values in an ensemble of %d walkers, %d in the first", len(x), walkers, len(ensembles[0])))
		}
	}
	return Draws{walkers: walkers, spacing: 1, x: ensembles}
}

// Coordinate returns parameter i along a view. It panics if there is no such
// parameter.
func (v View) Coordinate(i int) Draws {
	if i < 0 || i >= v.dim {
		panic(fmt.Sprintf("sampler: Coordinate(%d) of %d", i, v.dim))
	}
	return v.coordinate(i, v.walkers)
}

// coordinate is parameter i of the first walkers of each ensemble.
func (v View) coordinate(i, walkers int) Draws {
	d := v.draws(walkers)
	for m, out := range d.x {
		for s := range v.n {
			row := v.x[m][s*v.stride*v.walkers*v.dim:]
			for k := range walkers {
				out[s*walkers+k] = row[k*v.dim+i]
			}
		}
	}
	return d
}

// LogDensity returns the log-density along a view.
func (v View) LogDensity() Draws {
	d := v.draws(v.walkers)
	for m, out := range d.x {
		for s := range v.n {
			at := s * v.stride * v.walkers
			copy(out[s*v.walkers:(s+1)*v.walkers], v.logp[m][at:at+v.walkers])
		}
	}
	return d
}

// Map returns a function of the position along a view. f must not keep or
// change x.
func (v View) Map(f func(x []float64) float64) Draws {
	return v.MapAll(1, 1, func() func(x, y []float64) {
		return func(x, y []float64) { y[0] = f(x) }
	})[0]
}

// mapRows is how many steps one goroutine of MapAll takes at a time.
const mapRows = 64

// MapAll returns several quantities, computed together from the position, along
// a view. New is called once per goroutine, so the function it returns may own
// scratch memory; that function fills y, one number for each quantity. threads
// bounds the goroutines (0: one per processor); the result does not depend on
// it.
func (v View) MapAll(quantities, threads int, New func() func(x, y []float64)) []Draws {
	all := make([]Draws, quantities)
	for q := range all {
		all[q] = v.draws(v.walkers)
	}
	pieces := (v.n + mapRows - 1) / mapRows
	parallel(pieces*len(v.x), threads, func() func(int) {
		f, y := New(), make([]float64, quantities)
		return func(piece int) {
			m, from := piece/pieces, piece%pieces*mapRows
			v.mapPiece(all, m, from, min(from+mapRows, v.n), f, y)
		}
	})
	return all
}

// mapPiece fills steps from ≤ s < to of ensemble m.
func (v View) mapPiece(all []Draws, m, from, to int, f func(x, y []float64), y []float64) {
	for s := from; s < to; s++ {
		for k := range v.walkers {
			x, _ := v.at(m, s, k)
			f(x, y)
			for q := range all {
				all[q].x[m][s*v.walkers+k] = y[q]
			}
		}
	}
}

// draws makes empty draws in the shape of a view of so many walkers.
func (v View) draws(walkers int) Draws {
	d := Draws{walkers: walkers, spacing: v.spacing, x: make([][]float64, len(v.x))}
	for m := range d.x {
		d.x[m] = make([]float64, v.n*walkers)
	}
	return d
}

// Map returns a function of each draw, with the weights it had.
func (d Draws) Map(f func(x float64) float64) Draws {
	x := make([][]float64, len(d.x))
	for m := range x {
		x[m] = make([]float64, len(d.x[m]))
		for i, v := range d.x[m] {
			x[m][i] = f(v)
		}
	}
	d.x = x
	return d
}

// Weighted returns the draws with their weights multiplied by w, which must
// have the same shape and be finite and not negative; Weighted panics
// otherwise. An indicator makes a summary conditional on it, a ratio of
// densities reweights to another prior.
func (d Draws) Weighted(w Draws) Draws {
	if len(w.x) != len(d.x) || w.walkers != d.walkers || w.Len() != d.Len() {
		panic("sampler: Draws.Weighted: weights of another shape")
	}
	product := cloneAll(w.x)
	for m := range product {
		for i, v := range product[m] {
			if !(v >= 0) || math.IsInf(v, 1) {
				panic(fmt.Sprintf("sampler: Draws.Weighted: weight %v", v))
			}
			if d.w != nil {
				product[m][i] *= d.w[m][i]
			}
		}
	}
	d.w = product
	return d
}

// Len returns the number of draws.
func (d Draws) Len() int { return len(d.x) * d.steps() * d.walkers }

// Values returns a copy of all draws: ensembles × steps × walkers.
func (d Draws) Values() []float64 { return slices.Concat(d.x...) }

func (d Draws) steps() int {
	if len(d.x) == 0 {
		return 0
	}
	return len(d.x[0]) / d.walkers
}

// after drops the first steps.
func (d Draws) after(drop int) Draws {
	cut := func(all [][]float64) [][]float64 {
		part := make([][]float64, len(all))
		for m := range all {
			part[m] = all[m][min(drop*d.walkers, len(all[m])):]
		}
		return part
	}
	d.x = cut(d.x)
	if d.w != nil {
		d.w = cut(d.w)
	}
	return d
}

// each calls f for every draw of positive weight.
func (d Draws) each(f func(x, w float64)) {
	for m := range d.x {
		for i, x := range d.x[m] {
			w := 1.0
			if d.w != nil {
				w = d.w[m][i]
			}
			if w > 0 {
				f(x, w)
			}
		}
	}
}
