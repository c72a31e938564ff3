package likelihood

import (
	"fmt"
	"math"
	"slices"
	"sort"

	"omen/model"
)

const speedOfLight = model.C

// Posterior is a space of universes with the terms that judge them. It is
// immutable; each goroutine evaluates it through an Evaluator of its own.
type Posterior struct {
	space *Space
	terms []Term
	z     []float64 // all redshifts that any term needs, ascending, once each
	index [][]int   // for each term, where its redshifts stand in z
	most  int       // the most redshifts or rows that a term has
}

// NewPosterior checks that the space knows what the terms need.
func NewPosterior(space *Space, terms ...Term) (*Posterior, error) {
	if len(terms) == 0 {
		return nil, fmt.Errorf("there are no data; name at least one table")
	}
	p := &Posterior{space: space, terms: terms}
	for _, t := range terms {
		if err := checkNeeds(space, t); err != nil {
			return nil, err
		}
		p.z = append(p.z, t.Redshifts()...)
		p.most = max(p.most, t.Rows(), len(t.Redshifts()))
	}
	slices.Sort(p.z)
	p.z = slices.Compact(p.z)
	for _, t := range terms {
		at := make([]int, len(t.Redshifts()))
		for i, z := range t.Redshifts() {
			at[i] = sort.SearchFloat64s(p.z, z)
		}
		p.index = append(p.index, at)
	}
	return p, nil
}

func checkNeeds(s *Space, t Term) error {
	n, ok := t.(needer)
	if !ok {
		return nil
	}
	needs := n.Needs()
	switch {
	case needs.H0 && !s.KnowsH0():
		return fmt.Errorf("these data need H0; give it a prior or a fixed value, in km/s/Mpc")
	case needs.HRd && !s.KnowsHRd():
		return fmt.Errorf("BAO ratios need the sound horizon: give hrd a prior, or H0 together with rd or ob")
	case needs.M && !s.KnowsM():
		return fmt.Errorf("absolute magnitudes need M; give it a prior or a fixed value, or leave the offset free")
	}
	return nil
}

// Space returns the space of universes.
func (p *Posterior) Space() *Space { return p.space }

// Terms returns the terms in the order given.
func (p *Posterior) Terms() []Term { return p.terms }

// Rows counts the measurements that all terms stand for.
func (p *Posterior) Rows() int {
	n := 0
	for _, t := range p.terms {
		n += t.Rows()
	}
	return n
}

// DegreesOfFreedom is the rows less the free parameters and the marginalised
// offsets. A parameter that the data cannot constrain still counts.
func (p *Posterior) DegreesOfFreedom() int {
	dof := p.Rows() - p.space.Dim()
	for _, t := range p.terms {
		dof -= t.Offsets()
	}
	return dof
}

// Evaluator computes the posterior with scratch memory of its own: it is for one
// goroutine at a time.
type Evaluator struct {
	posterior *Posterior
	path      *model.Path
	dm, dh    []float64 // at posterior.z
	point     Point
	each      []Prediction // one for each term
}

// Evaluator returns a new evaluator.
func (p *Posterior) Evaluator() *Evaluator {
	e := &Evaluator{posterior: p, dm: make([]float64, len(p.z)), dh: make([]float64, len(p.z))}
	if len(p.z) > 0 {
		path, err := model.NewPath(p.z)
		if err != nil {
			panic("likelihood: redshifts that no table reader admits: " + err.Error())
		}
		e.path = path
	}
	work := make([]float64, p.most)
	for _, at := range p.index {
		e.each = append(e.each, Prediction{DM: make([]float64, len(at)), DH: make([]float64, len(at)), work: work})
	}
	return e
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
	if !e.predict(x) {
		return math.NaN()
	}
	sum := 0.0
	for k, t := range e.posterior.terms {
		sum += t.Chi2(&e.each[k])
	}
	return sum
}

// TermChi2 is Chi2 for each term by itself, written to dst, one for each term.
func (e *Evaluator) TermChi2(x, dst []float64) {
	ok := e.predict(x)
	for k, t := range e.posterior.terms {
		dst[k] = math.NaN()
		if ok {
			dst[k] = t.Chi2(&e.each[k])
		}
	}
}

// Predictions evaluates the universe at x for every term, for residuals. They
// are valid until the next call; ok is false where the universe is excluded.
func (e *Evaluator) Predictions(x []float64) (each []Prediction, ok bool) {
	ok = e.predict(x)
	return e.each, ok
}

// predict fills the point and the distances for every term.
func (e *Evaluator) predict(x []float64) bool {
	p := e.posterior
	p.space.Point(x, &e.point)
	if !p.space.allowed(&e.point.Universe) {
		return false
	}
	if e.path != nil {
		e.path.Fill(e.point.Universe, e.dm, e.dh)
	}
	for k, at := range p.index {
		each := &e.each[k]
		each.Point = e.point
		for i, j := range at {
			each.DM[i], each.DH[i] = e.dm[j], e.dh[j]
		}
	}
	return true
}
