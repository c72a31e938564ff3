package model

import (
	"fmt"
	"math"
	"sort"
)

// panelWidth is the greatest width in ln(1+z) of the panels of a Path. The integrand's nearest singularity is
// about 1 away in a universe like ours; with 0.3 the twelve terms of a panel are then good to 1e-13.
const panelWidth = 0.3

// Path is a line of sight to a fixed, ascending list of redshifts, prepared for many universes. The integral of
// (1+z)/E over ln(1+z) is expanded in Legendre polynomials on a few panels; the weights with which a panel's
// twelve values of the integrand give the integral up to each redshift do not depend on the universe and are
// computed once. A panel whose last coefficients are not small is halved on the fly until they are.
//
// Fill changes nothing in a Path, so one may serve several goroutines.
type Path struct {
	x, y, a []float64 // 1+z, ln(1+z) and 1/(1+z) of the redshifts
	weight  [][order]float64
	panels  []pathPanel
}

// pathPanel is one panel and the redshifts first … last-1 that lie in it.
type pathPanel struct {
	lo, hi      float64 // in ln(1+z)
	first, last int
	x, y, a     [order]float64 // 1+z, ln(1+z) and 1/(1+z) of the nodes
}

// NewPath prepares a Path to the given redshifts, which must be positive, finite and ascending; equal ones are
// fine. The slice is not kept.
func NewPath(z []float64) (*Path, error) {
	if len(z) == 0 {
		return nil, fmt.Errorf("model: a path needs at least one redshift")
	}
	p := &Path{weight: make([][order]float64, len(z))}
	for i, v := range z {
		if !(v > 0) || math.IsInf(v, 0) {
			return nil, fmt.Errorf("model: redshift %d of a path is %v, must be positive and finite", i, v)
		}
		if i > 0 && v < z[i-1] {
			return nil, fmt.Errorf("model: redshifts of a path must ascend: %v follows %v at %d", v, z[i-1], i)
		}
		p.x = append(p.x, 1+v)
		p.y = append(p.y, math.Log1p(v))
		p.a = append(p.a, 1/(1+v))
	}
	p.divide()
	return p, nil
}

// divide lays out the panels and the weights of the redshifts in them.
func (p *Path) divide() {
	end := p.y[len(p.y)-1]
	n := int(math.Ceil(end / panelWidth))
	first := 0
	for j := range n {
		g := pathPanel{lo: end * float64(j) / float64(n), hi: end * float64(j+1) / float64(n), first: first}
		g.last = len(p.y)
		if j < n-1 {
			g.last = sort.Search(len(p.y), func(i int) bool { return p.y[i] > g.hi })
		}
		first = g.last
		mid, half := (g.lo+g.hi)/2, (g.hi-g.lo)/2
		for k, t := range panel.x {
			g.y[k] = mid + half*t
			g.x[k] = math.Exp(g.y[k])
			g.a[k] = math.Exp(-g.y[k])
		}
		for i := g.first; i < g.last; i++ {
			p.weight[i] = denseWeights((p.y[i]-g.lo)/half, half)
		}
		p.panels = append(p.panels, g)
	}
}

// denseWeights gives the weights of the node values in the integral over the first part of a panel, up to the
// distance above (in half-widths) from its lower end.
func denseWeights(above, half float64) (w [order]float64) {
	var q [order]float64
	antiderivatives(above, &q)
	for k := range w {
		for m := range q {
			w[k] += half * q[m] * panel.coef[m][k]
		}
	}
	return w
}

// Len is the number of redshifts.
func (p *Path) Len() int { return len(p.y) }

