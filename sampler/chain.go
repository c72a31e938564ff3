package sampler

import (
	"fmt"
	"iter"
	"slices"

	"gonum.org/v1/gonum/mat"
)

// DefaultRecord bounds the numbers that a chain keeps in memory: 2²¹ of them,
// 16 MB. For six parameters that is at least 150 000 draws; a summary of them all,
// with what is derived from them, takes ten times the memory.
const DefaultRecord = 1 << 21

// Chain is the record of a run: the positions and log-densities of all walkers
// of all ensembles at steps every, 2·every, … It also knows the last complete
// step given to it, from which a run can go on.
//
// The record is bounded. When it is full, every second recorded step is dropped
// and the spacing of the record doubles, so that it still covers the whole run;
// which steps are kept depends on their number alone.
type Chain struct {
	dim, walkers int
	every        int // steps between the rows that are offered
	spacing      int // steps between the rows that are kept
	bound        int // numbers kept at most

	x, logp [][]float64 // by ensemble: kept steps × walkers (× dim)
	mean    [][]float64 // by ensemble: kept steps × dim, over its walkers
	kept    int         // steps in the record

	last         int         // the last complete step offered
	lastX, lastP [][]float64 // by ensemble; lastP is nil before the first step
	accepted     int         // proposals accepted so far
}

// NewChain makes an empty chain of ensembles that start at the given positions:
// for each ensemble, a row of dim numbers per walker. It keeps every every-th
// step, and at most record numbers. It is an error if the ensembles differ in
// size, are too small, or do not span the space (no move would ever leave
// their plane).
func NewChain(dim int, start [][]float64, every, record int) (*Chain, error) {
	if len(start) == 0 {
		return nil, fmt.Errorf("sampler: a chain needs at least one ensemble")
	}
	for m, x := range start {
		if err := checkShape(dim, x); err != nil {
			return nil, err
		}
		if len(x) != len(start[0]) {
			return nil, fmt.Errorf("sampler: ensemble %d has %d numbers, the first has %d", m, len(x), len(start[0]))
		}
		if !spans(dim, x) {
			return nil, fmt.Errorf("sampler: the walkers of ensemble %d do not span all %d directions; start them at independent random places", m, dim)
		}
	}
	if every < 1 {
		return nil, fmt.Errorf("sampler: cannot record every %d steps", every)
	}
	c := &Chain{
		dim:     dim,
		walkers: len(start[0]) / dim,
		every:   every,
		spacing: every,
		x:       make([][]float64, len(start)),
		logp:    make([][]float64, len(start)),
		mean:    make([][]float64, len(start)),
		lastX:   cloneAll(start),
	}
	// Two records at least, or there would be nothing to halve.
	c.bound = max(record, 2*c.numbersPerStep())
	return c, nil
}

// spans reports whether walkers in dim dimensions, each direction scaled to its
// own spread, reach out in every direction.
func spans(dim int, x []float64) bool {
	n := len(x) / dim
	m := mat.NewDense(n, dim, append([]float64(nil), x...))
	for i := range dim {
		column := mat.Col(nil, i, m)
		mean := mat.Sum(mat.NewVecDense(n, column)) / float64(n)
		for k := range column {
			column[k] -= mean
		}
		norm := mat.Norm(mat.NewVecDense(n, column), 2)
		if !(norm > 0) {
			return false
		}
		for k := range column {
			m.Set(k, i, column[k]/norm)
		}
	}
	var svd mat.SVD
	// 1e10: beyond it rounding of the positions decides where proposals go.
	return svd.Factorize(m, mat.SVDNone) && svd.Cond() < 1e10
}

