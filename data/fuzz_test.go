package data

import (
	"bytes"
	"errors"
	"strings"
	"testing"

	"github.com/gocarina/gocsv"
	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/gonum/mat"
)

// tolerate fails on an error that does not tell its reader what to do.
func tolerate(t *testing.T, err error) {
	t.Helper()
	var own *Error
	if !errors.As(err, &own) {
		t.Fatalf("%T: %v", err, err)
	}
	if s := err.Error(); strings.Contains(s, "\n") || !strings.Contains(s, "found ") || !strings.Contains(s, ", expected ") {
		t.Fatalf("message %q", s)
	}
}

// Whatever the file, the supernova reader returns an *Error or consistent, checked columns.
func FuzzSupernovae(f *testing.F) {
	for _, seed := range []string{"", header, header + "a,0.1,20,0.1\n", "#z mag\n0.1 20\n", "z;mag\n\"0,1\";2\n", "z\tmag\n1\t\n",
		"\ufeffz,mag\r\n1,2\r\n", gzipped("z mag\n1 2\n"), "z mag\n\"1 2\n", "z,mag\n1e999,NaN\n"} {
		f.Add(seed, "z > 0.05")
	}
	f.Add(header+"a,0.1,20,0.1\n", "name == 'a' && z in [0.1] and len(name) > 0")
	f.Fuzz(func(t *testing.T, in, cut string) {
		sn, err := ReadSupernovae(strings.NewReader(in), "t.csv", Options{Cut: cut})
		if err != nil {
			tolerate(t, err)
			return
		}
		n := len(sn.Kept)
		if n == 0 || n > sn.Read || len(sn.Lines) != n || len(sn.Z) != n || len(sn.Value) != n {
			t.Fatalf("%+v", sn)
		}
		for _, z := range sn.Z {
			if !(z > 0) {
				t.Fatalf("z = %v", z)
			}
		}
	})
}

// What gocsv writes from ages comes back the same.
func FuzzAgesRoundTrip(f *testing.F) {
	f.Add("a,\"b\"\r\n c", 0.1, 3.5, 0.2, true)
	f.Add("", 0.0, 1e-300, 1e300, false)
	f.Fuzz(func(t *testing.T, name string, z, age, sigma float64, lower bool) {
		type row struct {
			Name  string  `csv:"name"`
			Z     float64 `csv:"z"`
			Age   float64 `csv:"age"`
			Err   float64 `csv:"error"`
			Bound string  `csv:"bound"`
		}
		// Blanks around a cell and the kind of a line end inside it are not kept; # starts a comment.
		name = strings.TrimSpace(strings.NewReplacer("\r", "", "#", "", "\x00", "").Replace(name))
		b := Bound(0)
		if lower {
			b = LowerBound
		}
		in, err := gocsv.MarshalString([]row{{name, z, age, sigma, b.String()}})
		if err != nil {
			t.Fatal(err)
		}
		a, err := ReadAges(strings.NewReader(in), "a.csv", Options{})
		if err != nil {
			tolerate(t, err)
			return
		}
		want := &Ages{Name: []string{name}, Z: []float64{z}, Age: []float64{age}, Err: []float64{sigma}, Bound: []Bound{b}}
		if diff := cmp.Diff(want, &Ages{Name: a.Name, Z: a.Z, Age: a.Age, Err: a.Err, Bound: a.Bound}, unexported); diff != "" {
			t.Fatalf("%q (-want +got):\n%s", in, diff)
		}
	})
}

// Whatever the file, the matrix reader returns an *Error or a matrix, and that survives being written as .npy.
func FuzzMatrix(f *testing.F) {
	for _, seed := range []string{"", "1", "2\n1 0\n0 1\n", "1,0\n0,1\n", "1 0\n0\n", "2 1 0 0 1", "3\n", "1e9\n1 1\n", "#\n", "\x1f\x8b",
		"\x93NUMPY\x01\x00\x76\x00{'descr': '<f8', 'fortran_order': False, 'shape': (1000000000,), }", "PK\x03\x04"} {
		f.Add([]byte(seed))
	}
	f.Fuzz(func(t *testing.T, in []byte) {
		m, err := ReadMatrix(bytes.NewReader(in), "c.cov")
		if err != nil {
			tolerate(t, err)
			return
		}
		n := m.N()
		dense := mat.NewDense(n, n, nil)
		for i := range n {
			for j := range n {
				dense.Set(i, j, m.At(i, j))
			}
		}
		again, err := ReadMatrix(strings.NewReader(asNPY(t, dense)), "again.npy")
		if err != nil {
			t.Fatal(err)
		}
		for i := range n {
			for j := i; j < n; j++ {
				if again.At(i, j) != m.At(i, j) {
					t.Fatalf("element %d,%d: %v, want %v", i, j, again.At(i, j), m.At(i, j))
				}
			}
		}
	})
}
