package likelihood

import (
	"errors"
	"fmt"
	"math"
	"runtime"
	"sync"
	"sync/atomic"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/floats"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// Noise is the joint Gaussian error of the rows of a table, with a covariance C
// that is factorised once and never inverted. There are three kinds:
// [Independent], [Correlated] and [Systematics]; [Deferred] is one of them, later.
//
// Each is a linear map W, not always square, with rᵀC⁻¹r = |W r|² for every r:
// all that a chi-squared needs. It follows that (W r)·(W s) = rᵀC⁻¹s.
type Noise interface {
	// Rows is the number of measurements.
	Rows() int
	// Sigma is the standard deviation of measurement i by itself.
	Sigma(i int) float64

	// width is the number of elements of W r, at least Rows.
	width() int
	// whiten replaces the first Rows elements of r, which has width elements,
	// by W r.
	whiten(r []float64)
	// reduce returns the triangle of the thin QR of W A, where A has the
	// columns that t was made for and fill writes row i of it.
	reduce(t *triangle, fill func(i int, row []float64))
}

var (
	_ Noise = independent{}
	_ Noise = (*correlated)(nil)
	_ Noise = (*systematics)(nil)
	_ Noise = deferred{}
)

// noiseOr is the noise of n rows, their own errors if it is nil.
func noiseOr(noise Noise, errs []float64, n int) (Noise, error) {
	if noise == nil && len(errs) != n {
		return nil, errors.New("the table has no errors; they are needed where no total covariance is given")
	}
	if noise == nil {
		return Independent(errs), nil
	}
	if noise.Rows() != n {
		return nil, fmt.Errorf("the noise of %d rows does not belong to a table of %d", noise.Rows(), n)
	}
	return noise, nil
}

// Independent is the noise of measurements whose errors have nothing to do with
// each other. It keeps the slice.
func Independent(errs []float64) Noise { return independent(errs) }

type independent []float64

func (s independent) Rows() int           { return len(s) }
func (s independent) Sigma(i int) float64 { return s[i] }
func (s independent) width() int          { return len(s) }
func (s independent) whiten(r []float64)  { floats.Div(r, s) }

func (s independent) reduce(t *triangle, fill func(int, []float64)) {
	t.stream(len(s), func(i int, row []float64) {
		fill(i, row)
		floats.Scale(1/s[i], row)
	})
}

// correlated is the noise of a full covariance UᵀU, W = U⁻ᵀ.
type correlated struct {
	u      blas64.Triangular
	sigmas []float64
}

// Correlated is the noise of a full covariance by its upper triangular Cholesky
// factor, UᵀU being the covariance. It is kept.
func Correlated(factor *mat.TriDense) Noise {
	u := factor.RawTriangular()
	c := &correlated{u: u, sigmas: make([]float64, u.N)}
	for k := range u.N { // Cᵢᵢ is the square of the i-th column of U
		for i, v := range u.Data[k*u.Stride+k : k*u.Stride+u.N] {
			c.sigmas[k+i] += v * v
		}
	}
	for i, v := range c.sigmas {
		c.sigmas[i] = math.Sqrt(v)
	}
	return c
}

func (c *correlated) Rows() int           { return c.u.N }
func (c *correlated) Sigma(i int) float64 { return c.sigmas[i] }
func (c *correlated) width() int          { return c.u.N }

func (c *correlated) whiten(r []float64) {
	blas64.Trsv(blas.Trans, c.u, blas64.Vector{N: len(r), Data: r, Inc: 1})
}

func (c *correlated) reduce(t *triangle, fill func(int, []float64)) {
	n := c.u.N
	a := blas64.General{Rows: n, Cols: t.columns, Stride: t.columns, Data: make([]float64, n*t.columns)}
	for i := range n {
		fill(i, a.Data[i*a.Stride:(i+1)*a.Stride])
	}
	c.whitenAll(a)
	t.stream(n, func(i int, row []float64) { copy(row, a.Data[i*a.Stride:]) })
}

// whitenAll is whiten for many columns, a share of them on each processor: what
// happens to a column does not depend on the others. Shares are as wide as can be,
// for the factor is gone through once for each, and long rows are faster.
func (c *correlated) whitenAll(a blas64.General) {
	processors := runtime.GOMAXPROCS(0)
	columns := max(16, (a.Cols+processors-1)/processors)
	var group sync.WaitGroup
	for from := 0; from < a.Cols; from += columns {
		part := a
		part.Data, part.Cols = a.Data[from:], min(columns, a.Cols-from)
		group.Go(func() { blas64.Trsm(blas.Left, blas.Trans, 1, c.u, part) })
	}
	group.Wait()
}

// deferred is a noise that is made when it is first needed.
type deferred struct {
	rows int
	made func() Noise
}

// Deferred is the noise of so many rows that make returns. It is called once, when
// the noise is first needed: never, if the condensed form of the table is remembered
// and every universe is judged by it.
func Deferred(rows int, make func() Noise) Noise { return deferred{rows, sync.OnceValue(make)} }

func (d deferred) Rows() int                                     { return d.rows }
func (d deferred) Sigma(i int) float64                           { return d.made().Sigma(i) }
func (d deferred) width() int                                    { return d.made().width() }
func (d deferred) whiten(r []float64)                            { d.made().whiten(r) }
func (d deferred) reduce(t *triangle, fill func(int, []float64)) { d.made().reduce(t, fill) }

// systematics is the noise of C = D² + F Fᵀ, where D holds the errors and the k
// columns of F are templates: what a systematic does to every row when it is off
// by one standard deviation. N×N numbers are never written down.
//
// C⁻¹ is that of Woodbury's identity, in the form that loses no digits: with
// f = D⁻¹F and u = D⁻¹r,
//
//	rᵀC⁻¹r = min over a of |u - f a|² + |a|²,
//
// the systematics' amplitudes a being measured together with the rest, each with
// a prior of 0 ± 1 (common practice). The minimum is at (1 + fᵀf) a = fᵀu, and
// W r = [u - f a, a].
type systematics struct {
	errs []float64
	k    int
	f    blas64.General    // D⁻¹F
	root blas64.Triangular // R with RᵀR = 1 + fᵀf
	all  []float64         // standard deviations of the rows
}

// Systematics is the noise of independent errors with k systematics, given by
// their templates: row-major, a row for each error. Both slices are kept, and
// the templates changed.
func Systematics(errs, templates []float64, k int) (Noise, error) {
	n := len(errs)
	if k < 1 || len(templates) != n*k {
		return nil, fmt.Errorf("%d numbers in the templates of %d rows and %d systematics", len(templates), n, k)
	}
	s := &systematics{errs: errs, k: k, all: make([]float64, n), f: blas64.General{Rows: n, Cols: k, Stride: k, Data: templates}}
	for i, e := range errs {
		row := templates[i*k : (i+1)*k]
		s.all[i] = math.Sqrt(e*e + floats.Dot(row, row))
		floats.Scale(1/e, row)
	}
	t := newTriangle(k)
	t.unit(k)
	t.stream(n, func(i int, row []float64) { copy(row, s.f.Data[i*k:(i+1)*k]) })
	s.root = blas64.Triangular{N: k, Stride: t.columns, Data: t.rows(), Uplo: blas.Upper, Diag: blas.NonUnit}
	for i := range k {
		if d := s.root.Data[i*s.root.Stride+i]; d == 0 || math.IsNaN(d) || math.IsInf(d, 0) {
			return nil, errors.New("the templates are too large to be combined with the errors")
		}
	}
	return s, nil
}

func (s *systematics) Rows() int           { return len(s.errs) }
func (s *systematics) Sigma(i int) float64 { return s.all[i] }
func (s *systematics) width() int          { return len(s.errs) + s.k }

func (s *systematics) whiten(r []float64) {
	n := len(s.errs)
	u, a := r[:n], blas64.Vector{N: s.k, Data: r[n:], Inc: 1}
	floats.Div(u, s.errs)
	x := blas64.Vector{N: n, Data: u, Inc: 1}
	blas64.Gemv(blas.Trans, 1, s.f, x, 0, a)
	blas64.Trsv(blas.Trans, s.root, a)
	blas64.Trsv(blas.NoTrans, s.root, a)
	blas64.Gemv(blas.NoTrans, -1, s.f, a, 1, x)
}

// reduce eliminates the amplitudes along with everything else: they are the
// first columns of a wider triangle, with a unit prior, and are then left out.
func (s *systematics) reduce(t *triangle, fill func(int, []float64)) {
	wide := newTriangle(s.k + t.columns)
	wide.unit(s.k)
	wide.stream(len(s.errs), func(i int, row []float64) {
		copy(row, s.f.Data[i*s.k:(i+1)*s.k])
		fill(i, row[s.k:])
		floats.Scale(1/s.errs[i], row[s.k:])
	})
	t.add(wide.without(s.k))
}

// triangle is the upper triangular factor R of a tall matrix, which is given to
// it in pieces and never held as a whole: R of [R; further rows] is R of all rows
// (sequential QR by Householder reflections; Golub & Van Loan 2013, Matrix
// Computations, §5.2, and §6.5 for adding rows).
type triangle struct {
	columns int
	r       blas64.General // R, and room for further rows below
	used    int            // rows of r in use
	tau     []float64
	work    []float64
}

// pieceRows is how many rows are added to a triangle at a time.
const pieceRows = 512

// newTriangle is the factor of no rows at all: zeros.
func newTriangle(columns int) *triangle {
	rows := columns + pieceRows
	t := &triangle{columns: columns, used: columns, tau: make([]float64, columns), work: make([]float64, 1),
		r: blas64.General{Rows: rows, Cols: columns, Stride: columns, Data: make([]float64, rows*columns)}}
	lapack64.Geqrf(t.r, t.tau, t.work, -1)
	t.work = make([]float64, int(t.work[0]))
	return t
}

// unit puts ones on the diagonal of the first k columns: rows that measure these
// k unknowns to be 0 ± 1.
func (t *triangle) unit(k int) {
	for i := range k {
		t.r.Data[i*t.columns+i] = 1
	}
}

// next is room for one row more.
func (t *triangle) next() []float64 {
	if t.used == t.r.Rows {
		t.factorise()
	}
	row := t.r.Data[t.used*t.columns : (t.used+1)*t.columns]
	t.used++
	return row
}

// factorise makes what has been added part of R.
func (t *triangle) factorise() {
	if t.used == t.columns {
		return
	}
	a := t.r
	a.Rows = t.used
	lapack64.Geqrf(a, t.tau, t.work, len(t.work))
	for i := range t.used { // the reflections are stored below the diagonal
		clear(t.r.Data[i*t.columns : i*t.columns+min(i, t.columns)])
	}
	t.used = t.columns
}

// share is the number of rows that a goroutine reduces at a time. It does not
// depend on the number of processors, nor does the result.
const share = 1 << 16

// stream adds n rows. Several goroutines call fill if there are many.
func (t *triangle) stream(n int, fill func(i int, row []float64)) {
	if n > share {
		t.parallel(n, fill)
		return
	}
	for i := range n {
		fill(i, t.next())
	}
	t.factorise()
}

// parallel reduces the rows in equal shares and then what is left of them in order.
func (t *triangle) parallel(n int, fill func(i int, row []float64)) {
	parts := make([][]float64, (n+share-1)/share)
	var next atomic.Int64
	var group sync.WaitGroup
	for range min(runtime.GOMAXPROCS(0), len(parts)) {
		group.Go(func() {
			for p := int(next.Add(1)) - 1; p < len(parts); p = int(next.Add(1)) - 1 {
				part := newTriangle(t.columns)
				part.stream(min(share, n-p*share), func(i int, row []float64) { fill(p*share+i, row) })
				parts[p] = part.rows()
			}
		})
	}
	group.Wait()
	for _, rows := range parts {
		t.add(rows)
	}
}

// add adds rows given one after another.
func (t *triangle) add(rows []float64) {
	t.stream(len(rows)/t.columns, func(i int, row []float64) { copy(row, rows[i*t.columns:]) })
}

// rows is R, row-major.
func (t *triangle) rows() []float64 { return t.r.Data[:t.columns*t.columns] }

// without is R without its first k rows and columns: what is left of a sum of
// squares when it is minimised over the first k unknowns.
func (t *triangle) without(k int) []float64 {
	var out []float64
	for i := k; i < t.columns; i++ {
		out = append(out, t.r.Data[i*t.columns+k:(i+1)*t.columns]...)
	}
	return out
}
