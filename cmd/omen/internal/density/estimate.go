package density

import (
	"errors"
	"fmt"
	"math"
)

// own1 and own2 are how much of a draw's own contribution to the density is left out when levels are
// calibrated on the draws, in one and two dimensions. It matters where the density is flat and its ups and downs
// are those of the draws. In the plane all of it has to go (leaving it in, regions of a uniform density hold
// 3% too little). A curve is smoother than the argument for leaving one out assumes: regions then hold as much too
// much as they hold too little with nothing left out (measured on 40 sets of 2000, 20000 and 60000 uniform draws).
const own1, own2 = 0.5, 1

// Estimate estimates the density of the draws x. The weights w may be nil. ess is the number of independent
// draws they are worth, which sets the smoothing; zero or less stands for that of independent draws,
// (Σw)²/Σw² (Kish 1965, Survey Sampling, §11.7). Draws must lie within the edges.
func Estimate(x, w []float64, ess float64, e Edges) (*Curve, error) {
	wsum, ess, err := checkWeights(len(x), w, ess)
	if err != nil {
		return nil, err
	}
	d, err := newAxis(x, w, wsum, e)
	if err != nil {
		return nil, err
	}
	d.grid(lineNodes, d.pad*d.sigma*math.Pow(ess, -1./5))
	counts := bin1(x, w, wsum, d)
	h := bandwidth1(counts, d, ess)
	p, self := smooth1(counts, d, h)
	c := &Curve{X: d.nodes(), P: p}
	if err := normalise(c.P, c.mass()); err != nil {
		return nil, err
	}
	at := make([]float64, len(x))
	for i, v := range x {
		at[i] = c.At(v) - own1*interpolate1(d, self, v)*weight(w, wsum, i, ess, len(x))
	}
	c.ranks = rank(at, w)
	return c, nil
}

// Estimate2 estimates the joint density of the pairs of draws (x, y); see Estimate for the arguments. The
// kernel follows the covariance of the draws, so that a narrow degeneracy stays narrow.
func Estimate2(x, y, w []float64, ess float64, ex, ey Edges) (*Surface, error) {
	if len(x) != len(y) {
		return nil, fmt.Errorf("density: %d draws of x and %d of y", len(x), len(y))
	}
	wsum, ess, err := checkWeights(len(x), w, ess)
	if err != nil {
		return nil, err
	}
	ax, err := newAxis(x, w, wsum, ex)
	if err != nil {
		return nil, fmt.Errorf("x: %w", err)
	}
	ay, err := newAxis(y, w, wsum, ey)
	if err != nil {
		return nil, fmt.Errorf("y: %w", err)
	}
	shape := covariance(x, y, w, wsum, ax, ay)
	s, self := estimate2(x, y, w, wsum, ess, ax, ay, shape)
	if err := normalise(s.P, s.mass()); err != nil {
		return nil, err
	}
	own := &Surface{X: s.X, Y: s.Y, P: self}
	at := make([]float64, len(x))
	for i, v := range x {
		at[i] = s.At(v, y[i]) - own2*own.At(v, y[i])*weight(w, wsum, i, ess, len(x))
	}
	s.ranks = rank(at, w)
	return s, nil
}

// estimate2 bins, picks the kernel and smooths, on the coarsest grid that resolves the kernel. The second
// result is the contribution a draw of unit weight makes to the density at its own place.
func estimate2(x, y, w []float64, wsum, ess float64, ax, ay axis, shape sym2) (*Surface, []float64) {
	reach := math.Pow(ess, -1./6)
	for size := coarseNodes; ; size *= 2 {
		ax.gridPadded(size, ax.pad*ax.sigma*reach)
		ay.gridPadded(size, ay.pad*ay.sigma*reach)
		f := newField(x, y, w, wsum, ax, ay, size)
		h := f.bandwidth(shape, ess)
		kernel := shape.scaled(h * h)
		if size < finestNodes && kernel.inUnits(ax.dx, ay.dx).narrow() < 1.2*1.2 {
			continue
		}
		wide := max(h, min(2*h, 2*reach))
		// Below about one node per standard deviation the sampled kernel would ring.
		p, self := f.adapted(kernel.atLeast(0.9*ax.dx, 0.9*ay.dx), shape.scaled(wide*wide).atLeast(0.9*ax.dx, 0.9*ay.dx), ess)
		return &Surface{X: ax.nodes(), Y: ay.nodes(), P: p}, self
	}
}

// weight is the share of the independent draws that draw i stands for.
func weight(w []float64, wsum float64, i int, ess float64, n int) float64 {
	if w == nil {
		return 1 / ess
	}
	return w[i] / wsum * float64(n) / ess
}

func checkWeights(n int, w []float64, ess float64) (wsum, n1 float64, err error) {
	if n < minDraws {
		return 0, 0, fmt.Errorf("density: %d draws, at least %d are needed", n, minDraws)
	}
	if w != nil && len(w) != n {
		return 0, 0, fmt.Errorf("density: %d weights for %d draws", len(w), n)
	}
	wsum, kish := float64(n), float64(n)
	if w != nil {
		sum, sum2 := 0.0, 0.0
		for i, v := range w {
			if !(v >= 0) || math.IsInf(v, 0) {
				return 0, 0, fmt.Errorf("density: weight %g at index %d", v, i)
			}
			sum += v
			sum2 += v * v
		}
		if sum == 0 {
			return 0, 0, errors.New("density: all weights are zero")
		}
		wsum, kish = sum, sum*sum/sum2
	}
	if !(ess > 0) || ess > kish {
		ess = kish
	}
	return wsum, max(ess, 4), nil
}

