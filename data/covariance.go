package data

import (
	"cmp"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"
	"strings"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/lapack/lapack64"
	"gonum.org/v1/gonum/mat"
)

// Role says what the matrix beside a table is.
type Role uint8

const (
	Total   Role = iota // the covariance; the table's errors are not used
	Added               // a covariance to add to the squares of the table's errors
	Inverse             // the inverse of the covariance
)

// largestDiagonal bounds the tables without a matrix for which Covariance writes one down. Larger ones are to be
// treated by their errors: their covariance has nothing more to say.
const largestDiagonal = 20000

// Covariance is the covariance of the kept rows in their order. The matrix covers all rows of the file; it is cut
// with the table, an inverse after it has been inverted. err are the errors of the kept rows, needed for Added
// and where m is nil: the covariance is then diagonal. file is the matrix's, for messages.
func Covariance(file string, m *Matrix, role Role, s Selection, err []float64) (*mat.SymDense, error) {
	c, _, e := Factorised(file, m, role, s, err)
	return c, e
}

// Factorised is Covariance together with its upper triangular Cholesky factor U, UᵀU being the covariance, which
// the proof that it is positive definite has yielded anyway.
func Factorised(file string, m *Matrix, role Role, s Selection, err []float64) (*mat.SymDense, *mat.TriDense, error) {
	if e := needErrors(m, role, s, err); e != nil {
		return nil, nil, e
	}
	if m != nil && m.N() != s.Read {
		return nil, nil, wrongSize(file, m.N(), s)
	}
	c, e := cutMatrix(file, m, role, s)
	if e != nil {
		return nil, nil, e
	}
	if m == nil || role == Added {
		for k, sigma := range err {
			c.SetSym(k, k, c.At(k, k)+sigma*sigma)
		}
	}
	u, ok := factor(c)
	if !ok {
		return nil, nil, notPositive(file, c, s.Label)
	}
	return c, u, nil
}

// factor is the upper Cholesky factor of a matrix, if that is positive definite. [mat.Cholesky] would estimate the
// condition number too, which takes as long again.
func factor(c *mat.SymDense) (*mat.TriDense, bool) {
	n := c.SymmetricDim()
	u := mat.NewTriDense(n, mat.Upper, nil)
	raw := u.RawTriangular()
	from := c.RawSymmetric()
	for i := range n {
		copy(raw.Data[i*raw.Stride+i:(i+1)*raw.Stride], from.Data[i*from.Stride+i:i*from.Stride+n])
	}
	_, ok := lapack64.Potrf(blas64.Symmetric{N: n, Stride: raw.Stride, Data: raw.Data, Uplo: blas.Upper})
	return u, ok
}

func needErrors(m *Matrix, role Role, s Selection, err []float64) error {
	switch {
	case m != nil && role != Added:
		return nil
	case len(err) != len(s.Kept):
		return &Error{File: s.File, Message: message("no column of errors", "one, as there is no total covariance",
			"map it, or give the covariance")}
	case m == nil && len(err) > largestDiagonal:
		return &Error{File: s.File, Message: message(count(len(err), "row"),
			fmt.Sprintf("at most %d for a covariance written down", largestDiagonal), "use the errors themselves")}
	}
	return nil
}

func wrongSize(file string, n int, s Selection) error {
	do := "give the matrix that belongs to the table"
	if n == len(s.Kept) {
		do = "this one has a row for each that the cut keeps: give the whole one, or a table of these rows without a cut"
	}
	return &Error{File: file, Message: message(fmt.Sprintf("a matrix of %d×%d", n, n),
		fmt.Sprintf("%d×%d for the %s of %s before cuts", s.Read, s.Read, count(s.Read, "row"), s.File), do)}
}

// cutMatrix copies the kept rows and columns; zeros if there is no matrix.
func cutMatrix(file string, m *Matrix, role Role, s Selection) (*mat.SymDense, error) {
	c := mat.NewSymDense(len(s.Kept), nil)
	if m == nil {
		return c, nil
	}
	at := m.At
	if role == Inverse {
		inverse, err := invert(file, m)
		if err != nil {
			return nil, err
		}
		at = inverse.At
	}
	for a, i := range s.Kept {
		for b := a; b < len(s.Kept); b++ {
			c.SetSym(a, b, at(i, s.Kept[b]))
		}
	}
	return c, nil
}

