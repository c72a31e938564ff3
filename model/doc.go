// Package model says what a homogeneous universe does: how fast it expands, how far away and how long ago a
// redshift is, whether it began in a big bang, and how it ends. It knows no data.
//
// A Universe holds matter, dark energy with w(a) = w0 + wa(1-a), radiation and, by difference, curvature:
//
//	E²(a) = H²/H0² = Or a⁻⁴ + Om a⁻³ + Ok a⁻² + OL a^(-3(1+w0+wa)) e^(3wa(a-1)),   Ok = 1-Om-OL-Or
//
// Everything else follows from E² in three steps.
//
//  1. Zeros. The ratio of the dark energy to the rest is monotonic between the roots of a cubic in a, so a
//     handful of signs decides exactly whether E² vanishes in the past (no big bang) or in the future
//     (recollapse), whatever the signs of the parameters. See zeros.go.
//  2. Integrals. Distances are integrals of 1/H over ln(1+z), times are integrals over ln a, by Gauss-Legendre
//     panels that split themselves where E² nearly vanishes. A turnaround, where 1/E has an integrable
//     singularity, is taken out by a change of variable.
//  3. Many redshifts. A Path does the same for a whole sorted table of redshifts in one pass, without
//     allocating: the integrand is evaluated at a few nodes and the integral is read off everywhere else.
//
// Accuracy: distances and times are good to a relative 1e-10 in tests, for z up to 1100, unless E² comes
// within about 1e-6 of a zero between now and then; there the rounding of the parameters themselves is
// amplified, by 1e-16/min(E²). Outside its domain (before a bounce, past the antipode of a closed universe, after a
// crunch) a function returns NaN.
//
// Units are km/s, Mpc and Gyr; a scale factor is 1 today.
package model
