package likelihood

import (
	"math"
	"slices"

	"omen/model"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
)

// Chi-squared of any number of supernovae costs the same. Write the logarithmic
// distance as
//
//	5 log10 D_M(z) = 5 log10 z + Σ_k B_k(z) g_k,   g_k = 5 log10(D_M/z) at node k
//
// with the polynomials B_k of [model.Nodes], which do not depend on the universe.
// The residuals of a table are then linear in g and in the little else that
// matters: v = [g, the zero point 5 log10(c/H0) + 25, M, 1]. With the noise's map
// W, the offset's column 1 and the thin QR
//
//	W [1, B, 1, 1, -target] = Q R,   chi² = |R [offset, v]|²,
//
// and the minimum over a free offset, which is what marginalising it leaves, drops
// the first row and column of R. A normal prior is one row more. What remains of
// several tables is stacked and factorised again, so that all supernovae of a
// posterior become one triangle
//
//	chi² = |T v + t|² + constant
//
// of about as many rows as there are nodes.
//
// The error is known for each universe. Let δ bound the errors of g between the
// nodes, from the last Chebyshev coefficients of g and of the integrand of the
// distance (Trefethen 2013, Approximation Theory and Approximation Practice,
// ch. 4 and 8). It is carried by polynomials of degree n+1 and more; with s the
// norm of W times the first of them, after the offsets are taken out, and the
// excess |T v + t|² of chi² over what no expansion could better,
//
//	|Δchi²| ≤ 2 (√excess + c) s δ + (s δ)².
//
// Here c is for the part of the residuals that is noise to every polynomial. It has
// the norm ρ = √constant, but no reason to be aligned with one in particular: of
// its N numbers four standard deviations are allowed for, c = 4ρ/√N.
//
// Where that is too much the universe goes to more nodes, and from there to the
// direct evaluation over all rows.
type level struct {
	nodes *model.Nodes
	columns
	rule     blas64.General // T, then what turns g into its last Chebyshev coefficients
	start    []float64      // t, then zeros
	squares  int            // rows of T
	constant float64        // of chi²
	weight   float64        // s
	noise    float64        // c
	enough   float64        // the largest error of distances that is not given up at once
	toEnd    bool           // supernovae are seen up to the last node
}

const (
	// tolerance is how much of an error of chi² is let pass. Universes whose excess
	// is beyond remote have a likelihood below e⁻⁵⁰⁰⁰ of the best; with very many
	// supernovae nearly all are such. Of these it is enough to know how remote.
	tolerance = 5e-7
	remote    = 1e4
	// distanceTolerance bounds the relative error of the distances that other
	// terms than supernovae are given, and hopeless that from which on the nodes
	// are not tried for supernovae either.
	distanceTolerance = 1e-11
	hopeless          = 1e-4
)

// allowed is the error of chi² that is let pass at an excess.
func allowed(excess float64) float64 {
	far := excess / remote
	return math.Min(tolerance*(1+far*far*far*far), 0.01*(1+excess))
}

// magnitudes is 5/ln 10: magnitudes per unit of the natural logarithm of distance.
const magnitudes = 5 / math.Ln10

// columns says where things stand in v, and in the rows of a triangle over
// [v, the aliased polynomial].
type columns struct {
	g, zero, m int // number of nodes; places of the zero point and of M, -1 if not needed
	one        int // place of the last element of v, which is 1
}

func columnsFor(nodes int, tables []*Supernovae) columns {
	c := columns{g: nodes, zero: -1, m: -1, one: nodes}
	for _, s := range tables {
		if s.offset.Kind != FreeOffset && c.zero < 0 {
			c.zero = c.one
			c.one++
		}
		if s.Needs().M && c.m < 0 {
			c.m = c.one
			c.one++
		}
	}
	return c
}

// condensed is condense, computed once: a posterior is often followed by others of
// the same tables, for other families.
func (s *Supernovae) condensed(nodes *model.Nodes, c columns) []float64 {
	key := condensedKey{nodes.Z(nodes.Len() - 1), c}
	s.lock.Lock()
	defer s.lock.Unlock()
	if s.triangles[key] == nil {
		s.triangles[key] = s.recall(nodes, c)
	}
	return s.triangles[key]
}