// axis is one dimension of the draws: where they lie and the grid laid over it.
type axis struct {
	edges       Edges
	lo, hi      float64 // range that holds all but a 5e-4 of the draws on either side
	mean        float64
	sd          float64
	sigma       float64 // the smaller of the standard deviation and the interquartile range/1.349
	pad         float64 // kernel widths kept free beyond the draws where there is no edge
	x0, dx      float64 // first node and spacing
	n           int     // nodes
	left, right bool    // the outer node lies on a hard edge
}

func newAxis(x, w []float64, wsum float64, e Edges) (axis, error) {
	a := axis{edges: e, pad: 4}
	lo, hi := math.Inf(1), math.Inf(-1)
	for i, v := range x {
		if math.IsNaN(v) || math.IsInf(v, 0) {
			return a, fmt.Errorf("density: draw %g at index %d", v, i)
		}
		lo, hi = min(lo, v), max(hi, v)
		a.mean += v * at(w, i)
	}
	a.mean /= wsum
	if lo < e.Lo || hi > e.Hi {
		return a, fmt.Errorf("density: draws from %g to %g reach beyond the edges %g to %g", lo, hi, e.Lo, e.Hi)
	}
	for i, v := range x {
		a.sd += (v - a.mean) * (v - a.mean) * at(w, i)
	}
	a.sd = math.Sqrt(a.sd / wsum)
	if !(hi > lo) || !(a.sd > 0) {
		return a, fmt.Errorf("density: all draws equal %g", lo)
	}
	q := quantiles(x, w, wsum, lo, hi, 5e-4, 0.25, 0.75, 1-5e-4)
	a.lo, a.hi = q[0], q[3]
	a.sigma = a.sd
	if iqr := (q[2] - q[1]) / 1.349; iqr > 0 {
		a.sigma = min(a.sd, iqr)
	}
	return a, nil
}

func at(w []float64, i int) float64 {
	if w == nil {
		return 1
	}
	return w[i]
}

// quantiles are read off a fine histogram between lo and hi; they only place grids and scale pilot kernels.
func quantiles(x, w []float64, wsum, lo, hi float64, q ...float64) []float64 {
	const bins = 1 << 15
	var h [bins]float64
	scale := (bins - 1) / (hi - lo)
	for i, v := range x {
		h[int((v-lo)*scale)] += at(w, i)
	}
	out := make([]float64, len(q))
	sum, k := 0.0, 0
	for i := 0; i < bins && k < len(q); i++ {
		sum += h[i]
		for k < len(q) && sum >= q[k]*wsum {
			out[k] = lo + (float64(i)+0.5)/scale
			k++
		}
	}
	for ; k < len(q); k++ {
		out[k] = hi
	}
	return out
}

// grid lays n nodes over the draws and a margin, or up to an edge that the margin would reach.
func (a *axis) grid(n int, margin float64) {
	lo, hi := a.lo-margin, a.hi+margin
	a.left, a.right = lo <= a.edges.Lo, hi >= a.edges.Hi
	lo, hi = max(lo, a.edges.Lo), min(hi, a.edges.Hi)
	a.x0, a.n, a.dx = lo, n, (hi-lo)/float64(n-1)
}

// gridPadded leaves room on a circle of size nodes for a kernel not to wrap around onto the other edge.
// Without edges the margin itself is that room.
func (a *axis) gridPadded(size int, margin float64) {
	a.grid(size, margin)
	if !a.left && !a.right {
		return
	}
	width := a.dx * float64(size-1)
	// As many padding nodes as span the margin at the spacing that results.
	a.grid(int(float64(size)*width/(width+margin)), margin)
}

func (a *axis) nodes() []float64 {
	x := make([]float64, a.n)
	for i := range x {
		x[i] = a.x0 + float64(i)*a.dx
	}
	if a.left {
		x[0] = a.edges.Lo
	}
	if a.right {
		x[a.n-1] = a.edges.Hi
	}
	return x
}

// place splits a draw between node i (share 1-t) and node i+1 (share t); ok is false off the grid.
func (a *axis) place(x float64) (i int, t float64, ok bool) {
	u := (x - a.x0) / a.dx
	i = int(u)
	if u < 0 || i > a.n-1 {
		// An edge may sit a rounding error away from its node.
		return 0, 0, false
	}
	if i == a.n-1 {
		return a.n - 2, 1, true
	}
	return i, u - float64(i), true
}

// bin1 bins linearly, which is unbiased to second order in the spacing (Hall & Wand 1996, J. Multivariate
// Analysis 56, 165). Counts are shares of the total weight.
func bin1(x, w []float64, wsum float64, a axis) []float64 {
	c := make([]float64, a.n)
	for i, v := range x {
		if k, t, ok := a.place(v); ok {
			s := at(w, i) / wsum
			c[k] += (1 - t) * s
			c[k+1] += t * s
		}
	}
	return c
}

func interpolate1(a axis, p []float64, x float64) float64 {
	i, t, ok := a.place(x)
	if !ok {
		return 0
	}
	return p[i] + t*(p[i+1]-p[i])
}
