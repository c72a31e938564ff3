package data

import "io"

// Rates are expansion rates H(z); slices have the length of Selection.Kept.
type Rates struct {
	Z   []float64 // above 0
	H   []float64 // km/s/Mpc, above 0
	Err []float64 // 1σ, km/s/Mpc, above 0
	Selection
}

type rateRow struct {
	Z   distant  `csv:"z"`
	H   positive `csv:"H"`
	Err positive `csv:"error"`
}

// ReadRates reads a table with columns z, H, error.
func ReadRates(r io.Reader, file string, o Options) (*Rates, error) {
	t, s, err := read(r, file, o, fixed(field{name: "z", what: "the redshift"},
		field{name: "H", what: "the expansion rate in km/s/Mpc"}, field{name: "error", what: "the error of the rate"}))
	if err != nil {
		return nil, err
	}
	rows, err := decode[rateRow](t, s)
	if err != nil {
		return nil, err
	}
	h := &Rates{Selection: s}
	for _, row := range rows {
		h.Z = append(h.Z, float64(row.Z))
		h.H = append(h.H, float64(row.H))
		h.Err = append(h.Err, float64(row.Err))
	}
	return h, nil
}
