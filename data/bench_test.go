package data

import (
	"bytes"
	"fmt"
	"io"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
)

// surveyTable writes rows of an invented survey.
func surveyTable(rows int) string {
	rng := rand.New(rand.NewPCG(1, 2))
	var b strings.Builder
	b.WriteString("name,survey,z,z_hel,mag,mag_err\n")
	for i := range rows {
		z := 0.01 + 1.5*rng.Float64()
		fmt.Fprintf(&b, "sn%d,S%d,%.5f,%.5f,%.4f,%.4f\n", i, i%5, z, z+0.001, 20+z, 0.1+0.05*rng.Float64())
	}
	return b.String()
}

// matrixText writes a positive definite matrix the way public releases do: its size, then a number a line.
func matrixText(n int) []byte {
	rng := rand.New(rand.NewPCG(3, 4))
	factor := make([]float64, n)
	for i := range factor {
		factor[i] = 0.05 * rng.NormFloat64()
	}
	var b bytes.Buffer
	fmt.Fprintln(&b, n)
	for i := range n {
		for j := range n {
			v := factor[i] * factor[j]
			if i == j {
				v += 0.02
			}
			fmt.Fprintf(&b, "%.8f\n", v)
		}
	}
	return b.Bytes()
}

func BenchmarkSupernovae1e6(b *testing.B) {
	table := surveyTable(1e6)
	for name, cut := range map[string]string{"whole": "", "cut": "z > 0.1 && survey != 'S3'"} {
		b.Run(name, func(b *testing.B) {
			b.SetBytes(int64(len(table)))
			b.ReportAllocs()
			for b.Loop() {
				if _, err := ReadSupernovae(strings.NewReader(table), "sn.csv", Options{Cut: cut}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

// BenchmarkRows compares the two ways a kept row can become numbers: gocsv's structs and columns.
func BenchmarkRows(b *testing.B) {
	type row struct {
		Z   positive `csv:"z"`
		Mag positive `csv:"mag"`
		Err positive `csv:"mag_err"`
	}
	table := surveyTable(1e5)
	fields := fixed(field{name: "z"}, field{name: "mag"}, field{name: "mag_err"})
	t, s, err := read(strings.NewReader(table), "sn.csv", Options{}, fields)
	if err != nil {
		b.Fatal(err)
	}
	b.Run("structs", func(b *testing.B) {
		b.ReportAllocs()
		for b.Loop() {
			if _, err := decode[row](t, s); err != nil {
				b.Fatal(err)
			}
		}
	})
	b.Run("columns", func(b *testing.B) {
		b.ReportAllocs()
		for b.Loop() {
			for _, name := range []string{"z", "mag", "mag_err"} {
				if _, err := t.numbers(name, aboveZero, s); err != nil {
					b.Fatal(err)
				}
			}
		}
	})
}

func BenchmarkMatrixText1701(b *testing.B) {
	text := matrixText(1701)
	b.SetBytes(int64(len(text)))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := ReadMatrix(bytes.NewReader(text), "c.cov"); err != nil {
			b.Fatal(err)
		}
	}
}

func BenchmarkFactorised1590(b *testing.B) {
	m, err := ReadMatrix(bytes.NewReader(matrixText(1701)), "c.cov")
	if err != nil {
		b.Fatal(err)
	}
	s := Selection{File: "sn.csv", Read: 1701}
	for i := range 1590 {
		s.Kept = append(s.Kept, i+111)
		s.Lines = append(s.Lines, i+113)
	}
	b.ReportAllocs()
	for b.Loop() {
		if _, _, err := Factorised("c.cov", m, Total, s, nil); err != nil {
			b.Fatal(err)
		}
	}
}

// BenchmarkNotPositive1590 is the price of naming the rows at fault, paid only by those who need it.
func BenchmarkNotPositive1590(b *testing.B) {
	c := mat.NewSymDense(1590, nil)
	for i := range 1590 {
		for j := i; j < 1590; j++ {
			c.SetSym(i, j, 1/(1+float64(j-i)))
		}
		c.SetSym(i, i, 1)
	}
	c.SetSym(700, 701, 1.1)
	for b.Loop() {
		notPositive("c.cov", c, func(int) string { return "" })
	}
}

func BenchmarkTemplates1e6x20(b *testing.B) {
	const rows, columns = 1_000_000, 20
	rng := rand.New(rand.NewPCG(5, 6))
	var text bytes.Buffer
	for k := range columns {
		fmt.Fprintf(&text, "%cs%d", "\n,"[min(1, k)], k)
	}
	s := Selection{Read: rows, Kept: make([]int, rows)}
	for i := range rows {
		s.Kept[i] = i
		for k := range columns {
			fmt.Fprintf(&text, "%c%.5f", "\n,"[min(1, k)], 0.01*rng.NormFloat64())
		}
	}
	b.SetBytes(int64(text.Len()))
	b.ReportAllocs()
	for b.Loop() {
		if _, err := ReadTemplates(io.NewSectionReader(bytes.NewReader(text.Bytes()), 0, int64(text.Len())), "t.csv", s); err != nil {
			b.Fatal(err)
		}
	}
}
