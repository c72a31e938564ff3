package quadrature

import (
	"cmp"
	"errors"
	"math"
	"slices"
)

// Marginal returns the distribution of a derived quantity g. Where g is NaN it is undefined, and the
// distribution is conditional on its being defined. Each node's probability is spread over the values g takes
// on the tile the node stands for, to first order, in a way that adds no variance: mean and SD are those of
// the weighted nodes. Quantiles of a smooth g are as fine as the tiles allow: against Gaussians in one to three
// dimensions the median and the ends of the 68% interval are good to 0.4% of the SD and those of the 95% interval
// to 1.5% at the default tolerance, to 0.5% and 1.5% at 1e-4. g is called 2·dim + 1 times per node, also a little
// outside of the node's class or the box.
func (n *Nodes) Marginal(g func(x []float64) float64) (Marginal, error) {
	t := n.tiles(g)
	if len(t) == 0 {
		return Marginal{}, errors.New("the quantity is not defined anywhere in the posterior")
	}
	var m Marginal
	for _, s := range t {
		m.Defined += s.w
		m.Mean += s.w * s.v
	}
	m.Mean /= m.Defined
	var variance float64
	for _, s := range t {
		variance += s.w * (s.v - m.Mean) * (s.v - m.Mean) / m.Defined
	}
	m.SD = math.Sqrt(variance)
	if !(m.SD > 1e-14*math.Abs(m.Mean)) {
		return m, errors.New("the quantity has one and the same value everywhere in the posterior")
	}
	m.Err = n.Mean(g).Err / m.SD
	m.tabulate(t)
	return m, nil
}

// tile is the probability w spread about v: as a triangle over [v-h, v+h], neighbouring tiles would overlap by half
// and add up to a linear interpolation. See below for what is taken off.
type tile struct{ v, h, w float64 }

// tiles evaluates g and its spread over each node's tile: that of a sum of independent variables, taken for a
// triangle with half the extents added in squares.
func (n *Nodes) tiles(g func(x []float64) float64) (t []tile) {
	x := make([]float64, n.dim)
	for k := range n.Len() {
		copy(x, n.At(k))
		v := g(x)
		if math.IsNaN(v) || math.IsInf(v, 0) || n.Weight[k] == 0 {
			continue
		}
		var h2 float64
		for i, at := range n.At(k) {
			half := n.half[k*n.dim+i]
			x[i] = at + half
			up := g(x)
			x[i] = at - half
			d := slope(v, up, g(x))
			x[i] = at
			h2 += d * d
		}
		t = append(t, tile{v, 2 * math.Sqrt(h2), n.Weight[k]})
	}
	return t
}

// slope is half of up - down, from one side where the other is undefined.
func slope(v, up, down float64) float64 {
	switch u, d := finite(up), finite(down); {
	case u && d:
		return (up - down) / 2
	case u:
		return up - v
	case d:
		return v - down
	}
	return 0
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// tabulate fills the table from the tiles.
func (m *Marginal) tabulate(t []tile) {
	lo, hi := tileSpan(t)
	width := (hi - lo) / (gridSize - 1)
	m.CDF, m.Density = make([]float64, gridSize), make([]float64, gridSize)
	for i := range gridSize {
		m.X = append(m.X, lo+float64(i)*width)
	}
	cells := make([]float64, gridSize-1)
	for _, s := range t {
		s.w /= m.Defined
		m.CDF[0] += s.w * s.below(lo)
		first := max(0, int((s.v-2*s.h-lo)/width))
		for i := first; i < len(cells) && m.X[i] <= s.v+2*s.h; i++ {
			cells[i] += s.w * (s.below(m.X[i+1]) - s.below(m.X[i]))
		}
	}
	for i, c := range cells {
		m.CDF[i+1] = m.CDF[i] + c
	}
	monotone(m.CDF)
	for i := range m.Density {
		a, b := max(0, i-1), min(len(cells), i+1)
		m.Density[i] = (m.CDF[b] - m.CDF[a]) / (m.X[b] - m.X[a])
	}
}

// below returns the share of the tile below x: 4/3 of a triangle less 1/3 of one twice as wide. A triangle alone adds
// the variance h²/6, which differs from place to place, and distorts the distribution by more than scaling its
// width could mend (Richardson's extrapolation in h²; common practice).
func (s tile) below(x float64) float64 {
	if s.h == 0 {
		if x >= s.v {
			return 1
		}
		return 0
	}
	u := (x - s.v) / s.h
	return (4*triangle(u) - triangle(u/2)) / 3
}

// triangle is the distribution function of a triangle on [-1, 1].
func triangle(u float64) float64 {
	switch {
	case u <= -1:
		return 0
	case u < 0:
		return (1 + u) * (1 + u) / 2
	case u < 1:
		return 1 - (1-u)*(1-u)/2
	}
	return 1
}

// tileSpan returns the range of the grid: all but 1e-6 at either end, and not more than 40 times the width of
// the central half, so that a long tail does not take the resolution away.
func tileSpan(t []tile) (lo, hi float64) {
	sorted := slices.Clone(t)
	slices.SortFunc(sorted, func(a, b tile) int { return cmp.Compare(a.v, b.v) })
	var total float64
	for _, s := range sorted {
		total += s.w
	}
	quantile := func(p float64) tile {
		var sum float64
		for _, s := range sorted {
			if sum += s.w; sum >= p*total {
				return s
			}
		}
		return sorted[len(sorted)-1]
	}
	a, b := quantile(1e-6), quantile(1-1e-6)
	lo, hi = a.v-a.h, b.v+b.h
	if q := quantile(0.75).v - quantile(0.25).v; q > 0 {
		mid := quantile(0.5).v
		lo, hi = math.Max(lo, mid-20*q), math.Min(hi, mid+20*q)
	}
	return lo, hi
}
