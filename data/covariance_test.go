package data

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// ofThree is a selection of the given rows of a table of three.
func ofThree(kept ...int) Selection {
	s := Selection{File: "t.csv", Read: 3, Kept: kept}
	for _, i := range kept {
		s.Lines = append(s.Lines, i+2)
	}
	return s
}

func matrixOf(t *testing.T, text string) *Matrix {
	t.Helper()
	m, err := ReadMatrix(strings.NewReader(text), "c.cov")
	if err != nil {
		t.Fatal(err)
	}
	return m
}

const threeText = "4 1 0.5\n1 3 -0.25\n0.5 -0.25 2\n"

func TestCovarianceRoles(t *testing.T) {
	m := matrixOf(t, threeText)
	// The inverse of {{4, 1, .5}, {1, 3, -.25}, {.5, -.25, 2}} by its cofactors; the determinant is 20.75.
	cofactor := [][]float64{{5.9375, -2.125, -1.75}, {-2.125, 7.75, 1.5}, {-1.75, 1.5, 11}}
	tests := map[string]struct {
		m    *Matrix
		role Role
		kept []int
		err  []float64
		want func(i, j int) float64
	}{
		"total":    {m, Total, []int{0, 2}, nil, func(i, j int) float64 { return three[i][j] }},
		"added":    {m, Added, []int{1, 2}, []float64{0.5, 2}, func(i, j int) float64 { return three[i][j] + diagonalOf(i, j, 0, 0.25, 4) }},
		"inverse":  {m, Inverse, []int{0, 2}, nil, func(i, j int) float64 { return cofactor[i][j] / 20.75 }},
		"diagonal": {nil, Total, []int{0, 1}, []float64{0.5, 2}, func(i, j int) float64 { return diagonalOf(i, j, 0.25, 4, 0) }},
	}
	for name, test := range tests {
		t.Run(name, func(t *testing.T) {
			c, u, err := Factorised("c.cov", test.m, test.role, ofThree(test.kept...), test.err)
			if err != nil {
				t.Fatal(err)
			}
			for a, i := range test.kept {
				for b, j := range test.kept {
					if got, want := c.At(a, b), test.want(i, j); math.Abs(got-want) > 1e-15 {
						t.Errorf("element %d,%d: %v, want %v", a, b, got, want)
					}
				}
			}
			var back mat.Dense
			back.Mul(u.T(), u)
			if !mat.EqualApprox(&back, c, 1e-14) {
				t.Errorf("factor of %v, covariance %v", &back, c)
			}
		})
	}
}

func diagonalOf(i, j int, d ...float64) float64 {
	if i != j {
		return 0
	}
	return d[i]
}

func TestCovarianceErrors(t *testing.T) {
	named := ofThree(0, 1, 2)
	named.names = []string{"SN a", "", "SN c"}
	many := Selection{File: "t.csv", Read: largestDiagonal + 1, Kept: make([]int, largestDiagonal+1)}
	tests := []struct {
		text string
		role Role
		s    Selection
		err  []float64
		want string
	}{
		{"1 0\n0 1\n", Total, ofThree(1), nil,
			`c.cov: found a matrix of 2×2, expected 3×3 for the 3 rows of t.csv before cuts; give the matrix that belongs to the table`},
		{"1 0\n0 1\n", Total, ofThree(0, 1), nil,
			`c.cov: found a matrix of 2×2, expected 3×3 for the 3 rows of t.csv before cuts; this one has a row for each that the cut keeps: give the whole one, or a table of these rows without a cut`},
		{threeText, Added, ofThree(0, 1), nil,
			`t.csv: found no column of errors, expected one, as there is no total covariance; map it, or give the covariance`},
		{"", Total, ofThree(0, 1), nil,
			`t.csv: found no column of errors, expected one, as there is no total covariance; map it, or give the covariance`},
		{"", Total, many, make([]float64, largestDiagonal+1),
			`t.csv: found 20001 rows, expected at most 20000 for a covariance written down; use the errors themselves`},
		// Eigenvalues of {{1, 2}, {2, 1}}: 3 and -1, the latter along (1, -1).
		{"1 0 2\n0 5 0\n2 0 1\n", Total, named, nil,
			`c.cov: found the smallest eigenvalue -1, in the direction of SN a (t.csv:2) and SN c (t.csv:4), expected a positive definite matrix; check these rows`},
		{"1 0 2\n0 -3 0\n2 0 1\n", Total, named, nil,
			`c.cov: found the smallest eigenvalue -3, in the direction of t.csv:3, expected a positive definite matrix; check these rows`},
		{"1 2 0\n2 1 0\n0 0 1\n", Inverse, ofThree(2), nil,
			`c.cov: found the smallest eigenvalue -1, in the direction of row 1 and row 2, expected a positive definite matrix; check these rows`},
		{"0 0 0\n0 0 0\n0 0 0\n", Total, ofThree(1), nil,
			`c.cov: found the smallest eigenvalue 0, in the direction of t.csv:3, expected a positive definite matrix; check these rows`},
	}
	for _, test := range tests {
		var m *Matrix
		if test.text != "" {
			m = matrixOf(t, test.text)
		}
		_, err := Covariance("c.cov", m, test.role, test.s, test.err)
		wantMessage(t, err, test.want)
	}
	// A row that a cut removes may be as bad as it likes.
	if _, err := Covariance("c.cov", matrixOf(t, "1 0 2\n0 5 0\n2 0 1\n"), Total, ofThree(0, 1), nil); err != nil {
		t.Error(err)
	}
}

