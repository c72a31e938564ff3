package quadrature

import "math"

// integral is what a level hands to the level outside it. The errors include those of the levels within;
// peak is the largest ln p met or foreseen.
type integral struct {
	val, err vec
	peak     float64
}

// maxPieces bounds the pieces of one inner level; beyond it the errors stay as they are and are reported.
const maxPieces = 60

// slabPiece holds the integrals within, at the nodes of one piece of a level, and where their nodes lie in
// the buffer of the level within.
type slabPiece struct {
	within [points]integral
	nodes  [points][2]int
}

// worker evaluates inner integrals for one goroutine. All its memory is reused.
type worker struct {
	*pass
	density  Density
	x        []float64 // the caller's order
	evals    int
	infinite bool // ln p = +Inf was met

	tol    vec
	cores  []core // of the innermost line
	pieces []linePiece
	middle []core // of the middle level, in three dimensions
	slabs  []slabPiece
	out    [3][]node // nodes handed out by each level
	peaks  [3]vec    // largest integral seen at each level
	cutbuf [3][8]float64
}

// integrate returns the integral over this level and all within; the coordinates outside are fixed in w.x.
func (w *worker) integrate(level int) integral {
	w.out[level] = w.out[level][:0]
	return w.integrateInto(level)
}

// integrateInto appends its nodes instead of starting afresh.
func (w *worker) integrateInto(level int) (r integral) {
	if level == w.dim-1 {
		r = w.line()
	} else {
		r = w.slab(level)
	}
	for s := range w.slots {
		w.peaks[level][s] = math.Max(w.peaks[level][s], r.val[s])
	}
	return r
}

// slab integrates a middle level: like a line, but its integrand is continuous, so there is nothing to split.
func (w *worker) slab(level int) integral {
	w.middle, w.slabs = w.middle[:0], w.slabs[:0]
	w.out[level+1] = w.out[level+1][:0]
	cuts := w.cuts(level)
	for i, b := range cuts[1:] {
		w.placeSlab(level, cuts[i], b)
	}
	narrow := 1e-9 * (w.hi[level] - w.lo[level])
	for len(w.middle) < maxPieces {
		tol := w.tolerance(level, w.middle)
		i := worst(w.middle, &tol, w.slots, narrow)
		if i < 0 {
			break
		}
		c, last := w.middle[i], len(w.middle)-1
		w.middle[i], w.slabs[i] = w.middle[last], w.slabs[last]
		w.middle, w.slabs = w.middle[:last], w.slabs[:last]
		mid := (c.a + c.b) / 2
		w.placeSlab(level, c.a, mid)
		w.placeSlab(level, mid, c.b)
	}
	return w.closeSlab(level)
}

func (w *worker) placeSlab(level int, a, b float64) {
	p := slabPiece{}
	h, mid := (b-a)/2, (a+b)/2
	for i, u := range abscissa {
		w.x[w.order[level]] = mid + h*u
		p.nodes[i][0] = len(w.out[level+1])
		p.within[i] = w.integrateInto(level + 1)
		p.nodes[i][1] = len(w.out[level+1])
	}
	w.middle = append(w.middle, w.piece(a, b, &p.within))
	w.slabs = append(w.slabs, p)
}

// piece applies the rule to the integrals within, for any level but the innermost.
func (p *pass) piece(a, b float64, within *[points]integral) core {
	var f [points]vec
	var peak [points]float64
	for i := range within {
		f[i], peak[i] = within[i].val, within[i].peak
	}
	c := core{a: a, b: b}
	c.sumRule(&f, p.slots)
	if top, vertex, i := foreseen(&peak); vertex > top+hidden {
		// the levels within are as wide as at the neighbouring node; a factor e² allows for more
		guess := math.Exp(math.Min(vertex-top+2, 600)) * f[i][0]
		c.err[0] += guess * (b - a) / 2 * kronrod[i]
	}
	return c
}

// closeSlab adds up the pieces, with the errors from within, and hands on the nodes.
func (w *worker) closeSlab(level int) (sum integral) {
	sum.peak = math.Inf(-1)
	for i := range w.middle {
		c, p := &w.middle[i], &w.slabs[i]
		sum.add(c, &p.within, w.slots)
		if !w.record {
			continue
		}
		for k := range points {
			inner := w.out[level+1][p.nodes[k][0]:p.nodes[k][1]]
			w.out[level] = appendScaled(w.out[level], inner, w.order[level], (c.b-c.a)/2, k)
		}
	}
	return sum
}

// add accounts for one piece.
func (r *integral) add(c *core, within *[points]integral, slots int) {
	h := (c.b - c.a) / 2
	for s := range slots {
		r.val[s] += c.val[s]
		r.err[s] += c.err[s]
		for k := range within {
			r.err[s] += h * kronrod[k] * within[k].err[s]
		}
	}
	for k := range within {
		r.peak = math.Max(r.peak, within[k].peak)
	}
}

// appendScaled appends inner nodes to dst with the weights of node k of a piece of half-width h along axis.
func appendScaled(dst, inner []node, axis int, h float64, k int) []node {
	for _, n := range inner {
		n.w *= h * kronrod[k]
		n.coarse *= h * gauss[k]
		n.half[axis] = h * kronrod[k] / 2
		dst = append(dst, n)
	}
	return dst
}
