package quadrature

import (
	"context"
	"errors"
	"math"
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
	core
	f [points]float64
}

const (
	// atOnce is how many pieces of the outermost level are bisected before the errors are looked at again.
	// It is fixed, so that the number of workers has no say in what is evaluated.
	atOnce = 4
	// maxOuter bounds the pieces of the outermost level.
	maxOuter = 400
)

// run integrates with these workers.
func (p *pass) run(ctx context.Context, workers []*worker, maxEvals int) (o outcome, err error) {
	for _, w := range workers {
		w.pass, w.evals, w.peaks = p, 0, [3]vec{}
		w.hints, w.out = [2][]point{}, [3][]node{}
	}
	if p.dim == 1 {
		return p.runLine(workers[0])
	}
	l := level{pass: p, crew: workers}
	l.open(ctx)
	o.converged = l.refine(ctx, atOnce, maxOuter, maxEvals)
	if ctx.Err() != nil {
		return o, ctx.Err()
	}
	o.integral, o.nodes = l.result(nil)
	o.evals = evaluations(workers)
	for _, q := range l.pieces {
		c := curvePiece{core: q.core}
		for k := range q.within {
			c.f[k] = q.within[k].val[0]
		}
		o.curve = append(o.curve, c)
	}
	return o, checkFinite(workers)
}

// runLine is run for one coordinate.
func (p *pass) runLine(w *worker) (o outcome, err error) {
	o.integral = w.integrate(0)
	for i, c := range w.cores {
		q := curvePiece{core: c}
		for k := range q.f {
			q.f[k] = math.Exp(w.pieces[i].y[1+k] - p.ref)
		}
		o.curve = append(o.curve, q)
	}
	o.nodes, o.evals, o.converged = w.out[0], w.evals, len(w.cores) < maxPieces
	return o, checkFinite([]*worker{w})
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
