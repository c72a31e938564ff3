package data

import (
	"archive/zip"
	"bytes"
	"fmt"
	"maps"
	"math"
	"slices"
	"strings"
	"testing"

	"github.com/sbinet/npyio/npy"
	"gonum.org/v1/gonum/mat"
)

// The 3×3 matrix of most cases below.
var three = [][]float64{{4, 1, 0.5}, {1, 3, -0.25}, {0.5, -0.25, 2}}

func TestMatrixFormats(t *testing.T) {
	dense := mat.NewDense(3, 3, []float64{4, 1, 0.5, 1, 3, -0.25, 0.5, -0.25, 2})
	packed := []float64{4, 1, 0.5, 3, -0.25, 2}
	single := []float32{4, 1, 0.5, 3, -0.25, 2}
	tests := map[string]string{
		"size, a number a line": "3\n4\n1\n.5\n1\n3\n-0.25\n5e-1\n-0.25\n2\n",
		"size, rows":            "  3\r\n4 1 0.5\r\n1 3 -0.25\r\n0.5 -0.25 2",
		"size, commas":          "3\n4,1,0.5,\n1,3,-0.25,\n0.5,-0.25,2\n",
		"size, one line":        "3\n4 1 0.5 1 3 -0.25 0.5 -0.25 2",
		"all in one line":       "3 4 1 0.5 1 3 -0.25 0.5 -0.25 2\n",
		"size before numbers":   "3 4 1\n0.5 1 3 -0.25\n0.5 -0.25 2\n",
		"rows, blanks":          "4 1 0.5\n1 3 -0.25\n0.5 -0.25 2\n",
		"rows, commas":          "4,1,0.5\n1,3,-0.25\n0.5,-0.25,2\n",
		"rows, semicolons":      "4; 1; 0.5\n1; 3; -0.25\n\n0.5; -0.25; 2",
		"comments":              "# sys\n# more, 1 2\n3 # rows\n4 1 0.5\n# 9\n1 3 -0.25\n0.5 -0.25 2 # end",
		"byte-order mark":       "\ufeff4,1,0.5\n1,3,-0.25\n0.5,-0.25,2\n",
		"gzip":                  gzipped("4 1 0.5\n1 3 -0.25\n0.5 -0.25 2\n"),
		"npy":                   asNPY(t, dense),
		"npy, packed":           asNPY(t, packed),
		"npy, packed, float32":  asNPY(t, single),
		"npy, gzip":             gzipped(asNPY(t, dense)),
		"npz":                   asNPZ(t, map[string]any{"cov.npy": dense}),
		"npz, size beside":      asNPZ(t, map[string]any{"n.npy": []int64{3}, "cov.npy": packed}),
	}
	for name, in := range tests {
		t.Run(name, func(t *testing.T) {
			m, err := ReadMatrix(strings.NewReader(in), "c.cov")
			if err != nil {
				t.Fatal(err)
			}
			wantMatrix(t, m, three)
		})
	}
}

func wantMatrix(t *testing.T, m *Matrix, want [][]float64) {
	t.Helper()
	if m.N() != len(want) {
		t.Fatalf("%d rows, want %d", m.N(), len(want))
	}
	for i, row := range want {
		for j, v := range row {
			if m.At(i, j) != v {
				t.Errorf("element %d,%d: %v, want %v", i, j, m.At(i, j), v)
			}
		}
	}
}

