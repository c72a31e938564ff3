package likelihood

import (
	"fmt"
	"slices"
	"sort"
	"sync"
	"sync/atomic"

	"omen/model"
)

const speedOfLight = model.C

// Posterior is a space of universes with the terms that judge them. It is
// immutable; each goroutine evaluates it through an Evaluator of its own.
type Posterior struct {
	space *Space
	terms []Term

	levels []*level // ever more nodes; none if the evaluation is direct throughout
	others others   // the terms that are not condensed

	all    lines       // the redshifts of all terms, for the direct evaluation
	path   *model.Path // to them; made when first needed
	once   sync.Once
	direct atomic.Int64
}

// lines is the redshifts that some terms need.
type lines struct {
	z     []float64 // ascending, once each
	index [][]int   // for each term, where its redshifts stand in z
}

func newLines(terms []Term) (l lines) {
	for _, t := range terms {
		l.z = append(l.z, t.Redshifts()...)
	}
	slices.Sort(l.z)
	l.z = slices.Clip(slices.Compact(l.z))
	for _, t := range terms {
		at := make([]int, len(t.Redshifts()))
		for i, z := range t.Redshifts() {
			at[i] = sort.SearchFloat64s(l.z, z)
		}
		l.index = append(l.index, at)
	}
	return l
}

// others is the terms that are not condensed. Their redshifts up to the span of
// the nodes come with these, the rest, such as that of the CMB, by a path.
type others struct {
	terms []Term
	lines
	near int // redshifts within the span
	far  *model.Path
}

// nearby is how far nodes reach for the sake of terms that are not condensed: to
// much higher redshifts it would take very many of them.
const nearby = 5

// NewPosterior checks that the space knows what the terms need, and condenses the
// supernovae among them.
func NewPosterior(space *Space, terms ...Term) (*Posterior, error) {
	if len(terms) == 0 {
		return nil, fmt.Errorf("there are no data; name at least one table")
	}
	for _, t := range terms {
		if err := checkNeeds(space, t); err != nil {
			return nil, err
		}
	}
	p := &Posterior{space: space, terms: terms}
	p.condense()
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

// condense sorts the terms and prepares the levels of nodes.
func (p *Posterior) condense() {
	var tables []*Supernovae
	span := 0.0
	for _, t := range p.terms {
		s, ok := t.(*Supernovae)
		if ok {
			tables = append(tables, s)
		} else {
			p.others.terms = append(p.others.terms, t)
		}
		for _, z := range t.Redshifts() {
			if ok || z <= nearby {
				span = max(span, z)
			}
		}
	}
	o := &p.others
	o.lines = newLines(o.terms)
	o.near = sort.Search(len(o.z), func(i int) bool { return o.z[i] > span })
	o.far = newPath(o.z[o.near:])
	if span == 0 {
		return
	}
	p.levels = newLevels(span, o.z[:o.near], tables)
}

func newPath(z []float64) *model.Path {
	if len(z) == 0 {
		return nil
	}
	path, err := model.NewPath(z)
	if err != nil {
		panic("likelihood: redshifts that no table reader admits: " + err.Error())
	}
	return path
}

// prepareDirect lays out the line of sight to all redshifts. With a million
// supernovae it is large, and most runs never need it.
func (p *Posterior) prepareDirect() {
	p.once.Do(func() {
		p.all = newLines(p.terms)
		p.path = newPath(p.all.z)
	})
}

// Direct is the same posterior without the condensed form: every evaluation goes
// over all rows. It is the reference that the condensed form is tested against.
func (p *Posterior) Direct() *Posterior {
	return &Posterior{space: p.space, terms: p.terms}
}

// DirectEvaluations counts the universes that needed more than the condensed
// form: how often all evaluators so far went over all rows for a chi-squared.
func (p *Posterior) DirectEvaluations() int { return int(p.direct.Load()) }

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

// Parameters counts what is fitted: the free parameters and the marginalised offsets.
// A parameter that the data cannot constrain still counts.
func (p *Posterior) Parameters() int {
	n := p.space.Dim()
	for _, t := range p.terms {
		n += t.Offsets()
	}
	return n
}

// Measurements is the rows without those that are bounds: where a bound is kept it adds
// nothing to chi-squared.
func (p *Posterior) Measurements() int {
	n := p.Rows()
	for _, t := range p.terms {
		if b, ok := t.(bounded); ok {
			n -= b.bounds()
		}
	}
	return n
}

// DegreesOfFreedom is the measurements less the parameters.
func (p *Posterior) DegreesOfFreedom() int { return p.Measurements() - p.Parameters() }
