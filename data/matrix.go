package data

import (
	"bufio"
	"bytes"
	"fmt"
	"io"
	"math"
)

// Matrix is a symmetric matrix as read from a file. Only its upper triangle is stored: 12 MB for the 1701 rows
// of a large supernova table.
type Matrix struct {
	rows [][]float64 // rows[i][j-i] is the element i, j ≥ i

	// Asymmetry is the largest |Cij − Cji| / √|Cii Cjj| found in the file, at most SymmetryTolerance. Elements
	// are the means of the two.
	Asymmetry float64
}

// SymmetryTolerance is the asymmetry, in units of the errors of the two rows, that is taken for rounding.
const SymmetryTolerance = 1e-6

// N is the number of rows.
func (m *Matrix) N() int { return len(m.rows) }

// At is the element i, j.
func (m *Matrix) At(i, j int) float64 {
	if i > j {
		i, j = j, i
	}
	return m.rows[i][j-i]
}

// ReadMatrix reads a symmetric matrix and tells its format by its content:
//
//   - text: the number of rows N, then N² numbers, broken into lines anyhow;
//   - text: N lines of N numbers;
//   - NumPy .npy, or .npz with one matrix in it: N×N, or its upper triangle row by row in one dimension.
//
// Numbers in text are separated by commas, semicolons or blanks; # starts a comment. All of it may be gzipped.
func ReadMatrix(r io.Reader, file string) (*Matrix, error) {
	u, err := Decompress(r)
	if err != nil {
		return nil, failed(file, err)
	}
	b := bufio.NewReaderSize(u, 1<<16)
	head, err := b.Peek(8)
	if err != nil && err != io.EOF {
		return nil, failed(file, err)
	}
	switch {
	case bytes.HasPrefix(head, []byte("\x93NUMPY")):
		return readNPY(b, file)
	case bytes.HasPrefix(head, []byte("PK\x03\x04")):
		return readNPZ(b, file)
	}
	if bytes.HasPrefix(head, []byte(byteOrderMark)) {
		_, _ = b.Discard(len(byteOrderMark)) // it is in the buffer
	}
	return readMatrixText(b, file)
}

// builder takes the elements of an N×N matrix row by row, keeps the upper triangle and compares the lower with it.
type builder struct {
	file string
	n    int
	rows [][]float64
	i, j int // of the next element

	row, all mismatch // the worst in the current row, the worst so far
}

// mismatch is a pair of elements that should be equal.
type mismatch struct {
	i, j, line   int
	upper, lower float64
	size         float64
}

// add takes the next element, found at a line of the file (0 in binary files).
func (b *builder) add(v float64, line int) error {
	i, j := b.i, b.j
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return b.notFinite(v, line)
	}
	switch {
	case j < i:
		b.compare(v, line)
	case j > i:
		b.rows[i] = append(b.rows[i], v)
	default:
		b.diagonal(v)
	}
	if b.j++; b.j == b.n {
		b.i, b.j = i+1, 0
	}
	return nil
}

// diagonal starts a row of the upper triangle. The first row grows as it is read, so that a wrong size cannot ask
// for memory that no number fills.
func (b *builder) diagonal(v float64) {
	if len(b.rows) == 0 {
		b.rows = append(b.rows, []float64{v})
	} else {
		b.rows = append(b.rows, append(make([]float64, 0, b.n-b.i), v))
	}
	if b.row.size > 0 {
		if b.row.size /= math.Sqrt(math.Abs(v)); b.row.size > b.all.size {
			b.all = b.row
		}
		b.row = mismatch{}
	}
}

// compare checks an element of the lower triangle. Its row's diagonal has not been read yet, so the difference
// is kept in units of the other row's error and scaled when the diagonal comes.
func (b *builder) compare(v float64, line int) {
	p := &b.rows[b.j][b.i-b.j]
	if *p == v {
		return
	}
	size := math.Abs(v-*p) / math.Sqrt(math.Abs(b.rows[b.j][0]))
	if size > b.row.size {
		b.row = mismatch{b.i, b.j, line, *p, v, size}
	}
	*p += (v - *p) / 2
}

func (b *builder) notFinite(v float64, line int) error {
	return &Error{File: b.file, Line: line, Message: message(
		fmt.Sprintf("%v in row %d, column %d", v, b.i+1, b.j+1), "finite numbers", "correct the matrix")}
}

// matrix is the result when all elements are there.
func (b *builder) matrix() (*Matrix, error) {
	if w := b.all; w.size > SymmetryTolerance {
		return nil, &Error{File: b.file, Line: w.line, Message: message(
			fmt.Sprintf("%s in row %d, column %d but %s in row %d, column %d", short(w.lower), w.i+1, w.j+1, short(w.upper), w.j+1, w.i+1),
			"a symmetric matrix", "check that it is complete and in the right order")}
	}
	return &Matrix{rows: b.rows, Asymmetry: b.all.size}, nil
}
