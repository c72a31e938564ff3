// Package evidence compares models: the evidence of a posterior from a sample of it, for more parameters than
// quadrature can manage, and what follows from evidences: Bayes factors, probabilities of models, and the
// information criteria beside them.
//
// Bridge estimates ln of the integral of a density known up to a constant:
//
//  1. The draws are mapped to an unbounded space, each coordinate by a logit of its box edges.
//  2. Every other one of some blocks of every ensemble fits a proposal, a multivariate Student t, inside the
//     box by construction; the blocks between are kept for the estimate.
//  3. As many proposal draws are made, and the density is evaluated at them.
//  4. The optimal bridge between proposal and posterior is iterated to its fixed point.
//  5. The error follows from the spread of both sets of ratios, the draws counted as the independent ones
//     they are worth.
//
// The normalisation of the prior is the caller's: ln p = ln(normalised prior) + ln L gives ln evidence.
package evidence
