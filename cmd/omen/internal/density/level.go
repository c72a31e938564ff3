package density

import (
	"math"
	"slices"
)

// ranked is the distribution of the density over the draws: below[k] is the probability that lies in bins up to
// k of the density, counted from the top, high and step the bins' place.
type ranked struct {
	high, step float64
	below      []float64
}

// rankBins is fine enough for the level to be off by 1e-4 of the height between lowest and highest.
const rankBins = 1 << 13

// rank bins the densities p of points with weight w. Sorting would take longer than all the rest.
func rank(p, w []float64) ranked {
	lo, hi := p[0], p[0]
	for _, v := range p {
		lo, hi = min(lo, v), max(hi, v)
	}
	r := ranked{high: hi, step: (hi - lo) / rankBins, below: make([]float64, rankBins+1)}
	scale := 0.0
	if hi > lo {
		scale = rankBins / (hi - lo)
	}
	sum := 0.0
	for i, v := range p {
		r.below[int((hi-v)*scale)] += at(w, i)
		sum += at(w, i)
	}
	run := 0.0
	for k, v := range r.below {
		run += v
		r.below[k] = run / sum
	}
	return r
}

// level is the density above which the share mass lies, NaN unless 0 < mass < 1.
func (r ranked) level(mass float64) float64 {
	if !(mass > 0 && mass < 1) {
		return math.NaN()
	}
	k, _ := slices.BinarySearch(r.below, mass)
	before := 0.0
	if k > 0 {
		before = r.below[k-1]
	}
	t := (mass - before) / (r.below[k] - before)
	return max(0, r.high-(float64(k)+t)*r.step)
}

// Level is the density above which the given probability lies: {x: f(x) ≥ Level(0.68)} is the region of
// highest density that holds 68%. For a curve estimated from draws it is a quantile of the density at the draws
// (Hyndman 1996, Am. Statist. 50, 120), so that the region holds the right share even where the kernel has
// widened the curve. NaN unless 0 < mass < 1.
func (c *Curve) Level(mass float64) float64 {
	return c.ranks.level(mass)
}

// Level is that of Curve, in two dimensions.
func (s *Surface) Level(mass float64) float64 {
	return s.ranks.level(mass)
}

// quadrature ranks points spread evenly within every interval, weighted by the probability they stand for.
func (c *Curve) quadrature() ranked {
	const sub = 16
	var v, w []float64
	for i := 1; i < len(c.X); i++ {
		dx := (c.X[i] - c.X[i-1]) / sub
		for k := range sub {
			p := c.P[i-1] + (float64(k)+0.5)/sub*(c.P[i]-c.P[i-1])
			v, w = append(v, p), append(w, p*dx)
		}
	}
	return rank(v, w)
}

// quadrature is that of Curve on a cell's bilinear surface; coarse grids are divided more finely.
func (s *Surface) quadrature() ranked {
	nx := len(s.X)
	sub := int(math.Sqrt(3e5 / float64(len(s.P))))
	sub = max(1, min(sub, 12))
	var v, w []float64
	for j := 1; j < len(s.Y); j++ {
		for i := 1; i < nx; i++ {
			k := (j-1)*nx + i - 1
			area := (s.X[i] - s.X[i-1]) * (s.Y[j] - s.Y[j-1]) / float64(sub*sub)
			for b := range sub {
				u := (float64(b) + 0.5) / float64(sub)
				left, right := s.P[k]+u*(s.P[k+nx]-s.P[k]), s.P[k+1]+u*(s.P[k+nx+1]-s.P[k+1])
				for a := range sub {
					p := left + (float64(a)+0.5)/float64(sub)*(right-left)
					v, w = append(v, p), append(w, p*area)
				}
			}
		}
	}
	return rank(v, w)
}

// Interval is a closed stretch of the axis.
type Interval struct{ Lo, Hi float64 }

// Intervals returns the stretches, in ascending order, that make up the region of highest density with the
// given probability. A density with several peaks can have several. Nil unless 0 < mass < 1.
func (c *Curve) Intervals(mass float64) []Interval {
	level := c.Level(mass)
	if math.IsNaN(level) {
		return nil
	}
	var out []Interval
	for i, p := range c.P {
		above := p >= level
		before := i > 0 && c.P[i-1] >= level
		switch {
		case above && !before:
			out = append(out, Interval{c.crossing(i, level), c.X[len(c.X)-1]})
		case !above && before:
			out[len(out)-1].Hi = c.crossing(i, level)
		}
	}
	return out
}

// crossing is where the curve passes through level between nodes i-1 and i.
func (c *Curve) crossing(i int, level float64) float64 {
	if i == 0 {
		return c.X[0]
	}
	t := (level - c.P[i-1]) / (c.P[i] - c.P[i-1])
	return c.X[i-1] + t*(c.X[i]-c.X[i-1])
}
