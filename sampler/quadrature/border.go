package quadrature

import (
	"cmp"
	"math"
	"slices"
)

// Further out than the innermost level the integrand is continuous, but it is not smooth where the support or
// a class begins: like a square root where a curved border touches the line within. Such a place is located
// by bisection and the level split there; the rule then runs on the square root of the distance from it
// (core.node). Near such a place the region is thinner than the spacing of the nodes within and would be
// missed: its centroid on the last line that saw it is handed on as a hint, a further cut for the lines to
// look at.

// mark is a sampled position in a piece.
type mark struct {
	t float64
	s *sample
}

// mark returns the i-th sampled position of a piece: its start, the nodes, its end.
func (q *piece) mark(i int) mark {
	switch i {
	case 0:
		return mark{q.a, &q.ends[0]}
	case points + 1:
		return mark{q.b, &q.ends[1]}
	}
	t, _ := q.node(i - 1)
	return mark{t, &q.within[i-1]}
}

// mostHints bounds the hints of a piece: each costs its lines a cut.
const mostHints = 3

// trace follows what is seen at one position of the piece to the positions beside it, where it may be too thin
// to be seen without a hint: one way and back.
func (l *level) trace(w *worker, q *piece) {
	const last = points + 1
	for step := range 2 * last {
		i := step
		if step >= last {
			i = 2*last - 1 - step
		}
		left, right := q.mark(i), q.mark(i+1)
		slots := l.uphill(left, right)
		if len(slots) == 0 {
			continue
		}
		hints := l.centroids(left, right, slots)
		if l.lookAgain(w, left, right, slots, hints) {
			q.hints = append(hints, q.hints...)[:min(mostHints, len(hints)+len(q.hints))]
		}
	}
}

// spread copies what tracing has found at the common end of two pieces from the one to the other, and takes
// out of the level the pieces that are to be looked at again because of it.
func (l *level) spread() (again []*piece) {
	slices.SortFunc(l.pieces, func(p, q *piece) int { return cmp.Compare(p.a, q.a) })
	learned := make(map[*piece]bool)
	for i := 1; i < len(l.pieces); i++ {
		p, q := l.pieces[i-1], l.pieces[i]
		if p.b != q.a || p.edgeB || q.edgeA {
			continue
		}
		switch left, right := &p.ends[1], &q.ends[0]; {
		case l.exceeds(left, right):
			*right, learned[q] = *left, true
		case l.exceeds(right, left):
			*left, learned[p] = *right, true
		}
	}
	keep := l.pieces[:0]
	for _, q := range l.pieces {
		if learned[q] {
			again = append(again, q)
		} else {
			keep = append(keep, q)
		}
	}
	l.pieces = keep
	return again
}

// split locates the borders inside a piece and returns the parts, or nil when there is nothing to split.
func (l *level) split(w *worker, q *piece, tol *vec) (parts []*piece) {
	if q.depth >= maxSplits || !l.mixed(q, tol) {
		return nil
	}
	from := &piece{core: core{a: q.a, edgeA: q.edgeA}, ends: [2]sample{q.ends[0]}, depth: q.depth + 1}
	if q.edgeA {
		from.hints = q.hints
	}
	left := q.mark(0)
	for k := range points + 1 {
		right := q.mark(k + 1)
		for range maxSplits {
			in, out, hints := l.border(w, left, right, tol)
			if hints == nil {
				break
			}
			from.b, from.edgeB, from.ends[1] = (in.t+out.t)/2, true, *in.s
			from.hints = slices.Concat(from.hints, hints)
			parts = append(parts, from)
			from = &piece{core: core{a: from.b, edgeA: true}, ends: [2]sample{*out.s}, depth: q.depth + 1, hints: hints}
			left = mark{from.a, out.s}
		}
		left = right
	}
	if parts == nil {
		return nil
	}
	from.b, from.edgeB, from.ends[1] = q.b, q.edgeB, q.ends[1]
	if q.edgeB {
		from.hints = slices.Concat(from.hints, q.hints)
	}
	return l.tidy(w, append(parts, from))
}

// mixed tells whether something begins or ends inside the piece that matters.
func (l *level) mixed(q *piece, tol *vec) bool {
	for i := range points + 1 {
		if len(l.differing(q.mark(i), q.mark(i+1), tol)) > 0 {
			return true
		}
	}
	return false
}

// negligible is the share of the tolerance that a misplaced border may cost.
const negligible = 0.01

