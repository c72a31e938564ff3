package quadrature

import (
	"context"
	"errors"
	"math"
	"sync"
	"sync/atomic"
)

// outcome is what a pass yields.
type outcome struct {
	integral
	curve     []curvePiece // the marginal of the outermost coordinate
	nodes     []node
	evals     int
	converged bool
}

// curvePiece is a piece of a marginal: its values at the nodes of the rule.
type curvePiece struct {
	a, b float64
	f    [points]float64
}

// outerPiece is a piece of the outermost level, whose nodes are shared out among the workers.
type outerPiece struct {
	core
	within [points]integral
	nodes  [points][]node
}

// atOnce is how many pieces are bisected before the errors are looked at again. It is fixed, so that the
// number of workers has no say in what is evaluated.
const atOnce = 4

// run integrates. The workers fill slots of their own and everything is added up in the order of the pieces,
// so that the result is the same for any number of them.
func (p *pass) run(ctx context.Context, workers []*worker, maxEvals int) (outcome, error) {
	for _, w := range workers {
		w.pass, w.evals, w.peaks = p, 0, [3]vec{}
	}
	if p.dim == 1 {
		return p.runLine(workers[0])
	}
	cuts := workers[0].cuts(0)
	var pieces []*outerPiece
	for i, b := range cuts[1:] {
		pieces = append(pieces, &outerPiece{core: core{a: cuts[i], b: b}})
	}
	err := p.evaluate(ctx, workers, pieces)
	p.learn(workers)
	for err == nil {
		todo := p.next(pieces)
		if len(todo) == 0 || evaluations(workers) > maxEvals {
			o := p.collect(pieces)
			o.evals, o.converged = evaluations(workers), len(todo) == 0
			return o, checkFinite(workers)
		}
		var halves []*outerPiece
		pieces, halves = bisect(pieces, todo)
		err = p.evaluate(ctx, workers, halves)
	}
	return outcome{}, err
}

// runLine is run for one coordinate.
func (p *pass) runLine(w *worker) (o outcome, err error) {
	o.integral = w.integrate(0)
	for i, c := range w.cores {
		q := curvePiece{a: c.a, b: c.b}
		for k, l := range w.pieces[i].logp {
			q.f[k] = math.Exp(l - p.ref)
		}
		o.curve = append(o.curve, q)
	}
	o.nodes = append(o.nodes, w.out[0]...)
	o.evals, o.converged = w.evals, len(w.cores) < maxPieces
	return o, checkFinite([]*worker{w})
}

// evaluate fills the pieces: one task per node.
func (p *pass) evaluate(ctx context.Context, workers []*worker, pieces []*outerPiece) error {
	var next atomic.Int64
	var wg sync.WaitGroup
	for _, w := range workers {
		wg.Go(func() {
			for ctx.Err() == nil {
				t := int(next.Add(1)) - 1
				if t >= len(pieces)*points {
					return
				}
				q, k := pieces[t/points], t%points
				w.x[p.order[0]] = (q.a+q.b)/2 + (q.b-q.a)/2*abscissa[k]
				q.within[k] = w.integrate(1)
				q.nodes[k] = append([]node(nil), w.out[1]...)
			}
		})
	}
	wg.Wait()
	for _, q := range pieces {
		q.core = p.piece(q.a, q.b, &q.within)
	}
	return ctx.Err()
}

// learn takes the largest integrals of each level seen so far for the scale of that level.
func (p *pass) learn(workers []*worker) {
	for l := 1; l < p.dim; l++ {
		p.scale[l][0] = 0
		for _, w := range workers {
			for s := range p.slots {
				p.scale[l][s] = math.Max(p.scale[l][s], w.peaks[l][s])
			}
		}
	}
	p.scale[0] = vec{}
}

// next returns the indices of the pieces to bisect: the worst, and those nearly as bad.
func (p *pass) next(pieces []*outerPiece) (todo []int) {
	cores := make([]core, len(pieces))
	for i, q := range pieces {
		cores[i] = q.core
	}
	tol := p.tolerance(0, cores)
	for len(todo) < atOnce {
		i := worst(cores, &tol, p.slots, 1e-9*(p.hi[0]-p.lo[0]))
		if i < 0 {
			return todo
		}
		todo = append(todo, i)
		cores[i].err = vec{}
	}
	return todo
}

// bisect takes the pieces listed out and returns the rest, with their halves added at the end, and the halves.
func bisect(pieces []*outerPiece, todo []int) (all, halves []*outerPiece) {
	out := make(map[int]bool, len(todo))
	for _, i := range todo {
		q := pieces[i]
		mid := (q.a + q.b) / 2
		halves = append(halves, &outerPiece{core: core{a: q.a, b: mid}}, &outerPiece{core: core{a: mid, b: q.b}})
		out[i] = true
	}
	for i, q := range pieces {
		if !out[i] {
			all = append(all, q)
		}
	}
	return append(all, halves...), halves
}

func (p *pass) collect(pieces []*outerPiece) (o outcome) {
	o.peak = math.Inf(-1)
	for _, q := range pieces {
		o.add(&q.core, &q.within, p.slots)
		c := curvePiece{a: q.a, b: q.b}
		for k := range points {
			c.f[k] = q.within[k].val[0]
			o.nodes = appendScaled(o.nodes, q.nodes[k], p.order[0], (q.b-q.a)/2, k)
		}
		o.curve = append(o.curve, c)
	}
	return o
}

func evaluations(workers []*worker) (n int) {
	for _, w := range workers {
		n += w.evals
	}
	return n
}

func checkFinite(workers []*worker) error {
	for _, w := range workers {
		if w.infinite {
			return errors.New("the log-density is +Inf somewhere in the box: it has no finite integral that can be trusted")
		}
	}
	return nil
}
