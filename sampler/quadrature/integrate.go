package quadrature

import (
	"context"
	"fmt"
	"math"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// Result is a posterior integrated.
type Result struct {
	LogEvidence Estimate   // ln ∫ p over the box, with its absolute error
	Marginals   []Marginal // of each coordinate, or the first Options.Passes of them
	Classes     []Estimate // the probability of each class; see Problem.Class for what may be missed
	Nodes       *Nodes     // weighted points, for everything else
	Mode        []float64  // the most probable point found
	LogMode     float64    // ln p there
	Evaluations int        // of the density
	Warnings    []string   // what to know before using the numbers; nil when all went well
}

// Integrate integrates the density of p. The error is for a problem that cannot be integrated at all, or the
// context's; an integral that did not reach its tolerance comes with a warning and an honest larger error.
func Integrate(ctx context.Context, p Problem, o Options) (*Result, error) {
	if err := p.check(); err != nil {
		return nil, err
	}
	o, err := o.check()
	if err != nil {
		return nil, err
	}
	workers := make([]*worker, o.Workers)
	for i := range workers {
		workers[i] = &worker{density: p.Density(), x: make([]float64, len(p.Lo))}
	}
	s := search{density: workers[0].density, lo: p.Lo, hi: p.Hi, x: make([]float64, len(p.Lo))}
	mode, err := s.maximise(p.Start)
	if err != nil {
		return nil, err
	}
	r := &Result{LogMode: mode.v}
	for i, u := range mode.u {
		r.Mode = append(r.Mode, p.Lo[i]+u*(p.Hi[i]-p.Lo[i]))
	}
	g := s.shape(mode)
	if !s.gaussian(g) {
		if g, err = pilot(ctx, p, g, workers, r); err != nil {
			return nil, err
		}
	}
	r.Evaluations += s.evals
	return r, r.passes(ctx, p, o, g, workers)
}

// pilot integrates roughly, for the evidence and for mean and covariance.
func pilot(ctx context.Context, p Problem, g guess, workers []*worker, r *Result) (guess, error) {
	q := newPass(p, 0, g)
	q.record, q.relative = true, 0.01
	o, err := q.run(ctx, workers, 2_000_000)
	if err != nil {
		return g, err
	}
	r.Evaluations += o.evals
	n := newNodes(len(p.Lo), 0, q.ref, o.nodes)
	if n.Len() == 0 {
		return g, fmt.Errorf("the density at (%g) is finite, but it has no mass around it: %w", r.Mode, ErrNoSupport)
	}
	g.mean, g.cov = n.moments()
	g.mass = o.val[0]
	for i := range g.mean { // never so narrow that a cut cannot be told from its neighbour
		least := 1e-9 * (p.Hi[i] - p.Lo[i])
		g.cov.SetSym(i, i, math.Max(g.cov.At(i, i), least*least))
	}
	return g, nil
}

// passes integrates with each coordinate outermost in turn. Classes and nodes come from the first; the others
// yield their marginals and check its evidence: where they differ by more than the error, that is the error.
func (r *Result) passes(ctx context.Context, p Problem, o Options, g guess, workers []*worker) error {
	var logs []float64
	for i := range p.Lo {
		if o.Passes > 0 && i >= o.Passes {
			break
		}
		q := newPass(p, i, g)
		q.relative, q.relativeClass, q.rarest = o.Tolerance, o.ClassTolerance, o.Rarest
		if i == 0 {
			q.record, q.class, q.slots = true, p.Class, 1+p.Classes
		}
		out, err := q.run(ctx, workers, o.MaxEvaluations)
		if err != nil {
			return err
		}
		r.Evaluations += out.evals
		relative := out.err[0] / out.val[0]
		if i == 0 {
			relative += slack * o.Tolerance
			r.LogEvidence = Estimate{q.ref + math.Log(out.val[0]), relative}
			r.Nodes = newNodes(len(p.Lo), p.Classes, q.ref, out.nodes)
			r.classes(&out, p.Classes, o)
			p.Lo, p.Hi = r.Nodes.bounds(p.Lo, p.Hi, r.LogMode-clip)
		}
		logs = append(logs, q.ref+math.Log(out.val[0]))
		r.Marginals = append(r.Marginals, marginalOf(out.curve, relative))
		r.check(i, &out, o, relative)
		if i == 0 && o.Enough != nil && !o.Enough(r.Classes) {
			break
		}
	}
	for _, l := range logs {
		r.LogEvidence.Err = math.Max(r.LogEvidence.Err, math.Abs(l-r.LogEvidence.Value))
	}
	return nil
}

// slack is the share of the tolerance that misplaced borders and what lies in the gaps between pieces may cost,
// which no rule sees.
const slack = 0.1

// clip is how far below the mode, in ln p, the passes after the first stop looking: 6.6 standard deviations of
// a Gaussian, beyond which there is 4e-11 of it. The first pass has searched the rest.
const clip = 22

// bounds returns the part of the box where nodes lie above a level of ln p, with their tiles and a little more.
func (n *Nodes) bounds(lo, hi []float64, level float64) (l, h []float64) {
	l, h = slices.Clone(hi), slices.Clone(lo)
	for k := range n.Len() {
		if n.LogP[k] < level {
			continue
		}
		for i, x := range n.At(k) {
			half := 2 * n.half[k*n.dim+i]
			l[i], h[i] = math.Min(l[i], x-half), math.Max(h[i], x+half)
		}
	}
	for i := range l {
		l[i], h[i] = math.Max(l[i], lo[i]), math.Min(h[i], hi[i])
	}
	return l, h
}

// classes turns masses into probabilities. The error of the total counts for the ratio too.
func (r *Result) classes(out *outcome, n int, o Options) {
	for c := range n {
		p := out.val[1+c] / out.val[0]
		err := out.err[1+c]/out.val[0] + p*out.err[0]/out.val[0]
		r.Classes = append(r.Classes, Estimate{p, math.Max(err, o.ClassTolerance*o.Rarest)})
	}
}

func (r *Result) check(coordinate int, out *outcome, o Options, relative float64) {
	if out.converged && relative < 10*o.Tolerance {
		return
	}
	r.Warnings = append(r.Warnings, fmt.Sprintf("integration with coordinate %d outermost stopped at a relative error of %.1g "+
		"after %d evaluations, %.1g was asked for: allow more evaluations or narrow the box",
		coordinate, relative, out.evals, o.Tolerance))
}

// moments returns mean and covariance of the nodes.
func (n *Nodes) moments() (mean []float64, cov *mat.SymDense) {
	mean, cov = make([]float64, n.dim), mat.NewSymDense(n.dim, nil)
	for k := range n.Len() {
		for i, x := range n.At(k) {
			mean[i] += n.Weight[k] * x
		}
	}
	for k := range n.Len() {
		x := n.At(k)
		for i := range x {
			for j := range i + 1 {
				cov.SetSym(i, j, cov.At(i, j)+n.Weight[k]*(x[i]-mean[i])*(x[j]-mean[j]))
			}
		}
	}
	return mean, cov
}
