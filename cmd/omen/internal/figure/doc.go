// Package figure draws the figures of a run and of a comparison of runs, ready to print.
//
// Each figure has an input of plain numbers and labels, and a function that draws it for a column or the full
// width of a journal page:
//
//	DrawHubble       distances against redshift, residuals, BAO ratios
//	DrawPlane        68% and 95% regions of one or several data sets in a plane divided by labelled lines
//	DrawMarginals    one- and two-dimensional marginals of up to six parameters
//	DrawHistory      the scale factor against time, with bands
//	DrawFates        probabilities as bars, with errors and upper limits
//	DrawConvergence  traces, autocorrelation, R-hat and effective samples
//	DrawWhiskers     constraints of several runs side by side
//
// A path from input to page: numbers → density estimates (package density) → panels and marks in points
// (panel.go) → a list of filled and stroked paths and texts (canvas.go) → PDF, PNG or SVG (pdf.go, png.go,
// svg.go). The list is what makes the formats agree: geometry is clipped and text is laid out once.
//
// The package knows nothing of run files, chains or cosmology. Everything is deterministic: the same input
// gives the same bytes.
package figure
