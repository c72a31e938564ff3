package sampler

import (
	"math"
	"slices"

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
	bulk, folded := bulkAndFolded(halves)
	if math.IsNaN(bulk) || math.IsNaN(folded) {
		return math.NaN()
	}
	return max(bulk, folded)
}

// bulkAndFolded are the two kinds of R-hat of chains of one length.
func bulkAndFolded(chains [][]float64) (bulk, folded float64) {
	all := slices.Concat(chains...)
	index := order(all)
	table := scores(len(all))
	bulk = rhat(normalScores(all, index, table, len(chains)))
	all, index = fold(all, index)
	folded = rhat(normalScores(all, index, table, len(chains)))
	return bulk, folded
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

// fold returns the distances of values from their median, and the indices that put
// these in ascending order, given those that do so for the values: outwards from
// the median on both sides.
func fold(all []float64, index []uint32) (folded []float64, outwards []uint32) {
	n := len(all)
	median := (all[index[(n-1)/2]] + all[index[n/2]]) / 2
	folded, outwards = make([]float64, n), make([]uint32, 0, n)
	for i, v := range all {
		folded[i] = math.Abs(v - median)
	}
	lo, hi := n/2-1, n/2
	for len(outwards) < n {
		if hi == n || lo >= 0 && folded[index[lo]] <= folded[index[hi]] {
			outwards = append(outwards, index[lo])
			lo--
		} else {
			outwards = append(outwards, index[hi])
			hi++
		}
	}
	return folded, outwards
}

// scores is the normal scores of n ranks, Φ⁻¹((r − 3/8)/(n + 1/4)) for 1 ≤ r ≤ n
// (Blom 1958; eq. 14 of Vehtari et al. 2021, from memory).
func scores(n int) []float64 {
	z := make([]float64, n)
	for i := range (n + 1) / 2 {
		z[i] = score(float64(i+1), n)
		z[n-1-i] = -z[i]
	}
	return z
}

func score(rank float64, n int) float64 {
	return distuv.UnitNormal.Quantile((rank - 0.375) / (float64(n) + 0.25))
}

// normalScores replaces every value by the score of its rank, and cuts the result
// into chains of equal length. index puts the values in order; equal values share
// their mean rank.
func normalScores(all []float64, index []uint32, table []float64, chains int) [][]float64 {
	flat := make([]float64, len(all))
	for i := 0; i < len(index); {
		j := i + 1
		for j < len(index) && all[index[j]] == all[index[i]] {
			j++
		}
		z := table[i]
		if j > i+1 {
			z = score(float64(i+1+j)/2, len(all))
		}
		for ; i < j; i++ {
			flat[index[i]] = z
		}
	}
	return slices.Collect(slices.Chunk(flat, len(all)/chains))
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
