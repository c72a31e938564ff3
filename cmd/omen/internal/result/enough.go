package result

import (
	"math"

	"omen/cmd/omen/internal/job"
	"omen/sampler"
)

// How much larger than that of a parameter at its goal the Monte Carlo error of
// a derived quantity or a probability may be, relative to its own spread: a run
// need not wait for a quantity that is a little slower than all parameters.
const slack = 1.5

// A sample is looked at in two draws for every effective one that is asked for, at
// enoughSteps steps or more; a longer look would cost more than all other checks,
// and slack leaves room for what is lost between the steps. Of a goal above
// enoughSamples only the last part is looked at that should hold as many: the rest
// goes on at the same rate.
const (
	enoughSteps   = 64
	enoughSamples = 4000
)

// Enough tells whether a sample is enough for everything that is reported beyond
// the parameters themselves: the Monte Carlo error of every derived quantity is
// within slack of sd/√goal, that of every probability within slack of the
// error of an even chance, 0.5/√goal.
func Enough(j *job.Job, threads int) func(sampler.View) bool {
	goal := float64(j.Run.Sampling.EffectiveSamples)
	return func(v sampler.View) bool {
		goal := goal
		if goal > enoughSamples {
			v = v.After(v.Number(int(float64(v.Steps()) * (1 - enoughSamples/goal))))
			goal = enoughSamples
		}
		steps := max(enoughSteps, int(2*goal)/(v.Ensembles()*v.Walkers()))
		d := derive(j.Space, v.Thin(max(1, v.Steps()/steps)), threads)
		for _, draws := range d.draws {
			if sampler.ESS(draws) < goal/(slack*slack) { // MCSE = sd/√ESS; NaN of a constant passes
				return false
			}
		}
		fates, held, today := tables(d.belief(goal), d.family)
		for _, f := range append(append(fates, held...), today...) {
			if float64(f.Error) > slack*0.5/math.Sqrt(goal) {
				return false
			}
		}
		return true
	}
}
