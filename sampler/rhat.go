package sampler

import (
	"math"

	"gonum.org/v1/gonum/stat/distuv"
)

// rhatSteps is how many steps of each ensemble R-hat looks at, at least; of
// more than twice as many it takes an even selection. R-hat compares
// distributions whose neighbouring steps are correlated: the steps between add
// next to nothing to it but cost as much.
const rhatSteps = 32

// RHat returns the rank-normalised split R-hat of Vehtari et al. (2021,
// Bayesian Anal. 16, 667): the larger of R-hat of the draws and R-hat of their
// distance from the median ("folded", which sees ensembles that agree in mean
// but not in width), each after replacing draws by normal scores of their
// ranks. The chains that it compares are the two halves of each ensemble, all
// walkers together: the walkers of one ensemble are not independent, but the
// ensembles are.
//
// Below 1.01 is the authors' criterion for convergence. It is NaN for weighted
// draws, constant or not finite ones, and fewer than 4 steps.
func RHat(d Draws) float64 {
	halves := split(d)
	if halves == nil || d.w != nil {
		return math.NaN()
	}
	bulk := rhat(normalScores(halves))
	folded := rhat(normalScores(fold(halves)))
	if math.IsNaN(bulk) || math.IsNaN(folded) {
		return math.NaN()
	}
	return max(bulk, folded)
}

// split returns the first and second half of every ensemble, thinned; nil for
// fewer than 4 steps or values that are not finite.
func split(d Draws) [][]float64 {
	n := d.steps()
	stride := max(1, n/rhatSteps)
	half := n / stride / 2
	if half < 2 {
		return nil
	}
	var halves [][]float64
	for _, x := range d.x {
		for _, first := range []int{0, n - 1 - (half-1)*stride} {
			part := make([]float64, 0, half*d.walkers)
			for s := range half {
				at := (first + s*stride) * d.walkers
				part = append(part, x[at:at+d.walkers]...)
			}
			halves = append(halves, part)
		}
	}
	for _, part := range halves {
		for _, v := range part {
			if !finite(v) {
				return nil
			}
		}
	}
	return halves
}

// fold returns the distances from the common median.
func fold(chains [][]float64) [][]float64 {
	var all []float64
	for _, c := range chains {
		all = append(all, c...)
	}
	index := order(all)
	n := len(all)
	median := (all[index[(n-1)/2]] + all[index[n/2]]) / 2
	folded := cloneAll(chains)
	for _, c := range folded {
		for i, v := range c {
			c[i] = math.Abs(v - median)
		}
	}
	return folded
}

// normalScores replaces every value by Φ⁻¹((r − 3/8)/(S + 1/4)), where r is its
// rank among all S values (Blom 1958; eq. 14 of Vehtari et al. 2021, from
// memory). Equal values share their mean rank.
func normalScores(chains [][]float64) [][]float64 {
	length := len(chains[0])
	all := make([]float64, 0, len(chains)*length)
	for _, c := range chains {
		all = append(all, c...)
	}
	index := order(all)
	scores := cloneAll(chains)
	total := float64(len(all))
	for i := 0; i < len(index); {
		j := i + 1
		for j < len(index) && all[index[j]] == all[index[i]] {
			j++
		}
		rank := float64(i+1+j) / 2
		score := distuv.UnitNormal.Quantile((rank - 0.375) / (total + 0.25))
		for ; i < j; i++ {
			at := int(index[i])
			scores[at/length][at%length] = score
		}
	}
	return scores
}

// rhat is the square root of the variance that all chains suggest together over
// the mean variance within them (Gelman & Rubin 1992, Stat. Sci. 7, 457). NaN
// if nothing varies within the chains.
func rhat(chains [][]float64) float64 {
	n, m := float64(len(chains[0])), float64(len(chains))
	within, grand := 0.0, 0.0
	means := make([]float64, len(chains))
	for i, c := range chains {
		means[i] = meanOf(c)
		grand += means[i] / m
		for _, v := range c {
			within += (v - means[i]) * (v - means[i]) / (m * (n - 1))
		}
	}
	between := 0.0
	for _, mean := range means {
		between += (mean - grand) * (mean - grand) / (m - 1)
	}
	if !(within > 0) {
		return math.NaN()
	}
	return math.Sqrt((n-1)/n + between/within)
}
