package quadrature

import (
	"context"
	"math"
	"slices"
	"sync"
	"sync/atomic"
)

// point is a place in the box, in the caller's order.
type point [3]float64

// integral is what a level hands to the level outside it. The errors include those of the levels within;
// moment is ∫ x p for each slot, and peak the largest ln p met or foreseen.
type integral struct {
	val, err vec
	moment   [len(vec{})]point
	peak     float64
}

// has tells whether a slot has any mass; for the whole, whether there is support at all.
func (r *integral) has(slot int) bool {
	return r.val[slot] > 0 || (slot == 0 && !math.IsInf(r.peak, -1))
}

// sample is the integral within at one node of a level, and the weighted points it was made of.
type sample struct {
	integral
	nodes []node
}

// piece is a piece of any level but the innermost.
type piece struct {
	core
	within  [points]sample
	ends    [2]sample // just inside the ends
	hints   []point   // where to look for what is thin in the piece
	depth   int       // splits at borders behind it
	sampled bool
}

// level integrates any level but the innermost. The crew is all workers at the outermost level, and the one
// worker itself within: each integral is computed by one worker and everything is added up in the order of
// the pieces, so that the result is the same for any number of workers.
type level struct {
	*pass
	at     int
	crew   []*worker
	pieces []*piece
}

// do runs n tasks, shared out among the crew.
func (l *level) do(ctx context.Context, n int, task func(w *worker, i int)) {
	if len(l.crew) == 1 {
		for i := 0; i < n && ctx.Err() == nil; i++ {
			task(l.crew[0], i)
		}
		return
	}
	var next atomic.Int64
	var wg sync.WaitGroup
	for _, w := range l.crew {
		wg.Go(func() {
			for ctx.Err() == nil {
				i := int(next.Add(1)) - 1
				if i >= n {
					return
				}
				task(w, i)
			}
		})
	}
	wg.Wait()
}

// sample integrates the levels within at t.
func (l *level) sample(w *worker, t float64, hints []point) sample {
	w.x[l.order[l.at]] = t
	w.hints[l.at] = hints
	from := len(w.out[l.at+1])
	if l.at == 0 {
		from, w.out[1] = 0, w.out[1][:0]
	}
	s := sample{integral: w.integrate(l.at + 1)}
	s.nodes = w.out[l.at+1][from:]
	if l.at == 0 {
		s.nodes = slices.Clone(s.nodes)
	}
	return s
}

// open places the first pieces: between the cuts.
func (l *level) open(ctx context.Context) {
	cuts := slices.Clone(l.crew[0].cuts(l.at))
	last := len(cuts) - 1
	nudge := 1e-9 * (cuts[last] - cuts[0])
	ends := make([]sample, len(cuts))
	l.do(ctx, len(cuts), func(w *worker, i int) {
		t := cuts[i]
		switch i { // a density may exclude the edge of its own box
		case 0:
			t += nudge
		case last:
			t -= nudge
		}
		ends[i] = l.sample(w, t, nil)
	})
	var pieces []*piece
	for i, b := range cuts[1:] {
		pieces = append(pieces, &piece{core: core{a: cuts[i], b: b}, ends: [2]sample{ends[i], ends[i+1]}})
	}
	l.place(ctx, pieces)
}

// place samples the pieces and keeps them, after splitting those that contain a border. What is found at the
// end of a piece may have been missed beside it: then the neighbour is looked at again.
func (l *level) place(ctx context.Context, pieces []*piece) {
	for len(pieces) > 0 {
		l.fill(ctx, pieces)
		if ctx.Err() != nil {
			return
		}
		if l.at == 0 && len(l.pieces) == 0 {
			l.learn(l.crew)
		}
		for _, q := range pieces {
			l.sum(q)
		}
		tol := l.tolerance(l.at, slices.Concat(l.cores(), coresOf(pieces)))
		parts := make([][]*piece, len(pieces))
		l.do(ctx, len(pieces), func(w *worker, i int) {
			l.trace(w, pieces[i])
			parts[i] = l.split(w, pieces[i], &tol)
		})
		pieces = append(l.sort(pieces, parts), l.spread()...)
	}
}

// fill samples the pieces that are not sampled yet.
func (l *level) fill(ctx context.Context, pieces []*piece) {
	var fresh []*piece
	for _, q := range pieces {
		if !q.sampled {
			q.sampled = true
			fresh = append(fresh, q)
		}
	}
	l.do(ctx, len(fresh)*points, func(w *worker, i int) {
		q, k := fresh[i/points], i%points
		t, _ := q.node(k)
		q.within[k] = l.sample(w, t, q.hints)
	})
}

