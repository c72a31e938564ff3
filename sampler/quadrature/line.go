package quadrature

import (
	"math"
	"slices"
)

// outside is the label of a point without support; the others are classes (0 when there are none asked for).
const outside int8 = -1

// maxSplits bounds how often one piece of a line is split at borders that earlier splits did not show.
const maxSplits = 4

// node is one point of a rule with all the weights it has collected on the way out.
type node struct {
	x, half   point   // position, and half the extent the node stands for, in the caller's order
	w, coarse float64 // weight of the Kronrod and of the embedded Gauss rule
	logp      float64
	label     int8
}

// linePiece is a piece of an innermost line: the samples behind its core.
type linePiece struct {
	profile
	label [points + 2]int8
}

// newLinePiece is a piece of which only the ends are known.
func newLinePiece(a, b, va, vb float64, la, lb int8) (p linePiece) {
	const last = points + 1
	p.t[0], p.y[0], p.label[0] = a, va, la
	p.t[last], p.y[last], p.label[last] = b, vb, lb
	return p
}

// line integrates along the innermost coordinate, the others being fixed in w.x.
func (w *worker) line() integral {
	level := w.dim - 1
	w.cores, w.pieces = w.cores[:0], w.pieces[:0]
	w.tol = w.tolerance(level, nil)
	cuts := w.cuts(level)
	nudge := 1e-9 * (cuts[len(cuts)-1] - cuts[0])
	va, la := w.at(cuts[0] + nudge)
	for i, b := range cuts[1:] {
		edge := b
		if i == len(cuts)-2 {
			edge -= nudge // a density may exclude the edge of its own box
		}
		vb, lb := w.at(edge)
		w.place(newLinePiece(cuts[i], b, va, vb, la, lb), 0)
		va, la = vb, lb
	}
	w.refineLine(level)
	return w.closeLine()
}

// refineLine bisects the worst piece until the errors are within tolerance or the line has too many pieces.
func (w *worker) refineLine(level int) {
	narrow := 1e-11 * (w.hi[level] - w.lo[level])
	for len(w.cores) < maxPieces {
		tol := w.tolerance(level, w.cores)
		i := worst(w.cores, &tol, w.slots, narrow)
		if i < 0 {
			return
		}
		p, last := w.pieces[i], len(w.cores)-1
		w.cores[i], w.pieces[i] = w.cores[last], w.pieces[last]
		w.cores, w.pieces = w.cores[:last], w.pieces[:last]
		const mid, end = 1 + points/2, points + 1
		w.place(newLinePiece(p.t[0], p.t[mid], p.y[0], p.y[mid], p.label[0], p.label[mid]), 0)
		w.place(newLinePiece(p.t[mid], p.t[end], p.y[mid], p.y[end], p.label[mid], p.label[end]), 0)
	}
}

// at evaluates the log-density and the label at t on the line.
func (w *worker) at(t float64) (logp float64, label int8) {
	w.x[w.order[w.dim-1]] = t
	w.evals++
	logp = w.density(w.x)
	if math.IsNaN(logp) || math.IsInf(logp, -1) {
		return math.Inf(-1), outside
	}
	if math.IsInf(logp, 1) {
		w.infinite = true
		return math.Inf(-1), outside
	}
	return logp, w.classOf()
}

// classOf returns the class at w.x: one without a slot for a point that belongs to none.
func (w *worker) classOf() int8 {
	if w.class == nil {
		return 0
	}
	if c := w.class(w.x); c >= 0 && c < w.slots-1 {
		return int8(c)
	}
	return int8(w.slots - 1)
}

// place samples a piece of which the ends are known and keeps it, after splitting it at the borders it
// contains.
func (w *worker) place(p linePiece, depth int) {
	a, b := p.t[0], p.t[points+1]
	mixed := p.label[0] != p.label[points+1]
	for i, u := range abscissa {
		t := (a+b)/2 + (b-a)/2*u
		p.t[1+i] = t
		p.y[1+i], p.label[1+i] = w.at(t)
		mixed = mixed || p.label[1+i] != p.label[0]
	}
	if mixed && depth < maxSplits && w.matters(&p) {
		w.splitLine(&p, depth)
		return
	}
	w.keep(&p)
}

