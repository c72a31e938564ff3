// Package likelihood says how well a universe agrees with what was measured.
//
// It joins the tables of package data and the universes of package model into
// one log-density of the free parameters, which is all that a sampler needs:
//
//  1. A [Space] names the free parameters with their priors and turns a vector
//     of their values into a [Point]: a universe, a sound horizon, a magnitude.
//  2. A [Term] holds one table and its [Noise], factorised once, and returns the
//     chi-squared of a Point from the distances to all of its rows.
//  3. A [Posterior] is a Space with its Terms. It condenses the supernovae among
//     them to a small triangular matrix over a few nodes in redshift, so that their
//     chi-squared costs the same however many they are (condense.go), and asks the
//     terms themselves only for a universe in which the nodes are too few. One
//     pass over distances serves all terms. A [Memory] may keep that matrix from one
//     run to the next, and a [Deferred] noise need not be made before it is asked.
//  4. An [Evaluator] is a Posterior with scratch memory of its own, one for each
//     goroutine. LogDensity is the function that is called millions of times; it
//     does not allocate.
//
// Every prior is normalised and every Gaussian keeps its parameter-dependent
// constants, so that differences of ln p between nested families of universes
// are meaningful. Outside the support of the priors, without a big bang where
// one is required, or where a distance does not exist, ln p is -Inf.
package likelihood
