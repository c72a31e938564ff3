package data

import (
	"fmt"
	"io"
	"strings"
)

// Quantity is what a BAO measurement is a ratio of.
type Quantity uint8

// The ratios: transverse comoving distance D_M, Hubble distance D_H = c/H(z) and their spherical average
// D_V = (z D_M² D_H)^(1/3) over the sound horizon at the drag epoch rd, and D_M over D_H.
const (
	DMOverRd Quantity = iota + 1
	DHOverRd
	DVOverRd
	DMOverDH
)

var quantities = []string{DMOverRd: "DM_over_rd", DHOverRd: "DH_over_rd", DVOverRd: "DV_over_rd", DMOverDH: "DM_over_DH"}

func (q Quantity) String() string {
	if q == 0 || int(q) >= len(quantities) {
		return "unknown quantity"
	}
	return quantities[q]
}

// UnmarshalCSV reads the name of a ratio.
func (q *Quantity) UnmarshalCSV(cell string) error {
	for i, name := range quantities {
		if i > 0 && cell == name {
			*q = Quantity(i)
			return nil
		}
	}
	return fmt.Errorf("%s", message(quoted(cell), "one of "+strings.Join(quantities[1:], ", "), fmt.Sprintf("did you mean %s?", Nearest(cell, quantities[1:]))))
}

// BAO are distance ratios from baryon acoustic oscillations; slices have the length of Selection.Kept.
type BAO struct {
	Z        []float64
	Quantity []Quantity
	Value    []float64 // dimensionless, above 0
	Err      []float64 // 1σ, above 0; nil where the table has none: a total covariance is then needed
	Selection
}

type baoRow struct {
	Z        distant  `csv:"z"`
	Quantity Quantity `csv:"quantity"`
	Value    positive `csv:"value"`
	Err      positive `csv:"error"`
}

// ReadBAO reads a table with columns z, quantity, value and optionally error.
func ReadBAO(r io.Reader, file string, o Options) (*BAO, error) {
	t, s, err := read(r, file, o, fixed(field{name: "z", what: "the effective redshift"},
		field{name: "quantity", what: "one of " + strings.Join(quantities[1:], ", ")},
		field{name: "value", what: "the ratio"}, field{name: "error", what: "its error", optional: true}))
	if err != nil {
		return nil, err
	}
	rows, err := decode[baoRow](t, s)
	if err != nil {
		return nil, err
	}
	b := &BAO{Selection: s}
	_, hasErr := t.places["error"]
	for _, row := range rows {
		b.Z = append(b.Z, float64(row.Z))
		b.Quantity = append(b.Quantity, row.Quantity)
		b.Value = append(b.Value, float64(row.Value))
		if hasErr {
			b.Err = append(b.Err, float64(row.Err))
		}
	}
	return b, nil
}