// Append adds one complete step to the chain: for each ensemble its walkers'
// positions and log-densities, which are copied. It restores a chain that was
// written down, and is how [Run] adds to one. Steps come at every, 2·every, …;
// another step is an error.
//
// accepted is how many proposals were accepted since the step before. If it is
// not known, a negative number counts the walkers that moved, which is the same
// for every = 1 and too few otherwise.
func (c *Chain) Append(step int, x, logp [][]float64, accepted int) error {
	if step != c.last+c.every {
		return fmt.Errorf("sampler: found step %d after step %d, expected %d", step, c.last, c.last+c.every)
	}
	if len(x) != len(c.x) || len(logp) != len(c.x) {
		return fmt.Errorf("sampler: step %d has %d ensembles, expected %d", step, len(x), len(c.x))
	}
	for m := range x {
		if len(x[m]) != c.walkers*c.dim || len(logp[m]) != c.walkers {
			return fmt.Errorf("sampler: step %d of ensemble %d has %d log-densities, expected %d", step, m, len(logp[m]), c.walkers)
		}
	}
	if accepted < 0 {
		accepted = c.moved(x)
	}
	c.accepted += accepted
	c.setLast(step, x, logp)
	if step%c.spacing == 0 {
		c.keep(x, logp)
	}
	return nil
}

// moved counts the walkers that are not where they were at the last step.
func (c *Chain) moved(x [][]float64) int {
	n := 0
	for m := range x {
		for k := 0; k < len(x[m]); k += c.dim {
			if !slices.Equal(x[m][k:k+c.dim], c.lastX[m][k:k+c.dim]) {
				n++
			}
		}
	}
	return n
}

func (c *Chain) setLast(step int, x, logp [][]float64) {
	if c.lastP == nil {
		c.lastP = cloneAll(logp)
	}
	c.last = step
	for m := range x {
		copy(c.lastX[m], x[m])
		copy(c.lastP[m], logp[m])
	}
}

// keep adds a step to the record and thins the record when it is full.
func (c *Chain) keep(x, logp [][]float64) {
	for m := range x {
		c.x[m] = append(c.x[m], x[m]...)
		c.logp[m] = append(c.logp[m], logp[m]...)
		c.mean[m] = append(c.mean[m], make([]float64, c.dim)...)
		mean := c.mean[m][c.kept*c.dim:]
		for k, v := range x[m] {
			mean[k%c.dim] += v / float64(c.walkers)
		}
	}
	c.kept++
	if (c.kept+1)*c.numbersPerStep() > c.bound {
		c.halve()
	}
}

// halve drops every second step of the record. It makes new slices: views of
// the old ones stay what they were.
func (c *Chain) halve() {
	c.spacing *= 2
	for m := range c.x {
		c.x[m] = everySecond(c.x[m], c.walkers*c.dim)
		c.logp[m] = everySecond(c.logp[m], c.walkers)
		c.mean[m] = everySecond(c.mean[m], c.dim)
	}
	c.kept /= 2
}

// everySecond copies rows 1, 3, 5, … of x: those at even multiples of the old
// spacing, since row 0 is the first multiple.
func everySecond(x []float64, row int) []float64 {
	half := make([]float64, 0, len(x))
	for i := row; i < len(x); i += 2 * row {
		half = append(half, x[i:i+row]...)
	}
	return half
}

// means returns the mean of parameter i over the walkers of each ensemble, less
// the mean of all, at every stride-th kept step from the given one on.
func (c *Chain) means(i, from, stride int) [][]float64 {
	series := make([][]float64, len(c.mean))
	grand := 0.0
	for m := range series {
		for k := from; k < c.kept; k += stride {
			series[m] = append(series[m], c.mean[m][k*c.dim+i])
		}
		grand += meanOf(series[m]) / float64(len(series))
	}
	for _, s := range series {
		for t := range s {
			s[t] -= grand
		}
	}
	return series
}

func (c *Chain) numbersPerStep() int {
	return len(c.x) * c.walkers * (c.dim + 1)
}

// Steps returns the last complete step that the chain was given.
func (c *Chain) Steps() int { return c.last }

// Evaluations returns how often the density was evaluated to get there.
func (c *Chain) Evaluations() int { return (c.last + 1) * len(c.x) * c.walkers }

// Acceptance returns the fraction of proposals that were accepted, NaN before
// the first step.
func (c *Chain) Acceptance() float64 {
	return float64(c.accepted) / float64(c.last*len(c.x)*c.walkers)
}

// View returns the whole record as it is now. Later steps do not change it.
func (c *Chain) View() View {
	return View{
		dim:     c.dim,
		walkers: c.walkers,
		first:   c.spacing,
		spacing: c.spacing,
		stride:  1,
		n:       c.kept,
		x:       slices.Clone(c.x),
		logp:    slices.Clone(c.logp),
	}
}

