package data

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

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

// Factorised is Covariance together with its Cholesky factor, which the proof that it is positive definite has
// yielded anyway.
func Factorised(file string, m *Matrix, role Role, s Selection, err []float64) (*mat.SymDense, *mat.Cholesky, error) {
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
	var chol mat.Cholesky
	if !chol.Factorize(c) {
		return nil, nil, notPositive(file, c, s.row)
	}
	return c, &chol, nil
}

func needErrors(m *Matrix, role Role, s Selection, err []float64) error {
	switch {
	case m != nil && role != Added:
		return nil
	case len(err) != len(s.Kept):
		return &Error{File: s.File, Message: message("no column of errors", "one, as there is no total covariance",
			"map it, or give the covariance")}
	case m == nil && len(err) > largestDiagonal:
		return &Error{File: s.File, Message: message(fmt.Sprintf("%d rows", len(err)),
			fmt.Sprintf("at most %d for a covariance written down", largestDiagonal), "use the errors themselves")}
	}
	return nil
}

func wrongSize(file string, n int, s Selection) error {
	return &Error{File: file, Message: message(fmt.Sprintf("a matrix of %d×%d", n, n),
		fmt.Sprintf("%d×%d, one row for each of %s before cuts", s.Read, s.Read, s.File), "give the matrix that belongs to the table")}
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

// notPositive names the smallest eigenvalue and the rows that make up most of its eigenvector. Only now is an
// eigen-decomposition worth its price.
func notPositive(file string, c *mat.SymDense, row func(int) string) error {
	var eigen mat.EigenSym
	if !eigen.Factorize(c, true) {
		return &Error{File: file, Message: message("a matrix without eigenvalues", "a covariance", "check it")}
	}
	smallest := eigen.Values(nil)[0] // ascending
	var vectors mat.Dense
	eigen.VectorsTo(&vectors)
	v := mat.Col(nil, 0, &vectors)
	var names []string
	for _, k := range dominant(v) {
		names = append(names, row(k))
	}
	return &Error{File: file, Message: message(
		fmt.Sprintf("the smallest eigenvalue %s, in the direction of %s", short(smallest), strings.Join(names, " and ")),
		"a positive definite matrix", "check these rows")}
}

// dominant is the indices of up to three components of v that stand out, largest first.
func dominant(v []float64) []int {
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
