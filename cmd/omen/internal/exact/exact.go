// Package exact integrates a posterior of up to three free parameters by
// quadrature: evidence, marginals, and the probability of whatever can be said of a
// universe, however rare, without luck.
package exact

import (
	"context"
	"errors"
	"fmt"
	"math"
	"slices"
	"sync"
	"time"

	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/model"
	"omen/sampler"
	"omen/sampler/quadrature"
)

// Most is the largest number of free parameters.
const Most = 3

// Posterior is a posterior that was integrated.
type Posterior struct {
	Space       *likelihood.Space
	Best        []float64 // the point of highest density
	LogBest     float64   // ln p there
	LogEvidence quadrature.Estimate
	Nodes       *quadrature.Nodes // in coordinates of the integral
	Evaluations int
	Seconds     float64
	Warnings    []string

	frame   *frame                // of the coordinates of Nodes, nil where they are the parameters
	labels  []outlook.Label       // by class
	classes []quadrature.Estimate // their probabilities
	rare    []rareNodes           // what belongs to no class

	once      sync.Once
	thin      *quadrature.Nodes            // without the lightest
	marginals []func() quadrature.Marginal // of the free parameters
}

type rareNodes struct {
	label  outlook.Label
	weight float64
}

// options returns how hard to try in so many dimensions: to 1e-6 where that is
// cheap; in three, to the errors that a print could show. In a frame no marginal is
// that of a parameter.
func options(dim, threads int, framed bool) quadrature.Options {
	o := quadrature.DefaultOptions()
	o.Workers = threads
	if dim == 3 {
		o.Tolerance, o.ClassTolerance = 1e-4, 3e-3
		o.MaxEvaluations = 4_000_000
	}
	if framed {
		o.Passes = 1
	}
	return o
}

// Integrate integrates a posterior of one to three free parameters. start is a good
// point, nil if none is known.
func Integrate(ctx context.Context, p *likelihood.Posterior, start []float64, threads int) (*Posterior, error) {
	return attempt(ctx, p, start, threads, nil)
}

// Try is Integrate for who has another way: it ends early where some probability is
// [Posterior.Unresolved], and the result then is good for nothing else.
func Try(ctx context.Context, p *likelihood.Posterior, start []float64, threads int) (*Posterior, error) {
	return attempt(ctx, p, start, threads, func(classes []quadrature.Estimate) bool { return unresolved(classes) == 0 })
}

func attempt(ctx context.Context, p *likelihood.Posterior, start []float64, threads int, enough func([]quadrature.Estimate) bool) (*Posterior, error) {
	begun := time.Now()
	space := p.Space()
	if d := space.Dim(); d < 1 || d > Most {
		return nil, fmt.Errorf("quadrature goes from 1 to %d free parameters, not to %d", Most, d)
	}
	e := &Posterior{Space: space, labels: labels(space)}
	if space.Dim() == Most {
		e.straighten(p, start)
	}
	once := func() (*quadrature.Result, error) {
		o := options(space.Dim(), threads, e.frame != nil)
		o.Enough = enough
		return quadrature.Integrate(ctx, e.problem(p, start), o)
	}
	r, err := once()
	for tries := 0; err == nil && e.frame != nil && e.cut(r); tries++ {
		e.frame = e.frame.wider(tries) // it let something of the posterior out
		r, err = once()
	}
	if err != nil {
		return nil, err
	}
	e.take(r)
	e.gatherRare()
	e.Seconds = time.Since(begun).Seconds()
	return e, nil
}

// straighten looks for a frame.
func (e *Posterior) straighten(p *likelihood.Posterior, start []float64) {
	lo, hi := e.Space.Box()
	density := p.Evaluator().LogDensity
	best, _, err := sampler.Maximise(density, lo, hi, 1)
	if err != nil {
		return
	}
	if start != nil && density(start) > density(best) {
		best = start
	}
	e.frame = newFrame(density, best, lo, hi)
}

// problem is the integral to do, in the frame if there is one.
func (e *Posterior) problem(p *likelihood.Posterior, start []float64) quadrature.Problem {
	lo, hi := e.Space.Box()
	q := quadrature.Problem{Lo: lo, Hi: hi, Start: start, Classes: len(e.labels), Class: e.class,
		Density: func() quadrature.Density { return p.Evaluator().LogDensity }}
	if f := e.frame; f != nil {
		q.Start = make([]float64, len(lo))
		q.Hi, q.Lo = f.extent, make([]float64, len(lo))
		for i, x := range f.extent {
			q.Lo[i] = -x
		}
		q.Density = func() quadrature.Density {
			density := p.Evaluator().LogDensity
			x := make([]float64, len(lo))
			return func(u []float64) float64 {
				f.at(x, u)
				return density(x)
			}
		}
	}
	return q
}

// cut reports whether the density is still there at the faces of the frame's box.
func (e *Posterior) cut(r *quadrature.Result) bool {
	for i := range r.Nodes.Len() {
		if r.Nodes.LogP[i] < r.LogMode-reach*reach/2+3 {
			continue
		}
		for k, u := range r.Nodes.At(i) {
			if math.Abs(u) > 0.985*e.frame.extent[k] {
				return true
			}
		}
	}
	return false
}