// Fill computes the transverse comoving distance DM and the Hubble distance DH = 1/E at every redshift in
// units of c/H0 (H0 itself is not used). dm must have the length of the path; dh too, or be nil if DH is not
// needed. At and beyond a bounce both are NaN, past the antipode DM is. The relative accuracy is 1e-10.
func (p *Path) Fill(u Universe, dm, dh []float64) {
	if len(dm) != len(p.y) || dh != nil && len(dh) != len(p.y) {
		panic("model: Path.Fill needs one element per redshift")
	}
	e := u.expansion()
	valid := len(p.y)
	if reach := e.reach(); p.y[valid-1] >= reach {
		valid = sort.SearchFloat64s(p.y, reach)
	}
	chi := 0.0
	for j := range p.panels {
		g := &p.panels[j]
		if g.first >= valid {
			break
		}
		chi = p.fillPanel(&e, g, chi, valid, dm)
	}
	for i := range dm[:valid] {
		dm[i] = transverse(e.ok, dm[i])
	}
	for i := valid; i < len(dm); i++ {
		dm[i] = math.NaN()
	}
	if dh != nil {
		p.fillHubble(&e, valid, dh)
	}
}

// fillPanel writes the line-of-sight distances of one panel, which begins at distance chi, and returns the
// distance at its end.
func (p *Path) fillPanel(e *expansion, g *pathPanel, chi float64, valid int, dm []float64) float64 {
	if g.last > valid || g.last == valid && valid < len(p.y) {
		// The bounce is in this panel, or near: go no further than the last redshift before it.
		d := descent{p, e, dm, panelBudget}
		return d.refine(g.lo, p.y[valid-1], chi, g.first, valid, maxDepth)
	}
	var f [order]float64
	for k := range f {
		f[k] = g.x[k] / math.Sqrt(e.squared(g.x[k], g.y[k], g.a[k]))
	}
	mean := panel.mean(f[:])
	if !(panel.omitted(f[:]) <= denseTail*mean) {
		d := descent{p, e, dm, panelBudget}
		return d.refine(g.lo, g.hi, chi, g.first, g.last, maxDepth)
	}
	for i := g.first; i < g.last; i++ {
		w := &p.weight[i]
		s0 := w[0]*f[0] + w[1]*f[1] + w[2]*f[2] + w[3]*f[3]
		s1 := w[4]*f[4] + w[5]*f[5] + w[6]*f[6] + w[7]*f[7]
		s2 := w[8]*f[8] + w[9]*f[9] + w[10]*f[10] + w[11]*f[11]
		dm[i] = chi + (s0 + s1 + s2)
	}
	return chi + mean*(g.hi-g.lo)
}

// descent is the halving of one panel of a Path whose expansion has not converged.
type descent struct {
	p      *Path
	e      *expansion
	dm     []float64
	budget int // panels that may still be evaluated
}

// refine does the work of fillPanel between lo and hi for the redshifts first … last-1.
func (d *descent) refine(lo, hi, chi float64, first, last, depth int) float64 {
	mid, half := (lo+hi)/2, (hi-lo)/2
	values, noise := d.e.comovingRate(panel.between(mid, half), order)
	f := [order]float64(values[:])
	mean, omitted := panel.mean(f[:]), panel.omitted(f[:])-noise
	d.budget--
	// Without a redshift inside only the integral over the panel matters.
	good := omitted <= denseTail*mean || first == last && omitted <= integralTail*mean
	if !good && depth > 0 && d.budget > 0 && omitted == omitted {
		cut := first + sort.SearchFloat64s(d.p.y[first:last], mid)
		chi = d.refine(lo, mid, chi, first, cut, depth-1)
		return d.refine(mid, hi, chi, cut, last, depth-1)
	}
	if first < last {
		d.readOff(&f, lo, half, chi, first, last)
	}
	return chi + mean*(hi-lo)
}

// readOff writes the distances to the redshifts first … last-1 of a panel that has converged.
func (d *descent) readOff(f *[order]float64, lo, half, chi float64, first, last int) {
	var c, q [order]float64
	panel.series(f, &c)
	for i := first; i < last; i++ {
		antiderivatives((d.p.y[i]-lo)/half, &q)
		sum := 0.0
		for m := range q {
			sum += c[m] * q[m]
		}
		d.dm[i] = chi + half*sum
	}
}

// fillHubble writes 1/E.
func (p *Path) fillHubble(e *expansion, valid int, dh []float64) {
	for i := range dh[:valid] {
		dh[i] = 1 / math.Sqrt(e.squared(p.x[i], p.y[i], p.a[i]))
	}
	for i := valid; i < len(dh); i++ {
		dh[i] = math.NaN()
	}
}
