package report

import (
	"math"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/result"
)

// Bayes writes ln of the Bayes factor of a nested universe against the best, with
// its error where that shows.
func Bayes(m result.Nested) string { return bayes(m) }

// ModelProbability writes the probability of a nested universe.
func ModelProbability(m result.Nested) string { return modelProbability(m) }

// When writes the median of a time and its intervals, nothing where too few draws
// know it.
func When(t result.Time) (median, in68, in95 string) {
	if math.IsNaN(float64(t.Median)) {
		return "", "", ""
	}
	place := digits.Place(float64(t.Interval68[1]-t.Interval68[0])/2, float64(t.MCSE))
	cell := func(v result.Number) string { return digits.Format(float64(v), place) }
	return cell(t.Median), cell(t.Interval68[0]) + " … " + cell(t.Interval68[1]), cell(t.Interval95[0]) + " … " + cell(t.Interval95[1])
}
