package gather

import (
	"context"
	"errors"

	"omen/likelihood"
	"omen/sampler"
)

// aloneEffective is how many effective samples outline the region of one table by
// itself: enough for its edge to be smooth, few enough to cost less than the
// drawing.
const aloneEffective = 1500

// aloneSteps bounds the work on a table that leaves its parameters far from
// Gaussian.
const aloneSteps = 4000

// alone is the posterior of one table by itself under the run's priors.
type alone struct {
	space *likelihood.Space
	check sampler.Check
	best  []float64
}

// alone samples the posterior of the i-th table. Parameters that it does not need
// are left out.
func (r *Run) alone(i int) (*alone, error) {
	term := r.Job.Tables[i].Term
	p, err := needed(r.Job.Space.Family(), term)
	if err != nil {
		return nil, err
	}
	const ensembles = 4
	seed := r.Job.Run.Sampling.Seed
	lo, hi := p.Space().Box()
	dense := make([]sampler.Density, ensembles)
	for m := range dense {
		dense[m] = p.Evaluator().LogDensity
	}
	best, _, err := sampler.Maximise(dense[0], lo, hi, seed)
	if err != nil {
		return nil, err
	}
	starts := make([][]float64, ensembles)
	for m := range starts {
		if starts[m], err = sampler.Scatter(dense[m], best, lo, hi, sampler.DefaultWalkers(p.Space().Dim()), seed, m); err != nil {
			return nil, err
		}
	}
	chain, err := sampler.NewChain(p.Space().Dim(), starts, 1, sampler.DefaultRecord)
	if err != nil {
		return nil, err
	}
	settings := sampler.Settings{Seed: seed, Effective: aloneEffective, MaxSteps: aloneSteps, Threads: r.Threads}
	outcome, err := sampler.Run(context.Background(), dense, chain, settings, unwatched{})
	if err != nil {
		return nil, err
	}
	return &alone{p.Space(), outcome.Check, best}, nil
}

// needed is the posterior of one term in the smallest family that it can do with.
func needed(f likelihood.Family, term likelihood.Term) (*likelihood.Posterior, error) {
	p, err := posterior(f, term)
	if err != nil {
		return nil, err
	}
	for _, name := range []string{"M", "ob", "rd", "hrd", "H0"} {
		less := without(f, name)
		if q, err := posterior(less, term); err == nil {
			f, p = less, q
		}
	}
	return p, nil
}

func posterior(f likelihood.Family, term likelihood.Term) (*likelihood.Posterior, error) {
	space, err := likelihood.NewSpace(f)
	if err != nil {
		return nil, err
	}
	if space.Dim() == 0 {
		return nil, errors.New("nothing is free")
	}
	return likelihood.NewPosterior(space, term)
}

// without is a family that does not know a parameter.
func without(f likelihood.Family, name string) likelihood.Family {
	free := f.Free
	f.Free = nil
	for _, p := range free {
		if p.Name != name {
			f.Free = append(f.Free, p)
		}
	}
	fixed := f.Fixed
	f.Fixed = map[string]float64{}
	for k, v := range fixed {
		if k != name {
			f.Fixed[k] = v
		}
	}
	return f
}

// unwatched observes nothing.
type unwatched struct{}

func (unwatched) Advanced(int, sampler.View) error { return nil }
func (unwatched) Checked(sampler.Check)            {}