func asNPY(t *testing.T, v any) string {
	t.Helper()
	var b bytes.Buffer
	if err := npy.Write(&b, v); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func asNPZ(t *testing.T, arrays map[string]any) string {
	t.Helper()
	var b bytes.Buffer
	z := zip.NewWriter(&b)
	for _, name := range slices.Sorted(maps.Keys(arrays)) {
		w, err := z.Create(name)
		if err == nil {
			_, err = w.Write([]byte(asNPY(t, arrays[name])))
		}
		if err != nil {
			t.Fatal(err)
		}
	}
	if err := z.Close(); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestMatrixOfOne(t *testing.T) {
	for _, in := range []string{"0.25", "1\n0.25\n", "1 0.25"} {
		m, err := ReadMatrix(strings.NewReader(in), "c.cov")
		if err != nil {
			t.Fatal(err)
		}
		wantMatrix(t, m, [][]float64{{0.25}})
	}
}

// Numbers and comments that straddle the scanner's buffer must come out whole.
func TestMatrixLargerThanBuffer(t *testing.T) {
	const n = 250
	var b strings.Builder
	fmt.Fprintf(&b, "%d\n# %s\n", n, strings.Repeat("1 2 3 ", 1<<16))
	want := make([][]float64, n)
	for i := range want {
		want[i] = make([]float64, n)
		for j := range n {
			want[i][j] = 1 / float64(1+max(i, j))
			fmt.Fprintf(&b, "%.17g%s", want[i][j], strings.Repeat(" ", i%7)+"\n")
		}
	}
	m, err := ReadMatrix(strings.NewReader(b.String()), "c.cov")
	if err != nil {
		t.Fatal(err)
	}
	wantMatrix(t, m, want)
}

func TestMatrixRounding(t *testing.T) {
	m, err := ReadMatrix(strings.NewReader("9 0.3000003 0\n0.3 4 0\n0 0 0.01\n"), "c.cov")
	if err != nil {
		t.Fatal(err)
	}
	// 3e-7 in units of √(9·4)
	if m.At(0, 1) != 0.30000015 || math.Abs(m.Asymmetry-0.5e-7) > 1e-15 {
		t.Errorf("mean %v, asymmetry %v", m.At(0, 1), m.Asymmetry)
	}
}

func TestMatrixErrors(t *testing.T) {
	tests := []struct{ in, want string }{
		{"", `c.cov: found an empty file, expected a matrix; check that it was written completely`},
		{"# none\n\n", `c.cov: found an empty file, expected a matrix; check that it was written completely`},
		{"2\n1 0\n0\n", `c.cov: found 3 numbers after the size 2, expected 2² = 4; check that the matrix is complete`},
		{"2\n1 0\n0 1 7\n", `c.cov: found 5 numbers after the size 2, expected 2² = 4; check that the matrix is complete`},
		{"0.5\n1\n", `c.cov:1: found a first line of one number that is no size, expected the number of rows, or a whole row; write the number of rows first`},
		{"1.5 0\n", `c.cov: found 1 row of 2 numbers, expected as many rows as columns; check that the matrix is complete`},
		{"1.5 0\n0 1\n0 0\n", `c.cov: found 3 rows of 2 numbers, expected as many rows as columns; check that the matrix is complete`},
		{"1.5 0 0\n0 1\n0 0 1\n", `c.cov:2: found 2 numbers, expected 3 as in the first row; check the row`},
		{"a,b\n1,0\n0,1\n", `c.cov:1: found "a", expected a number; correct the matrix; it has no header`},
		{"2\n1 0\n\n0 1x\n", `c.cov:4: found "1x", expected a number; correct the matrix; it has no header`},
		{"2\n1 0\n0 nan\n", `c.cov:3: found NaN in row 2, column 2, expected finite numbers; correct the matrix`},
		{"2\n1 -inf\n0 1\n", `c.cov:2: found -Inf in row 1, column 2, expected finite numbers; correct the matrix`},
		{"4 1 0.5\n1.1 3 -0.25\n0.5 0.75 2\n", `c.cov:3: found 0.75 in row 3, column 2 but -0.25 in row 2, column 3, expected a symmetric matrix; check that it is complete and in the right order`},
		{"4 1 0.5\n2.5 3 -0.25\n0.5 -0.15 2\n", `c.cov:2: found 2.5 in row 2, column 1 but 1 in row 1, column 2, expected a symmetric matrix; check that it is complete and in the right order`},
		{"4 1 0.5\n", `c.cov: found 1 row of 3 numbers, expected as many rows as columns; check that the matrix is complete`},
		{"2\n" + strings.Repeat("1", 2000), `c.cov:2: found "1111111111111111111111111111111111111111…", expected a number; correct the matrix; it has no header`},
		{gzipped("2\n1 0\n0 1\n")[:20], `c.cov: found a damaged or cut-off file, expected a whole one; copy or download it again`},
		{asNPY(t, mat.NewDense(2, 3, nil)), `c.cov: found an array of shape [2 3], expected N×N, or the N(N+1)/2 numbers of its upper triangle; save the matrix in one of these shapes`},
		{asNPY(t, make([]float64, 5)), `c.cov: found an array of shape [5], expected N×N, or the N(N+1)/2 numbers of its upper triangle; save the matrix in one of these shapes`},
		{asNPY(t, []int64{1, 0, 1}), `c.cov: found an array of type "<i8", expected float64 or float32; convert it with astype(float)`},
		{asNPY(t, []float64{1, 0, math.NaN()}), `c.cov: found NaN in row 2, column 2, expected finite numbers; correct the matrix`},
		{asNPY(t, mat.NewDense(2, 2, []float64{1, 0, 0.5, 1})), `c.cov: found 0.5 in row 2, column 1 but 0 in row 1, column 2, expected a symmetric matrix; check that it is complete and in the right order`},
		{asNPY(t, make([]float64, 6))[:115], `c.cov: found a damaged or cut-off file, expected a whole one; copy or download it again`},
		{asNPY(t, make([]float64, 6))[:len(asNPY(t, make([]float64, 5)))], `c.cov: found a damaged or cut-off file, expected a whole one; copy or download it again`},
		{"\x93NUMPY\x01\x00\x02\x00{}", `c.cov: found a damaged NumPy header ("it is no dictionary"), expected an array as numpy.save writes it; write it again`},
		{"\x93NUMPY\x09\x00", `c.cov: found a damaged NumPy header ("npy: invalid major version number (9)"), expected an array as numpy.save writes it; write it again`},
		{asNPZ(t, map[string]any{"a.npy": []float64{1, 0, 1}, "b.npy": []float64{1, 0, 1}})[:60], `c.cov: found a damaged or cut-off file, expected a whole one; copy or download it again`},
		{asNPZ(t, map[string]any{"a.npy": []float64{1, 0, 1}, "b.npy": []float64{1, 0, 1}}), `c.cov: found 2 arrays (a.npy, b.npy), expected one; save the covariance alone`},
		{asNPZ(t, map[string]any{"a.npy": []float64{1}}), `c.cov: found 0 arrays (), expected one; save the covariance alone`},
	}
	for _, test := range tests {
		_, err := ReadMatrix(strings.NewReader(test.in), "c.cov")
		wantMessage(t, err, test.want)
	}
}