// matters tells whether a border inside the piece could make a difference at the tolerance of the line.
func (w *worker) matters(p *linePiece) bool {
	least := w.tol[0]
	for s := 1; s < w.slots; s++ {
		least = math.Min(least, w.tol[s])
	}
	return math.Exp(slices.Max(p.y[:])-w.ref)*(p.t[points+1]-p.t[0]) > negligible*least
}

// splitLine finds the borders between neighbouring samples with different labels and places the parts. Parts
// without support need no samples.
func (w *worker) splitLine(p *linePiece, depth int) {
	from, at, value, label := p.t[0], p.t[0], p.y[0], p.label[0]
	start := value // at from
	part := func(to, end float64) {
		if label != outside && to > from {
			w.place(newLinePiece(from, to, start, end, label, label), depth+1)
		}
	}
	for i := 1; i < len(p.t); i++ {
		for n := 0; p.label[i] != label && n < maxSplits; n++ {
			border, next := w.border(at, p.t[i], label, p.label[i], math.Max(value, p.y[i]))
			part(border, math.Inf(-1))
			from, at, label, start = border, border, next, math.Inf(-1)
		}
		at, value, label = p.t[i], p.y[i], p.label[i]
	}
	part(p.t[points+1], p.y[points+1])
}

// border bisects between p, labelled lp, and q, labelled lq, until the mass in between does not matter, and
// returns the border and the label beyond it. Between two classes only the classifier is asked.
func (w *worker) border(p, q float64, lp, lq int8, logp float64) (t float64, beyond int8) {
	least := min(w.tol[0], w.tol[1+max(lp, 0)], w.tol[1+max(lq, 0)])
	enough := negligible * least / math.Exp(logp-w.ref)
	for n := 0; n < 50 && q-p > enough; n++ {
		t = (p + q) / 2
		var l int8
		if lp == outside || lq == outside {
			_, l = w.at(t)
		} else {
			w.x[w.order[w.dim-1]] = t
			l = w.classOf()
		}
		if l == lp {
			p = t
		} else {
			q, lq = t, l
		}
	}
	return (p + q) / 2, lq
}

// keep computes the integrals of a sampled piece and adds it to the line.
func (w *worker) keep(p *linePiece) {
	var f [points]vec
	for i := range f {
		l := p.label[1+i]
		if l == outside {
			continue
		}
		f[i][0] = math.Exp(p.y[1+i] - w.ref)
		if w.class != nil {
			f[i][l+1] = f[i][0]
		}
	}
	c := core{a: p.t[0], b: p.t[points+1]}
	c.sumRule(&f, w.slots)
	if top, bound, i := p.foreseen(); bound > top {
		c.err[0] += w.hiddenMass(bound) * (p.t[i] - p.t[i-1])
	}
	w.cores, w.pieces = append(w.cores, c), append(w.pieces, *p)
}

// closeLine adds up the pieces and hands on their nodes.
func (w *worker) closeLine() (r integral) {
	r.peak = math.Inf(-1)
	axis := w.order[w.dim-1]
	for i := range w.cores {
		c, p := &w.cores[i], &w.pieces[i]
		for s := range w.slots {
			r.val[s] += c.val[s]
			r.err[s] += c.err[s]
		}
		_, bound, _ := p.foreseen()
		r.peak = math.Max(r.peak, math.Min(bound, w.ref+3))
		w.closePiece(c, p, &r, axis)
	}
	return r
}

// faintest is how far below the mode, in ln p, a node may lie before it is of no use to anybody.
const faintest = 60

// closePiece adds the moments of a piece and hands on its nodes.
func (w *worker) closePiece(c *core, p *linePiece, r *integral, axis int) {
	h := (c.b - c.a) / 2
	for i := range points {
		l, v, t := p.label[1+i], p.y[1+i], p.t[1+i]
		if l == outside || v < w.ref-faintest {
			continue
		}
		first := h * kronrod[i] * math.Exp(v-w.ref) * t
		r.moment[0][axis] += first
		if w.class != nil {
			r.moment[l+1][axis] += first
		}
		if w.record {
			n := node{w: h * kronrod[i], coarse: h * gauss[i], logp: v, label: l}
			copy(n.x[:], w.x)
			n.x[axis], n.half[axis] = t, h*kronrod[i]/2
			w.out[w.dim-1] = append(w.out[w.dim-1], n)
		}
	}
}