// rough is the relative error of an integral of which the reader must know: below it no
// printed digit suffers.
const rough = 2e-3

// take takes a result over, from the frame back to the parameters.
func (e *Posterior) take(r *quadrature.Result) {
	e.Best, e.LogBest, e.LogEvidence = r.Mode, r.LogMode, r.LogEvidence
	e.Nodes, e.Evaluations, e.classes = r.Nodes, r.Evaluations, r.Classes
	if err := r.LogEvidence.Err; err > rough {
		e.Warnings = append(e.Warnings, fmt.Sprintf("the integral is only known to a relative %.1g after %d evaluations: take no more of its digits, narrow the priors, or rely on the chain", err, r.Evaluations))
	}
	if e.frame == nil {
		for _, m := range r.Marginals {
			e.marginals = append(e.marginals, func() quadrature.Marginal { return m })
		}
		return
	}
	e.LogEvidence.Value += e.frame.logVolume()
	e.Best = e.point(r.Mode)
	for i := range e.Best {
		e.marginals = append(e.marginals, sync.OnceValue(func() quadrature.Marginal { return e.framed(i) }))
	}
}

// Marginal is the distribution of the i-th free parameter.
func (e *Posterior) Marginal(i int) quadrature.Marginal { return e.marginals[i]() }

// framed is the marginal of a parameter by the nodes of a frame.
func (e *Posterior) framed(i int) quadrature.Marginal {
	m, err := e.thinned().Marginal(func(u []float64) float64 {
		x := e.frame.centre[i]
		for k := range i + 1 {
			x += e.frame.l.At(i, k) * u[k]
		}
		return x
	})
	if err != nil {
		m.Mean, m.SD = math.NaN(), math.NaN()
	}
	return m
}

// Fine reports whether the nodes are fine enough for the distributions of derived
// quantities, which come from them alone: not where three parameters are integrated
// without a frame. The ends of intervals are off by up to a tenth of the width there
// (measured on posteriors that their priors cut), while means and the marginals of
// the parameters are not.
func (e *Posterior) Fine() bool { return e.frame != nil || e.Space.Dim() < Most }

// Unresolved is the largest error of the probability of a class that is no better than
// that of a chain; 0 if all are known well enough. They are not where the evaluations
// that are allowed ended before the borders between the classes were found.
func (e *Posterior) Unresolved() float64 { return unresolved(e.classes) }

func unresolved(classes []quadrature.Estimate) float64 {
	worst := 0.0
	for _, c := range classes {
		switch {
		case math.IsNaN(c.Err):
			return math.Inf(1)
		case c.Err > 2e-3+0.01*math.Min(c.Value, 1-c.Value):
			worst = math.Max(worst, c.Err)
		}
	}
	return worst
}

// point is the parameters at coordinates of the integral.
func (e *Posterior) point(u []float64) []float64 {
	if e.frame == nil {
		return u
	}
	x := make([]float64, len(u))
	e.frame.at(x, u)
	return x
}

// universe fills the point of the universe at coordinates of the integral.
func (e *Posterior) universe(u []float64, p *likelihood.Point) {
	if e.frame == nil {
		e.Space.Point(u, p)
		return
	}
	var x [Most]float64
	e.frame.at(x[:len(u)], u)
	e.Space.Point(x[:len(u)], p)
}

// NoSupport reports an error that says that no point with a finite density was
// found.
func NoSupport(err error) bool { return errors.Is(err, quadrature.ErrNoSupport) }

// class is the place of the label at x among the labels, -1 for a rare one.
func (e *Posterior) class(x []float64) int {
	var p likelihood.Point
	e.universe(x, &p)
	return slices.Index(e.labels, outlook.LabelOf(p.Universe))
}

// classesMost is how many classes quadrature keeps apart.
const classesMost = 15

// labels lists the labels that the universes of a space have, the commonest first, by a look at the box. Those that
// it misses are found at the nodes.
func labels(space *likelihood.Space) []outlook.Label {
	var list []outlook.Label
	var count []int
	var p likelihood.Point
	outlook.Spread(space, 4000, func(x []float64) {
		space.Point(x, &p)
		if !space.Allows(&p.Universe) {
			return
		}
		l := outlook.LabelOf(p.Universe)
		i := slices.Index(list, l)
		if i < 0 {
			list, count = append(list, l), append(count, 0)
			i = len(list) - 1
		}
		count[i]++
	})
	order := make([]int, len(list))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return count[b] - count[a] })
	var out []outlook.Label
	for _, i := range order[:min(len(order), classesMost)] {
		out = append(out, list[i])
	}
	if out == nil { // nothing is allowed: integration will say so
		out = []outlook.Label{{}}
	}
	return out
}

func (e *Posterior) gatherRare() {
	var p likelihood.Point
	for i, c := range e.Nodes.Class {
		if c >= 0 {
			continue
		}
		e.universe(e.Nodes.At(i), &p)
		e.rare = append(e.rare, rareNodes{outlook.LabelOf(p.Universe), e.Nodes.Weight[i]})
	}
}