// The smallest eigenvalue and its vector agree with gonum's full decomposition on seeded random matrices of
// every kind of spectrum.
func TestSmallestEigen(t *testing.T) {
	rng := rand.New(rand.NewPCG(9, 10))
	for trial := range 60 {
		n := 2 + rng.IntN(30)
		a := mat.NewSymDense(n, nil)
		for i := range n {
			for j := i; j < n; j++ {
				a.SetSym(i, j, math.Pow(10, float64(trial%5-2))*rng.NormFloat64())
			}
			a.SetSym(i, i, a.At(i, i)+float64(trial%3))
		}
		var eigen mat.EigenSym
		eigen.Factorize(a, true)
		want := eigen.Values(nil)[0]
		scale, _ := gershgorin(a)
		value, v := smallestEigen(a)
		if math.Abs(value-want) > 1e-9*scale {
			t.Errorf("%d rows: eigenvalue %v, want %v", n, value, want)
		}
		var vectors mat.Dense
		eigen.VectorsTo(&vectors)
		if cos := math.Abs(mat.Dot(v, vectors.ColView(0))); math.Abs(cos-1) > 1e-6 {
			t.Errorf("%d rows: eigenvector off by cos %v", n, cos)
		}
	}
}

func TestDominant(t *testing.T) {
	for _, test := range []struct {
		v    []float64
		want string
	}{
		{[]float64{0.1, -0.9, 0.4, 0.2}, "[1 2]"},
		{[]float64{-0.5, 0.5, 0.5, 0.5}, "[0 1 2]"},
		{[]float64{0.2, 1}, "[1]"},
	} {
		if got := fmt.Sprint(dominant(mat.NewVecDense(len(test.v), test.v))); got != test.want {
			t.Errorf("%v: %s, want %s", test.v, got, test.want)
		}
	}
}

func TestTemplates(t *testing.T) {
	in := "calibration dust\n0.01 0.02\n# pause\n0.03 -0.04\n0.05 1e-3\n"
	got, err := ReadTemplates(strings.NewReader(in), "s.txt", ofThree(0, 2))
	if err != nil {
		t.Fatal(err)
	}
	if fmt.Sprint(got.Names, got.Values) != "[calibration dust] [0.01 0.02 0.05 0.001]" {
		t.Errorf("%v", got)
	}
}

func TestTemplatesErrors(t *testing.T) {
	tests := []struct{ in, want string }{
		{"", `s.csv: found an empty file, expected a header row and rows of measurements; check that it was written completely`},
		{"a,b\n1,2\n1,2\n", `s.csv: found 2 rows, expected 3 as in t.csv before cuts; give the templates that belong to the table`},
		{"a,b\n1,2\n1,2\n1,2\n1,2\n", `s.csv: found 4 rows, expected 3 as in t.csv before cuts; give the templates that belong to the table`},
		{"a,b\n1,2\n1\n1,2\n", `s.csv:3: found 1 cell, expected 2 as in the header in line 1; add or remove a separator, or quote a cell that contains one`},
		{"a,b\n1,2\nx,y\n1,z\n", `s.csv:4: column "b": found "z", expected a finite number; correct the cell, or leave the row out with a cut`},
		{"a,a\n1,2\n", `s.csv:1: column "a": found the name twice, in columns 1 and 2, expected every name once; rename one of them`},
	}
	for _, test := range tests {
		_, err := ReadTemplates(strings.NewReader(test.in), "s.csv", ofThree(0, 2))
		wantMessage(t, err, test.want)
	}
}