// differing lists the slots that have mass on one side only, enough of it to matter.
func (l *level) differing(a, b mark, tol *vec) (slots []int) {
	for s := range l.slots {
		if a.s.has(s) != b.s.has(s) && (a.s.val[s]+b.s.val[s])*(b.t-a.t) > negligible*tol[s] {
			slots = append(slots, s)
		}
	}
	return slots
}

// uphill lists the slots that have mass on one side only, the one with less mass in all: however little that
// is, where the rest of the posterior grows they may grow unseen.
func (l *level) uphill(a, b mark) (slots []int) {
	for s := range l.slots {
		has, lacks := a.s, b.s
		if b.s.has(s) {
			has, lacks = b.s, a.s
		}
		if has.has(s) && !lacks.has(s) && (s == 0 || lacks.val[0] > has.val[0]) {
			slots = append(slots, s)
		}
	}
	return slots
}

// border bisects between two marks for the first place where something that matters begins or ends. It
// returns marks close to either side and hints to where the thing was last seen; no hints when there is no
// border.
func (l *level) border(w *worker, left, right mark, tol *vec) (in, out mark, hints []point) {
	slots := l.differing(left, right, tol)
	if len(slots) == 0 {
		return left, right, nil
	}
	narrow := 1e-12 * (l.hi[l.at] - l.lo[l.at])
	hints = l.centroids(left, right, slots)
	for range 45 {
		if right.t-left.t <= narrow || len(l.differing(left, right, tol)) == 0 {
			break
		}
		hints = l.centroids(left, right, slots)
		t := (left.t + right.t) / 2
		s := l.sample(w, t, hints)
		if l.alike(&s, left.s, slots) {
			left = mark{t, &s}
		} else {
			right = mark{t, &s}
		}
	}
	return left, right, hints
}

// lookAgain samples the sides where something is missing once more, with hints, and tells whether it is there.
func (l *level) lookAgain(w *worker, left, right mark, slots []int, hints []point) (found bool) {
	for _, m := range [...]mark{left, right} {
		for _, s := range slots {
			if m.s.has(s) {
				continue
			}
			if again := l.sample(w, m.t, hints); l.exceeds(&again, m.s) {
				*m.s, found = again, true
			}
			break
		}
	}
	return found
}

// exceeds tells whether a has seen all that b has, and more. Samples are only replaced by such, so that
// looking again comes to an end.
func (l *level) exceeds(a, b *sample) (more bool) {
	for s := range l.slots {
		if b.has(s) && !a.has(s) {
			return false
		}
		more = more || a.has(s) && !b.has(s)
	}
	return more
}

// alike tells whether two samples agree on which of the slots they have.
func (l *level) alike(a, b *sample, slots []int) bool {
	for _, s := range slots {
		if a.has(s) != b.has(s) {
			return false
		}
	}
	return true
}

// centroids returns the centre of each slot on the side that has it.
func (l *level) centroids(left, right mark, slots []int) (hints []point) {
	for _, s := range slots {
		from := left.s
		if !from.has(s) {
			from = right.s
		}
		if from.val[s] > 0 {
			p := from.moment[s]
			for i := range p {
				p[i] /= from.val[s]
			}
			hints = append(hints, p)
		}
	}
	return hints
}

// tidy drops parts without support and halves those with a border at both ends, which the rule cannot map.
func (l *level) tidy(w *worker, parts []*piece) (out []*piece) {
	for _, q := range parts {
		mid := (q.a + q.b) / 2
		if !(q.b > q.a) {
			continue
		}
		if !q.edgeA || !q.edgeB {
			out = append(out, q)
			continue
		}
		m := l.sample(w, mid, q.hints)
		if !q.ends[0].has(0) && !q.ends[1].has(0) && !m.has(0) {
			continue
		}
		out = append(out,
			&piece{core: core{a: q.a, b: mid, edgeA: true}, ends: [2]sample{q.ends[0], m}, hints: q.hints, depth: q.depth},
			&piece{core: core{a: mid, b: q.b, edgeB: true}, ends: [2]sample{m, q.ends[1]}, hints: q.hints, depth: q.depth})
	}
	return out
}

// hiddenMass bounds the height of a suspected peak, in units of the mode: little higher than the mode that
// was found, or extrapolation takes over.
func (p *pass) hiddenMass(bound float64) float64 {
	return math.Exp(math.Min(bound-p.ref, 3))
}