func cloneAll(x [][]float64) [][]float64 {
	c := make([][]float64, len(x))
	for m := range x {
		c[m] = slices.Clone(x[m])
	}
	return c
}

// View is some of the steps of a chain, equally spaced. It shares the chain's
// memory and costs nothing to make.
type View struct {
	dim, walkers int
	first        int // step number of the first row
	spacing      int // steps of the run between rows
	stride       int // rows of x from one row of the view to the next
	n            int // rows
	x, logp      [][]float64
	accepted     []int // by row, since the row before; nil if not known
}

// After returns the part of a view later than a step: what remains when that
// step and all before it are discarded as burn-in.
func (v View) After(step int) View {
	drop := 0
	if step >= v.first {
		drop = min((step-v.first)/v.spacing+1, v.n)
	}
	return v.skip(drop)
}

// skip drops the first rows.
func (v View) skip(drop int) View {
	x, logp := make([][]float64, len(v.x)), make([][]float64, len(v.x))
	for m := range v.x {
		x[m] = v.x[m][min(drop*v.stride*v.walkers*v.dim, len(v.x[m])):]
		logp[m] = v.logp[m][min(drop*v.stride*v.walkers, len(v.logp[m])):]
	}
	v.first += drop * v.spacing
	v.n -= drop
	v.x, v.logp, v.accepted = x, logp, nil
	return v
}

// Thin returns every k-th step of a view, the first k−1 left out. It panics if
// k < 1.
func (v View) Thin(k int) View {
	if k < 1 {
		panic("sampler: View.Thin needs k ≥ 1")
	}
	n := v.n / k
	v = v.skip(min(k-1, v.n))
	v.n = n
	v.spacing *= k
	v.stride *= k
	return v
}

// Steps returns the number of steps in the view.
func (v View) Steps() int { return v.n }

// Number returns the number of the i-th step of the view among those of the run.
func (v View) Number(i int) int { return v.first + i*v.spacing }

// Step returns the positions and log-densities of every ensemble at the i-th
// step of the view: walkers × parameters and walkers. They are the view's own
// memory.
func (v View) Step(i int) (x, logp [][]float64) {
	x, logp = make([][]float64, len(v.x)), make([][]float64, len(v.x))
	for m := range v.x {
		j := i * v.stride * v.walkers
		x[m] = v.x[m][j*v.dim : (j+v.walkers)*v.dim]
		logp[m] = v.logp[m][j : j+v.walkers]
	}
	return x, logp
}

// Accepted returns how many proposals of all ensembles were accepted since the
// step before, for use with [Chain.Append]. Only the rows that an [Observer]
// gets know it; it is −1 for others.
func (v View) Accepted(i int) int {
	if v.accepted == nil {
		return -1
	}
	return v.accepted[i]
}

// Spacing returns the number of steps of the run from one step of the view to
// the next.
func (v View) Spacing() int { return v.spacing }

// length is the number of steps of the run that a view covers, in all ensembles
// together.
func (v View) length() float64 { return float64(len(v.x) * v.n * v.spacing) }

// Ensembles returns the number of independent ensembles.
func (v View) Ensembles() int { return len(v.x) }

// Walkers returns the number of walkers in each ensemble.
func (v View) Walkers() int { return v.walkers }

// Dim returns the number of parameters.
func (v View) Dim() int { return v.dim }

// Row is one walker of one ensemble at one step. X is the view's own memory.
type Row struct {
	Ensemble, Step, Walker int
	X                      []float64
	LogP                   float64
}

// Rows iterates over a view step by step, within a step over the ensembles, and
// within an ensemble over its walkers.
func (v View) Rows() iter.Seq[Row] {
	return func(yield func(Row) bool) {
		for i := range v.n {
			for m := range v.x {
				for k := range v.walkers {
					x, logp := v.at(m, i, k)
					if !yield(Row{m, v.first + i*v.spacing, k, x, logp}) {
						return
					}
				}
			}
		}
	}
}

// at returns position and log-density of walker k of ensemble m at row i.
func (v View) at(m, i, k int) ([]float64, float64) {
	j := i*v.stride*v.walkers + k
	return v.x[m][j*v.dim : (j+1)*v.dim : (j+1)*v.dim], v.logp[m][j]
}