// sort keeps the pieces that were not split and returns the parts of the others.
func (l *level) sort(pieces []*piece, parts [][]*piece) (fresh []*piece) {
	for i, q := range pieces {
		if parts[i] == nil {
			l.sum(q) // again: looking for a border may have bettered a sample
			l.pieces = append(l.pieces, q)
		}
		fresh = append(fresh, parts[i]...)
	}
	return fresh
}

func coresOf(pieces []*piece) []core {
	c := make([]core, len(pieces))
	for i, q := range pieces {
		c[i] = q.core
	}
	return c
}

func (l *level) cores() []core { return coresOf(l.pieces) }

// sum applies the rule to the integrals within.
func (l *level) sum(q *piece) {
	var f [points]vec
	p := profile{}
	p.t[0], p.t[points+1] = q.a, q.b
	p.y[0], p.y[points+1] = q.ends[0].peak, q.ends[1].peak
	for k := range q.within {
		f[k] = q.within[k].val
		p.t[1+k], _ = q.node(k)
		p.y[1+k] = q.within[k].peak
	}
	q.sumRule(&f, l.slots)
	if top, bound, i := p.foreseen(); bound > top {
		q.err[0] += l.hiddenMass(bound) * l.scale[l.at+1][0] * (p.t[i] - p.t[i-1])
	}
}

// refine bisects the worst pieces, several at once, until the errors are within tolerance, the pieces too
// many, or there have been enough evaluations. It reports whether the tolerance was reached.
func (l *level) refine(ctx context.Context, atOnce, maxPieces, maxEvals int) bool {
	narrow := 1e-9 * (l.hi[l.at] - l.lo[l.at])
	for ctx.Err() == nil {
		cores := l.cores()
		tol := l.tolerance(l.at, cores)
		bad := make(map[int]bool)
		for len(bad) < atOnce {
			i := worst(cores, &tol, l.slots, narrow)
			if i < 0 {
				break
			}
			bad[i], cores[i].err = true, vec{}
		}
		if len(bad) == 0 {
			return true
		}
		if len(l.pieces) > maxPieces || evaluations(l.crew) > maxEvals {
			return false
		}
		l.bisect(ctx, bad)
	}
	return false
}

// bisect replaces pieces by their halves.
func (l *level) bisect(ctx context.Context, bad map[int]bool) {
	var keep, halves []*piece
	for i, q := range l.pieces {
		if bad[i] {
			halves = append(halves, q.halves()...)
		} else {
			keep = append(keep, q)
		}
	}
	l.pieces = keep
	l.place(ctx, halves)
}

// halves bisects a piece at its middle node.
func (q *piece) halves() []*piece {
	mid, _ := q.node(points / 2)
	m := q.within[points/2]
	return []*piece{
		{core: core{a: q.a, b: mid, edgeA: q.edgeA}, ends: [2]sample{q.ends[0], m}, hints: q.hints, depth: q.depth},
		{core: core{a: mid, b: q.b, edgeB: q.edgeB}, ends: [2]sample{m, q.ends[1]}, hints: q.hints, depth: q.depth},
	}
}

// result adds up the pieces, with the errors from within, and returns the points with their weights so far.
func (l *level) result(nodes []node) (integral, []node) {
	r := integral{peak: math.Inf(-1)}
	axis := l.order[l.at]
	for _, q := range l.pieces {
		for s := range l.slots {
			r.val[s] += q.val[s]
			r.err[s] += q.err[s]
		}
		for k := range q.within {
			s := &q.within[k]
			t, scale := q.node(k)
			r.gather(&s.integral, axis, t, kronrod[k]*scale, l.slots)
			for _, n := range s.nodes {
				n.w *= scale * kronrod[k]
				n.coarse *= scale * gauss[k]
				n.half[axis] = scale * kronrod[k] / 2
				nodes = append(nodes, n)
			}
		}
	}
	return r, nodes
}

// gather adds what is inherited from an integral within of weight w at t: errors, moments, peak.
func (r *integral) gather(s *integral, axis int, t, w float64, slots int) {
	r.peak = math.Max(r.peak, s.peak)
	for i := range slots {
		r.err[i] += w * s.err[i]
		for j := range r.moment[i] {
			r.moment[i][j] += w * s.moment[i][j]
		}
		r.moment[i][axis] += w * s.val[i] * t
	}
}
