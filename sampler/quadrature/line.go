package quadrature

import "math"

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
	t      [points]float64
	logp   [points]float64
	label  [points]int8
	la, lb int8    // labels just inside the ends
	end    float64 // the larger ln p there
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
		w.place(cuts[i], b, linePiece{la: la, lb: lb, end: math.Max(va, vb)}, 0)
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
		c, p := w.cores[i], w.pieces[i]
		last := len(w.cores) - 1
		w.cores[i], w.pieces[i] = w.cores[last], w.pieces[last]
		w.cores, w.pieces = w.cores[:last], w.pieces[:last]
		mid, label, end := (c.a+c.b)/2, p.label[points/2], math.Max(p.end, p.logp[points/2])
		w.place(c.a, mid, linePiece{la: p.la, lb: label, end: end}, 0)
		w.place(mid, c.b, linePiece{la: label, lb: p.lb, end: end}, 0)
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

// place samples the piece [a, b] and keeps it, after splitting it at the borders it contains.
func (w *worker) place(a, b float64, p linePiece, depth int) {
	h, mid := (b-a)/2, (a+b)/2
	mixed := p.la != p.lb
	for i, u := range abscissa {
		p.t[i] = mid + h*u
		p.logp[i], p.label[i] = w.at(p.t[i])
		mixed = mixed || p.label[i] != p.la
	}
	if mixed && depth < maxSplits && w.matters(&p, b-a) {
		w.splitLine(a, b, &p, depth)
		return
	}
	w.keep(a, b, &p)
}

// matters tells whether a border inside the piece could make a difference at the tolerance of the line.
func (w *worker) matters(p *linePiece, width float64) bool {
	top, _, _ := foreseen(&p.t, &p.logp)
	top = math.Max(top, p.end)
	least := w.tol[0]
	for s := 1; s < w.slots; s++ {
		least = math.Min(least, w.tol[s])
	}
	return math.Exp(top-w.ref)*width > 0.01*least
}

// splitLine finds the borders between neighbouring samples with different labels and places the parts. Parts
// without support need no samples.
func (w *worker) splitLine(a, b float64, p *linePiece, depth int) {
	from, left := a, a // start of the current part, latest point known to carry its label
	label, level := p.la, p.end
	for i := 0; i <= points; i++ {
		right, rl, rv := b, p.lb, p.end
		if i < points {
			right, rl, rv = p.t[i], p.label[i], p.logp[i]
		}
		for n := 0; rl != label && n < maxSplits; n++ {
			border, next := w.border(left, right, label, rl, math.Max(level, rv))
			w.part(from, border, label, depth)
			from, left, label = border, border, next
		}
		left, label, level = right, rl, rv
	}
	w.part(from, b, label, depth)
}

func (w *worker) part(a, b float64, label int8, depth int) {
	if label != outside && b > a {
		w.place(a, b, linePiece{la: label, lb: label, end: math.Inf(-1)}, depth+1)
	}
}

// border bisects between p, labelled lp, and q, labelled lq, until the mass in between does not matter, and
// returns the border and the label beyond it. Between two classes only the classifier is asked.
func (w *worker) border(p, q float64, lp, lq int8, logp float64) (t float64, beyond int8) {
	least := min(w.tol[0], w.tol[1+max(lp, 0)], w.tol[1+max(lq, 0)])
	enough := 0.01 * least / math.Exp(logp-w.ref)
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
func (w *worker) keep(a, b float64, p *linePiece) {
	var f [points]vec
	for i, l := range p.label {
		if l == outside {
			continue
		}
		f[i][0] = math.Exp(p.logp[i] - w.ref)
		if s := int(l) + 1; w.class != nil && s < w.slots {
			f[i][s] = f[i][0]
		}
	}
	c := core{a: a, b: b}
	c.sumRule(&f, w.slots)
	if top, bound, i := foreseen(&p.t, &p.logp); bound > top {
		c.err[0] += w.hiddenMass(bound) * (b - a) / 2 * kronrod[i]
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
		_, bound, _ := foreseen(&p.t, &p.logp)
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
	for i, l := range p.label {
		if l == outside || p.logp[i] < w.ref-faintest {
			continue
		}
		first := h * kronrod[i] * math.Exp(p.logp[i]-w.ref) * p.t[i]
		r.moment[0][axis] += first
		if w.class != nil {
			r.moment[l+1][axis] += first
		}
		if w.record {
			n := node{w: h * kronrod[i], coarse: h * gauss[i], logp: p.logp[i], label: l}
			copy(n.x[:], w.x)
			n.x[axis], n.half[axis] = p.t[i], h*kronrod[i]/2
			w.out[w.dim-1] = append(w.out[w.dim-1], n)
		}
	}
}
