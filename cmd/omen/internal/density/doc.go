// Package density turns posterior draws, or a density tabulated on a grid, into what a figure of marginals
// needs: smooth curves and surfaces, the level that encloses a given probability, and the outline of the
// region above it.
//
//  1. The draws are binned linearly on a regular grid whose outer nodes lie on the hard edges of the prior.
//  2. A direct plug-in rule picks the width of a Gaussian kernel from the effective sample size (bandwidth.go).
//  3. Binned counts and kernel are convolved by FFT, with a local linear correction that keeps the density
//     from bending down at a hard edge (kernel.go).
//  4. Levels of highest density are calibrated on the draws themselves (level.go), so that a region drawn at
//     68% holds 68% whatever the smoothing did to its shape.
//  5. Contours are traced as closed loops that run along the edges of the domain (contour.go).
//
// The package knows nothing of parameters or cosmology. Everything is deterministic.
package density
