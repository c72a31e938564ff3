package result

import (
	"context"
	"errors"
	"fmt"

	"omen/cmd/omen/internal/exact"
	"omen/cmd/omen/internal/nested"
	"omen/cmd/omen/internal/outlook"
	"omen/sampler"
)

// Investigate computes what the run asks for beside its chain: the integral of the
// posterior, and the nested universes. A run that was interrupted is in a hurry: nothing is
// computed then. begin, unless it is nil, is told what begins; what it returns is called when
// that ends.
func (r *Run) Investigate(ctx context.Context, begin func(what string) (end func())) error {
	if ctx.Err() != nil {
		return nil
	}
	if begin == nil {
		begin = func(string) func() { return func() {} }
	}
	defer begin("integrating the posterior, and comparing the nested universes")()
	if err := r.integrate(ctx); err != nil {
		return quiet(ctx, err)
	}
	if !r.Job.Run.Fates.Nested {
		return nil
	}
	own := nested.Own{Exact: r.Exact, Best: r.Best}
	if r.Chain != nil && r.Exact == nil {
		own.Drawn = nested.Draws(r.Job.Space, r.Outcome.Check, r.Threads)
	}
	o := nested.Options{Seed: r.Job.Run.Sampling.Seed, Threads: r.Threads, Odds: r.Job.Run.Fates.Odds}
	c, err := nested.Compare(ctx, r.Job.Posterior, own, o)
	var odds *nested.OddsError
	switch {
	case ctx.Err() != nil:
	case errors.As(err, &odds):
		return fmt.Errorf("the nested universes: %w", err)
	case err != nil: // the run itself is as good as without them
		r.notCompared = fmt.Sprintf("the nested universes were not compared: %v", err)
	default:
		r.Nested = c
	}
	return nil
}

func (r *Run) integrate(ctx context.Context) error {
	engine := r.Job.Run.Sampling.Engine
	if engine == "chain" || r.Job.Space.Dim() > exact.Most {
		return nil
	}
	integrate := exact.Integrate
	if r.Chain != nil {
		integrate = exact.Try
	}
	e, err := integrate(ctx, r.Job.Posterior, r.Best, r.Threads)
	if err != nil {
		return err
	}
	if by := e.Unresolved(); by > 0 && r.Chain != nil {
		r.givenUp = fmt.Sprintf("quadrature was given up after %d evaluations, with probabilities known to ±%.1g only: all numbers are the chain's", e.Evaluations, by)
		return nil
	}
	r.Exact = e
	if r.Chain == nil {
		r.Best = e.Best
	}
	return nil
}

// quiet is no error if the user interrupted.
func quiet(ctx context.Context, err error) error {
	if ctx.Err() != nil {
		return nil
	}
	return err
}

// traceUniverses is how many universes the bands of a history are made of.
const traceUniverses = 400

// Trace is the scale factor through time: the best fit and the bands of the
// posterior. Nil if the best fit had no big bang.
func (r *Run) Trace() *outlook.Trace {
	space := r.Job.Space
	var points [][]float64
	if r.Exact != nil {
		points = r.Exact.Sample(traceUniverses)
	} else if r.Chain != nil {
		points = evenly(r.Outcome.Check, traceUniverses)
	}
	best := exact.Universes(space, [][]float64{r.Best})[0]
	return outlook.Traces(best, exact.Universes(space, points), space.KnowsH0(), r.Job.Run.Fates.Ahead)
}

// evenly takes about n positions of a sample, evenly along it.
func evenly(c sampler.Check, n int) [][]float64 {
	v := c.Sample
	total := v.Steps() * v.Ensembles() * v.Walkers()
	var out [][]float64
	k := 0
	for row := range v.Rows() {
		if k*n/max(total, n) == len(out) {
			out = append(out, row.X)
		}
		k++
	}
	return out
}
