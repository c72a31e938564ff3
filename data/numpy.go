package data

import (
	"bytes"
	"fmt"
	"io"
	"math"
	"strings"

	"github.com/sbinet/npyio/npy"
	"github.com/sbinet/npyio/npz"
)

// wholeReads makes every Read fill its slice: npyio takes a short read for a whole number. An end in the middle
// of an array is an error.
type wholeReads struct{ r io.Reader }

func (w wholeReads) Read(p []byte) (int, error) {
	n, err := io.ReadFull(w.r, p)
	if err == io.EOF && len(p) > 0 {
		err = io.ErrUnexpectedEOF
	}
	return n, err
}

// openNPY reads the header of an array. npyio panics on some headers that NumPy never writes.
func openNPY(r io.Reader, file string) (_ *npy.Reader, err error) {
	defer func() {
		if recover() != nil {
			err = badHeader(file, "it is no dictionary")
		}
	}()
	n, err := npy.NewReader(wholeReads{r})
	if err != nil {
		return nil, badHeader(file, err.Error())
	}
	for _, d := range n.Header.Descr.Shape {
		if d < 0 || d > math.MaxInt32 {
			return nil, badHeader(file, fmt.Sprintf("shape %v", n.Header.Descr.Shape))
		}
	}
	return n, nil
}

func badHeader(file, said string) error {
	return &Error{File: file, Message: message("a damaged NumPy header ("+quoted(said)+")", "an array as numpy.save writes it", "write it again")}
}

func readNPY(r io.Reader, file string) (*Matrix, error) {
	n, err := openNPY(r, file)
	if err != nil {
		return nil, err
	}
	return readArray(n, file)
}

// readNPZ reads the one matrix of an archive. Some releases put the number of rows beside it; single numbers are
// passed over.
func readNPZ(r io.Reader, file string) (*Matrix, error) {
	packed, err := io.ReadAll(r)
	if err != nil {
		return nil, failed(file, err)
	}
	z, err := npz.NewReader(bytes.NewReader(packed), int64(len(packed)))
	if err != nil {
		return nil, failed(file, io.ErrUnexpectedEOF)
	}
	var matrices []string
	for _, name := range z.Keys() {
		if shape, err := shapeIn(z, name, file); err != nil {
			return nil, err
		} else if elements(shape) > 1 {
			matrices = append(matrices, name)
		}
	}
	if len(matrices) != 1 {
		return nil, &Error{File: file, Message: message(fmt.Sprintf("%s (%s)", count(len(matrices), "array"), strings.Join(matrices, ", ")),
			"one", "save the covariance alone")}
	}
	item, err := z.Open(matrices[0])
	if err != nil {
		return nil, failed(file, io.ErrUnexpectedEOF)
	}
	defer item.Close()
	return readNPY(item, file)
}

func shapeIn(z *npz.Reader, name, file string) ([]int, error) {
	item, err := z.Open(name)
	if err != nil {
		return nil, failed(file, io.ErrUnexpectedEOF)
	}
	defer item.Close()
	n, err := openNPY(item, file)
	if err != nil {
		return nil, err
	}
	return n.Header.Descr.Shape, nil
}

func elements(shape []int) int {
	n := 1
	for _, d := range shape {
		n *= d
	}
	return n
}

// readArray reads N×N numbers or a packed upper triangle. A symmetric matrix reads the same in C and Fortran order.
func readArray(a *npy.Reader, file string) (*Matrix, error) {
	shape := a.Header.Descr.Shape
	switch len(shape) {
	case 2:
		if shape[0] == shape[1] && shape[0] > 0 {
			return readFull(a, file, shape[0])
		}
	case 1:
		// The positive root of N(N+1)/2 = L.
		n := int(math.Round((math.Sqrt(8*float64(shape[0])+1) - 1) / 2))
		if n > 0 && n*(n+1)/2 == shape[0] {
			return readPacked(a, file, n)
		}
	}
	return nil, &Error{File: file, Message: message(fmt.Sprintf("an array of shape %v", shape),
		"N×N, or the N(N+1)/2 numbers of its upper triangle", "save the matrix in one of these shapes")}
}

func readFull(a *npy.Reader, file string, n int) (*Matrix, error) {
	b := &builder{file: file, n: n}
	for i := 0; i < n; i++ {
		row, err := readNumbers(a, file, n)
		if err != nil {
			return nil, err
		}
		for _, v := range row {
			if err := b.add(v, 0); err != nil {
				return nil, err
			}
		}
	}
	return b.matrix()
}

func readPacked(a *npy.Reader, file string, n int) (*Matrix, error) {
	m := &Matrix{}
	for i := 0; i < n; i++ {
		row, err := readNumbers(a, file, n-i)
		if err != nil {
			return nil, err
		}
		for k, v := range row {
			if math.IsNaN(v) || math.IsInf(v, 0) {
				return nil, (&builder{file: file, i: i, j: i + k}).notFinite(v, 0)
			}
		}
		m.rows = append(m.rows, row)
	}
	return m, nil
}

// readNumbers reads the next n numbers of an array. It asks npyio for no more than a few thousand at a time, so
// that a header cannot ask for memory that no number fills.
func readNumbers(a *npy.Reader, file string, n int) ([]float64, error) {
	const most = 1 << 13
	all := make([]float64, 0, min(n, most))
	for len(all) < n {
		k := min(n-len(all), most)
		part, err := readSome(a, k)
		if err != nil {
			return nil, arrayError(a, file, err)
		}
		all = append(all, part...)
	}
	return all, nil
}

func readSome(a *npy.Reader, n int) ([]float64, error) {
	part := make([]float64, n)
	err := a.Read(&part)
	if err != npy.ErrTypeMismatch {
		return part, err
	}
	single := make([]float32, n)
	if err := a.Read(&single); err != nil {
		return nil, err
	}
	for i, v := range single {
		part[i] = float64(v)
	}
	return part, nil
}

func arrayError(a *npy.Reader, file string, err error) error {
	if err == npy.ErrTypeMismatch || err == npy.ErrInvalidType {
		return &Error{File: file, Message: message("an array of type "+quoted(a.Header.Descr.Type), "float64 or float32", "convert it with astype(float)")}
	}
	return failed(file, err)
}