// condensedKey is what a condensed form depends on beside its table.
type condensedKey struct {
	span float64
	columns
}

// recall is condense, from the memory if that has it.
func (s *Supernovae) recall(nodes *model.Nodes, c columns) []float64 {
	if s.memory == nil {
		return s.condense(nodes, c)
	}
	key, side := s.key(nodes, c), c.one+2
	if r, ok := s.memory.Recall(key); ok && len(r) == side*side {
		return r
	}
	r := s.condense(nodes, c)
	s.memory.Keep(key, r)
	return r
}

// form is the first number of a key. It changes when the same inputs would be
// condensed to other numbers.
const form = 1

// key is everything that condense depends on but the noise.
func (s *Supernovae) key(nodes *model.Nodes, c columns) []float64 {
	key := make([]float64, 0, 8+c.g+2*len(s.z))
	key = append(key, form, float64(s.offset.Kind), s.offset.Mean, s.offset.SD,
		float64(c.g), float64(c.zero), float64(c.m), float64(c.one))
	for k := range c.g {
		key = append(key, nodes.Z(k))
	}
	key = append(key, s.z...)
	return append(key, s.target...)
}

// condense is the triangle over [v, the aliased polynomial] of one table, its
// offset taken out.
func (s *Supernovae) condense(nodes *model.Nodes, c columns) []float64 {
	t := newTriangle(1 + c.one + 2)
	known := 0.0
	if s.offset.Kind == NormalOffset {
		t.r.Data[0] = 1 / s.offset.SD
		known = s.offset.Mean
	}
	s.noise.reduce(t, func(i int, row []float64) {
		clear(row)
		v := row[1:]
		nodes.Interpolation(s.z[i], v[:c.g])
		for k := range v[:c.g] {
			v[k] *= magnitudes
		}
		if s.offset.Kind != AbsoluteOffset {
			row[0] = 1
		}
		if s.offset.Kind != FreeOffset {
			v[c.zero] = 1
		}
		if s.Needs().M {
			v[c.m] = 1
		}
		v[c.one] = known - s.target[i] + 5*math.Log10(s.z[i])
		v[c.one+1] = magnitudes * nodes.Alias(s.z[i])
	})
	return t.without(1)
}

// manyRows is the number of supernovae from which on the last level is left out.
// It would take longer to prepare than it saves, as most of the prior is remote.
const manyRows = 50_000

// newLevels condenses tables on as few nodes as universes like ours need, and on
// twice and four times as many for those near the no-big-bang line. The data are
// gone through once, with the most nodes; a polynomial through fewer is one
// through more.
func newLevels(span float64, further []float64, tables []*Supernovae) (levels []*level) {
	n, rows := model.NodesFor(span), 0
	for _, s := range tables {
		rows += len(s.z)
	}
	factors := []int{1, 2, 4}
	if rows > manyRows {
		factors = []int{1, 2}
	}
	for _, f := range factors {
		levels = append(levels, newLevel(span, f*n, further, tables))
	}
	if len(tables) == 0 {
		return levels
	}
	most := levels[len(levels)-1]
	t := newTriangle(most.one + 2)
	for _, s := range tables {
		t.add(s.condensed(most.nodes, most.columns))
	}
	for _, l := range levels[:len(levels)-1] {
		l.split(most.onto(l, t), rows)
	}
	most.split(t, rows)
	return levels
}

func newLevel(span float64, n int, further []float64, tables []*Supernovae) *level {
	nodes, err := model.NewNodes(span, n, further)
	if err != nil {
		panic("likelihood: redshifts that no table reader admits: " + err.Error())
	}
	l := &level{nodes: nodes, enough: hopeless}
	if len(further) > 0 {
		l.enough = distanceTolerance
	}
	if len(tables) > 0 {
		l.columns = columnsFor(n, tables)
	}
	for _, s := range tables {
		l.constant += s.standing.Chi2
		l.toEnd = l.toEnd || slices.Max(s.z) == span
	}
	return l
}

