// Package sampler explores a probability density known up to a constant, and
// says how well it did.
//
// It knows nothing but a [Density]: the natural logarithm of a density of a
// []float64. The path of a number through the package:
//
//  1. [Maximise] finds the best fit in a box, [Scatter] places the walkers of
//     every ensemble around it, wider than the posterior.
//  2. [Run] moves several independent ensembles of walkers by two
//     affine-invariant moves (one [Ensemble] each, in parallel) and appends every
//     recorded step to a [Chain]. An [Observer] sees the new rows and the
//     convergence at every [Check].
//  3. A [View] is a part of the chain; the [Check] of a run holds the one to
//     summarise: after the burn-in, which is read off the chain itself, and
//     thinned. Nothing is copied.
//  4. [Draws] is one scalar along a view: a coordinate, or any function of the
//     position.
//  5. [Summarize] reduces draws to mean, standard deviation, quantiles,
//     intervals, each with its Monte Carlo standard error, effective sample
//     size and R-hat; [Proportion] reduces draws of 0 and 1 to a probability.
//
// # What it cannot see
//
// All ensembles start about one optimum. A second peak that no walker reaches is
// not found, and R-hat says nothing of it; one that few reach shows as ensembles
// that disagree, and a run that does not end.
//
// # Random numbers
//
// The random stream of a step is a pure function of the seed, the ensemble and
// the step, so the chain depends on nothing else: not on the number of threads,
// nor on whether it was interrupted and continued from its last complete step.
//
// # Errors
//
// What a caller's input can cause is an error; what data cannot tell is NaN (or
// an infinite standard error); misuse by the programmer panics.
package sampler
