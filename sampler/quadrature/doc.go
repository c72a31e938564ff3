// Package quadrature integrates a posterior density of one, two or three parameters over a box, without
// luck: evidence, marginals, intervals and the probability of regions, tails included, each with an error.
//
// It knows only a log-density of a point and the box. The way of a number through it:
//
//  1. search finds the mode: a low-discrepancy scan of the box, then Nelder–Mead.
//  2. A coarse pilot pass gives evidence, mean and covariance, and with them where to look.
//  3. One pass per coordinate integrates with that coordinate outermost, as nested one-dimensional
//     integrals (Fubini). Every level is cut at the conditional mean ± 2 and ± 6 standard deviations, and
//     each piece is bisected until its Gauss–Kronrod error is small enough, for the total and for every
//     class relative to that class's own mass. The outermost integrand is the marginal of its coordinate.
//  4. On the innermost lines the edge of the support and the borders between classes are located by
//     bisection and the line is split there, so that a jump costs no accuracy.
//  5. The leaves of the first pass become weighted nodes, from which anything else can be computed.
//
// Nesting lines instead of subdividing cells is what makes curved borders cheap: after the split the next
// integrand out is continuous. Results depend on the problem and the options, not on the number of cores.
package quadrature