// rarest is the probability below which integration promises nothing.
var rarest = quadrature.DefaultOptions().Rarest

// unsplit is the relative error of what is summed over nodes without its borders being
// found: they are known to about a tile.
const unsplit = 0.1

// Probability of a statement, with the error of the integral. What is below the
// rarest that is looked for becomes a limit.
func (e *Posterior) Probability(holds func(outlook.Label) bool) outlook.Share {
	var yes, no quadrature.Estimate
	add := func(l outlook.Label, p, err float64) {
		sum := &no
		if holds(l) {
			sum = &yes
		}
		sum.Value += p
		sum.Err += err
	}
	for i, c := range e.classes {
		add(e.labels[i], c.Value, c.Err)
	}
	for _, r := range e.rare {
		add(r.label, r.weight, unsplit*r.weight)
	}
	family := e.Space.Family()
	fails := func(l outlook.Label) bool { return !holds(l) }
	return share(yes, no, outlook.Possible(family, holds), outlook.Possible(family, fails))
}

// share takes the error from the rarer side, and 1 - p where that is the exact one.
// What is possible and yet has no mass at any node is not zero but below what was
// looked for. Where the error leaves either side open it is no limit that must be told.
func share(yes, no quadrature.Estimate, canHold, canFail bool) outlook.Share {
	s := outlook.Share{P: yes.Value, Err: min(yes.Err, no.Err), Upper: math.NaN(), Lower: math.NaN()}
	if no.Value < yes.Value {
		s.P = 1 - no.Value
	}
	limit := func(p float64) float64 { return min(max(rarest, p+2*s.Err), 1) }
	small := func(p float64) bool { return p < rarest || p < 3*s.Err }
	switch {
	case yes.Value == 0 && !canHold, no.Value == 0 && !canFail: // exactly
	case small(yes.Value) && small(no.Value):
	case small(yes.Value):
		s.P, s.Upper = 0, limit(yes.Value)
	case small(no.Value):
		s.P, s.Lower = 1, 1-limit(no.Value)
	}
	return s
}

// Reweighted is the posterior under another prior.
func (e *Posterior) Reweighted(ratio func(x []float64) float64) (outlook.Reweighted, error) {
	at := func(u []float64) float64 { return ratio(e.point(u)) }
	nodes, mean, err := e.Nodes.Reweight(at)
	if err != nil {
		return outlook.Reweighted{}, err
	}
	again := &Posterior{Space: e.Space, Best: e.Best, LogBest: e.LogBest, Nodes: nodes, frame: e.frame, labels: e.labels,
		classes: make([]quadrature.Estimate, len(e.classes))}
	for i := range again.classes {
		again.classes[i] = nodes.Probability(i)
		if of := e.classes[i]; of.Value > 0 { // the nodes do not know the error of the integral itself
			again.classes[i].Err += again.classes[i].Value * of.Err / of.Value
		}
	}
	again.gatherRare()
	var first, second float64
	for i, w := range e.Nodes.Weight {
		f := at(e.Nodes.At(i))
		first, second = first+w*f, second+w*f*f
	}
	return outlook.Reweighted{Belief: again, LogMean: mean.Value, Err: mean.Err, Effective: first * first / second}, nil
}

var _ outlook.Belief = (*Posterior)(nil)

// thinning is the probability that may be left out of what is computed at every node.
const thinning = 1e-4

// Distribution returns the distribution of a quantity, conditional on its being
// defined (not NaN).
func (e *Posterior) Distribution(of func(*likelihood.Point) float64) (quadrature.Marginal, error) {
	var p likelihood.Point
	return e.thinned().Marginal(func(x []float64) float64 {
		e.universe(x, &p)
		return of(&p)
	})
}

// OfUniverse is Distribution of a quantity that the universe alone decides. Many
// nodes share their universe, so its costly quantities are computed once.
func (e *Posterior) OfUniverse(of func(model.Universe) float64) (quadrature.Marginal, error) {
	known := map[model.Universe]float64{}
	return e.Distribution(func(p *likelihood.Point) float64 {
		v, ok := known[p.Universe]
		if !ok {
			v = of(p.Universe)
			known[p.Universe] = v
		}
		return v
	})
}

func (e *Posterior) thinned() *quadrature.Nodes {
	e.once.Do(func() {
		e.thin = e.Nodes
		if e.Nodes.Len() > 5000 {
			e.thin = e.Nodes.Thin(thinning)
		}
	})
	return e.thin
}

// Sample returns about n points of equal weight, in the order of the nodes: every
// stretch of 1/n of the probability sends one.
func (e *Posterior) Sample(n int) [][]float64 {
	var out [][]float64
	sum := 0.0
	for i, w := range e.Nodes.Weight {
		sum += w
		for float64(len(out))+0.5 < sum*float64(n) {
			out = append(out, e.point(e.Nodes.At(i)))
		}
	}
	return out
}

// Universes are those of a sample.
func Universes(space *likelihood.Space, points [][]float64) []model.Universe {
	out := make([]model.Universe, len(points))
	var p likelihood.Point
	for i, x := range points {
		space.Point(x, &p)
		out[i] = p.Universe
	}
	return out
}