func invert(file string, m *Matrix) (*mat.SymDense, error) {
	n := m.N()
	c := mat.NewSymDense(n, nil)
	for i := range n {
		for j := i; j < n; j++ {
			c.SetSym(i, j, m.At(i, j))
		}
	}
	var chol mat.Cholesky
	if !chol.Factorize(c) {
		return nil, notPositive(file, c, func(k int) string { return fmt.Sprintf("row %d", k+1) })
	}
	if err := chol.InverseTo(c); err != nil {
		return nil, &Error{File: file, Message: message("an inverse covariance close to singular ("+err.Error()+")",
			"one that can be inverted", "give the covariance itself")}
	}
	return c, nil
}

// notPositive names the smallest eigenvalue and the rows that make up most of its eigenvector.
func notPositive(file string, c *mat.SymDense, label func(int) string) error {
	value, vector := smallestEigen(c)
	var names []string
	for _, k := range dominant(vector) {
		names = append(names, label(k))
	}
	return &Error{File: file, Message: message(
		fmt.Sprintf("the smallest eigenvalue %s, in the direction of %s", short(value), strings.Join(names, " and ")),
		"a positive definite matrix", "check these rows")}
}

// smallestEigen is the smallest eigenvalue λ of a symmetric matrix A and its eigenvector, by inverse iteration
// with A + sI: a full decomposition of 1590 rows takes gonum 22 s, this some ten Cholesky factorisations.
//
// The shift closes in on −λ from above, where A + sI is positive definite, starting from the bound that
// Gershgorin's discs give. The Rayleigh quotient of the iterate is never below λ and bounds −λ from below
// (Parlett 1998, The Symmetric Eigenvalue Problem, §§1.6, 4.6).
func smallestEigen(a *mat.SymDense) (float64, *mat.VecDense) {
	n := a.SymmetricDim()
	scale, discs := gershgorin(a)
	v, w := startVector(n), mat.NewVecDense(n, nil)
	hi := 1e-12*scale - discs
	lo := math.Inf(-1)
	var value float64
	for s := hi; ; {
		if chol, ok := shifted(a, s); ok {
			hi = s
			for range 3 {
				_ = chol.SolveVecTo(w, v) // close to singular is what is wanted
				v.ScaleVec(1/mat.Norm(w, 2), w)
			}
			w.MulVec(a, v)
			value = mat.Dot(v, w)
			w.AddScaledVec(w, -value, v)
			if mat.Norm(w, 2) <= 1e-9*scale {
				return value, v
			}
			lo = max(lo, -value)
		} else {
			lo = s
		}
		if s = lo + (hi-lo)/8; !(s > lo && s < hi) {
			return value, v
		}
	}
}

// gershgorin is the largest sum of absolute values in a row and a lower bound of the eigenvalues.
func gershgorin(a *mat.SymDense) (scale, discs float64) {
	discs = math.Inf(1)
	n := a.SymmetricDim()
	for i := range n {
		sum := 0.0
		for j := range n {
			sum += math.Abs(a.At(i, j))
		}
		scale = max(scale, sum)
		discs = min(discs, a.At(i, i)-(sum-math.Abs(a.At(i, i))))
	}
	return scale, discs
}

// startVector is random, so as not to be orthogonal to an eigenvector, and always the same.
func startVector(n int) *mat.VecDense {
	rng := rand.New(rand.NewPCG(1, uint64(n)))
	v := mat.NewVecDense(n, nil)
	for i := range n {
		v.SetVec(i, rng.NormFloat64())
	}
	return v
}

func shifted(a *mat.SymDense, s float64) (*mat.Cholesky, bool) {
	n := a.SymmetricDim()
	b := mat.NewSymDense(n, nil)
	b.CopySym(a)
	for i := range n {
		b.SetSym(i, i, a.At(i, i)+s)
	}
	var chol mat.Cholesky
	return &chol, chol.Factorize(b)
}

// dominant is the indices of up to three components of v that stand out, largest first.
func dominant(vector *mat.VecDense) []int {
	v := vector.RawVector().Data
	order := make([]int, len(v))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(math.Abs(v[b]), math.Abs(v[a])) })
	largest := math.Abs(v[order[0]])
	n := 1
	for n < min(3, len(v)) && math.Abs(v[order[n]]) > largest/3 {
		n++
	}
	return order[:n]
}
