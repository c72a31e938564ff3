package sampler

import (
	"math"
	"sort"

	"gonum.org/v1/gonum/mathext"
	"gonum.org/v1/gonum/stat/distuv"
)

// ordered is draws in ascending order with the probability up to the middle of
// each: (i − ½)/n for weights of one.
type ordered struct {
	x, p []float64
}

// sorted puts draws in order, those without weight left out. Its x is empty if
// there are none, or one is NaN.
func sorted(d Draws) ordered {
	x, w := make([]float64, 0, d.Len()), make([]float64, 0, d.Len())
	total, valid := 0.0, true
	d.each(func(v, weight float64) {
		x = append(x, v)
		w = append(w, weight)
		total += weight
		valid = valid && !math.IsNaN(v)
	})
	if !valid {
		return ordered{}
	}
	o := ordered{x: make([]float64, len(x)), p: make([]float64, len(x))}
	sum := 0.0
	for i, j := range order(x) {
		o.x[i] = x[j]
		o.p[i] = (sum + w[j]/2) / total
		sum += w[j]
	}
	return o
}

// quantile returns the value below which the draws have probability p, by
// linear interpolation between draws (definition 5 of Hyndman & Fan 1996, Am.
// Stat. 50, 361); beyond the first or last draw, that draw. NaN without draws.
func (o ordered) quantile(p float64) float64 {
	n := len(o.x)
	if n == 0 || math.IsNaN(p) {
		return math.NaN()
	}
	i := sort.SearchFloat64s(o.p, p)
	switch {
	case i == 0:
		return o.x[0]
	case i == n:
		return o.x[n-1]
	}
	f := (p - o.p[i-1]) / (o.p[i] - o.p[i-1])
	return o.x[i-1] + f*(o.x[i]-o.x[i-1])
}

// central returns the interval that leaves the same probability on both sides.
func (o ordered) central(probability float64) [2]float64 {
	tail := (1 - probability) / 2
	return [2]float64{o.quantile(tail), o.quantile(1 - tail)}
}

// densest returns the shortest interval from draw to draw that holds at least
// the given probability: the highest-density interval of a posterior with one
// peak (Chen & Shao 1999, J. Comput. Graph. Stat. 8, 69).
func (o ordered) densest(probability float64) [2]float64 {
	best := [2]float64{math.NaN(), math.NaN()}
	width := math.Inf(1)
	j := 0
	for i := range o.x {
		for j < len(o.x) && o.p[j]-o.p[i] < probability {
			j++
		}
		if j == len(o.x) {
			break
		}
		if o.x[j]-o.x[i] < width {
			width = o.x[j] - o.x[i]
			best = [2]float64{o.x[i], o.x[j]}
		}
	}
	return best
}

// mcse returns the Monte Carlo standard error of quantile p of the draws d,
// which o holds in order, by the method of Vehtari et al. (2021, §4): the
// effective sample size S of the indicator x ≤ quantile makes the probability
// below it a Beta(S p + 1, S (1−p) + 1) variable; half the distance between the
// draws' quantiles at its own ±1σ quantiles is the error. NaN where S is.
func (o ordered) mcse(d Draws, p float64) float64 {
	q := o.quantile(p)
	s := below(d, q).ess()
	if !(s > 0) || math.IsInf(s, 1) {
		return math.NaN()
	}
	sigma := distuv.UnitNormal.CDF(1)
	a, b := s*p+1, s*(1-p)+1
	low := o.quantile(mathext.InvRegIncBeta(a, b, 1-sigma))
	high := o.quantile(mathext.InvRegIncBeta(a, b, sigma))
	return (high - low) / 2
}

// below measures the indicator x ≤ q.
func below(d Draws, q float64) moments {
	if d.w != nil {
		return measure(d.Map(func(x float64) float64 {
			if x <= q {
				return 1
			}
			return 0
		}))
	}
	// The same, counted: a fifth of the time.
	series := make([][]float64, len(d.x))
	total := 0
	for m, x := range d.x {
		series[m] = make([]float64, d.steps())
		for t := range series[m] {
			count := 0
			for _, v := range x[t*d.walkers : (t+1)*d.walkers] {
				if v <= q {
					count++
				}
			}
			series[m][t] = float64(count)
			total += count
		}
	}
	p := float64(total) / float64(d.Len())
	for _, s := range series {
		for t := range s {
			s[t] = s[t]/float64(d.walkers) - p
		}
	}
	m := moments{mean: p, variance: p * (1 - p)}
	m.judge(series, d.spacing)
	return m
}

// Quantile returns the values below which the draws have the probabilities p;
// NaN for all if a draw is NaN or there are none. Each is interpolated linearly
// between draws.
func Quantile(d Draws, p ...float64) []float64 {
	o := sorted(d)
	q := make([]float64, len(p))
	for i := range p {
		q[i] = o.quantile(p[i])
	}
	return q
}