// onto turns a triangle over [v, the aliased polynomial] into that of a level with
// fewer nodes.
func (l *level) onto(few *level, t *triangle) *triangle {
	n := few.columns.g
	weights := make([][]float64, l.columns.g) // values at our nodes from those at the few
	alias := make([]float64, l.columns.g)
	for k := range weights {
		z := l.nodes.Z(k)
		weights[k] = make([]float64, n)
		few.nodes.Interpolation(z, weights[k])
		alias[k] = few.nodes.Alias(z)
	}
	out := newTriangle(few.one + 2)
	r := t.rows()
	out.stream(t.columns, func(i int, row []float64) {
		clear(row)
		wide := r[i*t.columns : (i+1)*t.columns]
		for k, w := range weights {
			floats.AddScaled(row[:n], wide[k], w)
			row[few.one+1] += wide[k] * alias[k]
		}
		copy(row[n:few.one+1], wide[l.columns.g:])
	})
	return out
}

// split takes the triangle over [v, the aliased polynomial] apart.
func (l *level) split(t *triangle, rows int) {
	l.squares = l.one
	r := t.rows()
	at := func(i, j int) float64 { return r[i*t.columns+j] }
	last := l.nodes.LastCoefficients()
	l.rule = blas64.General{Rows: l.squares + len(last), Cols: l.one, Stride: l.one, Data: make([]float64, (l.squares+len(last))*l.one)}
	l.start = make([]float64, l.rule.Rows)
	for i := range l.squares {
		for j := i; j < l.one; j++ {
			l.rule.Data[i*l.one+j] = at(i, j)
		}
		l.start[i] = at(i, l.one)
	}
	for i, row := range last {
		copy(l.rule.Data[(l.squares+i)*l.one:], row)
	}
	rest := at(l.one, l.one)
	l.constant += rest * rest
	l.noise = 4 * math.Abs(rest) / math.Sqrt(float64(rows))
	for i := range t.columns {
		l.weight = math.Hypot(l.weight, at(i, l.one+1))
	}
}

// levelScratch is the memory of a level for one goroutine.
type levelScratch struct {
	*level
	sight   *model.Sight
	v, out  []float64
	omitted float64 // of the last fill
}

// scratch makes that memory. dm and dh receive the distances at the further
// redshifts.
func (l *level) scratch(dm, dh []float64) levelScratch {
	s := levelScratch{level: l, sight: l.nodes.Sight(), v: make([]float64, l.one), out: make([]float64, len(l.start))}
	s.sight.DM, s.sight.DH = dm, dh
	s.sight.Shape = nil
	if l.one > 0 {
		s.sight.Shape = s.v[:l.columns.g]
	}
	return s
}

// fill computes the distances of a universe.
func (s *levelScratch) fill(u model.Universe) { s.omitted = s.nodes.Fill(u, s.sight) }

// chi2 is the chi-squared of the condensed tables at p, whose universe was filled
// in last; ok is false where the nodes are too few for it. If it is true the further
// distances are good too.
func (s *levelScratch) chi2(p *Point) (chi2 float64, ok bool) {
	omitted := s.omitted
	if !(omitted <= s.enough) {
		return math.NaN(), false
	}
	if s.one == 0 {
		return 0, true
	}
	if s.toEnd && s.sight.Past {
		return math.NaN(), true
	}
	if s.zero >= 0 {
		s.v[s.zero] = zeroPoint(p.Universe.H0)
	}
	if s.m >= 0 {
		s.v[s.m] = p.M
	}
	copy(s.out, s.start)
	blas64.Gemv(blas.NoTrans, 1, s.rule, blas64.Vector{N: s.one, Data: s.v, Inc: 1}, 1, blas64.Vector{N: len(s.out), Data: s.out, Inc: 1})
	for _, w := range s.out[:s.squares] {
		chi2 += w * w
	}
	e := s.weight * (omitted + model.Remainder(s.out[s.squares:]))
	return chi2 + s.constant, e*(2*(math.Sqrt(chi2)+s.noise)+e) <= allowed(chi2)
}
