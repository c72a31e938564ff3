package quadrature

import (
	"context"
	"math"
)

// maxPieces bounds the pieces of one inner level; beyond it the errors stay as they are and are reported.
const maxPieces = 60

// worker evaluates inner integrals for one goroutine. The memory of the lines is reused.
type worker struct {
	*pass
	density  Density
	x        []float64 // the caller's order
	evals    int
	infinite bool // ln p = +Inf was met

	tol    vec
	cores  []core // of the innermost line
	pieces []linePiece
	hints  [2][]point // from the levels outside
	out    [3][]node  // nodes handed out by each level
	peaks  [3]vec     // largest integral seen at each level
	buf    [3][]float64
}

// integrate returns the integral over this level and all within, the coordinates outside being fixed in w.x,
// and appends its nodes to w.out.
func (w *worker) integrate(at int) (r integral) {
	if at == w.dim-1 {
		r = w.line()
	} else {
		r = w.slab(at)
	}
	for s := range w.slots {
		w.peaks[at][s] = math.Max(w.peaks[at][s], r.val[s])
	}
	return r
}

// slab integrates a middle level.
func (w *worker) slab(at int) (r integral) {
	l := level{pass: w.pass, at: at, crew: []*worker{w}}
	w.out[at+1] = w.out[at+1][:0]
	l.open(context.Background())
	l.refine(context.Background(), 1, maxPieces, math.MaxInt)
	r, w.out[at] = l.result(w.out[at])
	w.hints[at] = nil
	return r
}
