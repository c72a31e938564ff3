package likelihood

import (
	"math"

	"omen/model"
)

// Evaluator computes the posterior with scratch memory of its own: it is for one
// goroutine at a time.
type Evaluator struct {
	posterior *Posterior
	point     Point
	levels    []levelScratch
	dm, dh    []float64    // at the redshifts of the terms that are not condensed
	each      []Prediction // one for each of these terms
	direct    *direct      // made when first needed

	// What the distances above are those of: a universe but for its H0, and the
	// level, from 1, that computed them. A scan of hrd or M, of which an integral
	// does many, then needs no new ones.
	shape  model.Universe
	filled int
}

// Evaluator returns a new evaluator.
func (p *Posterior) Evaluator() *Evaluator {
	o := &p.others
	e := &Evaluator{posterior: p, dm: make([]float64, len(o.z)), dh: make([]float64, len(o.z))}
	for _, l := range p.levels {
		e.levels = append(e.levels, l.scratch(e.dm[:o.near], e.dh[:o.near]))
	}
	if len(p.levels) > 0 {
		e.each = predictions(o.terms)
	}
	return e
}

// predictions is memory for what terms are handed; they share their scratch.
func predictions(terms []Term) []Prediction {
	each := make([]Prediction, len(terms))
	most := 0
	for k, t := range terms {
		n := len(t.Redshifts())
		each[k].DM, each[k].DH = make([]float64, n), make([]float64, n)
		most = max(most, t.scratch())
	}
	work := make([]float64, most)
	for k := range each {
		each[k].work = work
	}
	return each
}

// LogDensity is the logarithm of prior times likelihood at x, up to a constant
// that depends on the data alone; -Inf outside the support.
func (e *Evaluator) LogDensity(x []float64) float64 {
	lp := e.posterior.space.logPrior(x)
	if math.IsInf(lp, -1) {
		return lp
	}
	chi2 := e.Chi2(x)
	if math.IsNaN(chi2) {
		return math.Inf(-1)
	}
	return lp - chi2/2
}

// Chi2 is the chi-squared of all terms at x, NaN where the family or the domain
// of a distance excludes the universe. It does not look at the priors.
func (e *Evaluator) Chi2(x []float64) float64 {
	p := e.posterior
	p.space.Point(x, &e.point)
	if !p.space.allowed(&e.point.Universe) {
		return math.NaN()
	}
	shape := e.point.Universe
	shape.H0 = 0
	for i := range e.levels {
		if e.filled != i+1 || e.shape != shape {
			e.fill(i, shape)
		}
		if chi2, ok := e.levels[i].chi2(&e.point); ok {
			return chi2 + e.rest()
		}
	}
	if len(e.levels) > 0 {
		p.direct.Add(1)
	}
	return e.directly().chi2(&e.point)
}

// fill computes the distances of a universe at a level.
func (e *Evaluator) fill(level int, shape model.Universe) {
	if o := &e.posterior.others; o.far != nil && e.shape != shape {
		o.far.Fill(shape, e.dm[o.near:], e.dh[o.near:])
	}
	e.levels[level].fill(shape)
	e.shape, e.filled = shape, level+1
}

// rest is the chi-squared of the terms that are not condensed, from the distances
// that a level has left.
func (e *Evaluator) rest() float64 {
	o := &e.posterior.others
	sum := 0.0
	for k, t := range o.terms {
		e.each[k].take(&e.point, o.index[k], e.dm, e.dh)
		sum += t.Chi2(&e.each[k])
	}
	return sum
}

// take picks a term's distances from those of all terms.
func (p *Prediction) take(point *Point, index []int, dm, dh []float64) {
	p.Point = *point
	for i, j := range index {
		p.DM[i], p.DH[i] = dm[j], dh[j]
	}
}

// TermChi2 is Chi2 for each term by itself, written to dst, one for each term.
func (e *Evaluator) TermChi2(x, dst []float64) {
	each, ok := e.Predictions(x)
	for k, t := range e.posterior.terms {
		dst[k] = math.NaN()
		if ok {
			dst[k] = t.Chi2(&each[k])
		}
	}
}

// Predictions evaluates the universe at x for every term, for residuals. They
// are valid until the next call; ok is false where the universe is excluded.
func (e *Evaluator) Predictions(x []float64) (each []Prediction, ok bool) {
	p := e.posterior
	p.space.Point(x, &e.point)
	d := e.directly()
	if !p.space.allowed(&e.point.Universe) {
		return d.each, false
	}
	d.predict(&e.point)
	return d.each, true
}

// direct is the evaluation over all rows of all terms.
type direct struct {
	posterior *Posterior
	dm, dh    []float64 // at posterior.all.z
	each      []Prediction
}

func (e *Evaluator) directly() *direct {
	if e.direct == nil {
		p := e.posterior
		p.prepareDirect()
		e.direct = &direct{posterior: p, dm: make([]float64, len(p.all.z)), dh: make([]float64, len(p.all.z)), each: predictions(p.terms)}
	}
	return e.direct
}

// predict fills the distances for every term.
func (d *direct) predict(point *Point) {
	p := d.posterior
	if p.path != nil {
		p.path.Fill(point.Universe, d.dm, d.dh)
	}
	for k := range d.each {
		d.each[k].take(point, p.all.index[k], d.dm, d.dh)
	}
}

func (d *direct) chi2(point *Point) float64 {
	d.predict(point)
	sum := 0.0
	for k, t := range d.posterior.terms {
		sum += t.Chi2(&d.each[k])
	}
	return sum
}
