package data

import (
	"errors"
	"io"
)

// Bound says whether an age was measured or only bounded from below.
type Bound uint8

// An object cannot be older than the universe, but it can be younger: its age is a LowerBound on the age of the
// universe at its redshift unless the time between the big bang and its formation is known.
const (
	Measured Bound = iota
	LowerBound
)

func (b Bound) String() string {
	if b == LowerBound {
		return "lower"
	}
	return "measured"
}

// UnmarshalCSV reads "measured" or "lower"; an empty cell is measured.
func (b *Bound) UnmarshalCSV(cell string) error {
	switch cell {
	case "", "measured":
		*b = Measured
	case "lower":
		*b = LowerBound
	default:
		return errors.New(message(quoted(cell), `"measured" or "lower"`, "write one of the two"))
	}
	return nil
}

// Ages are ages of old objects; slices have the length of Selection.Kept.
type Ages struct {
	Name  []string  // nil where the table has none
	Z     []float64 // 0 or above: the oldest stars we know are our neighbours
	Age   []float64 // Gyr, above 0
	Err   []float64 // 1σ, Gyr, above 0
	Bound []Bound
	Selection
}

type ageRow struct {
	Name  string   `csv:"name"`
	Z     fromHere `csv:"z"`
	Age   positive `csv:"age"`
	Err   positive `csv:"error"`
	Bound Bound    `csv:"bound"`
}

// ReadAges reads a table with columns z, age, error and optionally name, bound.
func ReadAges(r io.Reader, file string, o Options) (*Ages, error) {
	t, s, err := read(r, file, o, fixed(fieldName, field{name: "z", what: "the redshift"}, field{name: "age", what: "the age in Gyr"},
		field{name: "error", what: "the error of the age"}, field{name: "bound", what: "measured or lower", optional: true}))
	if err != nil {
		return nil, err
	}
	rows, err := decode[ageRow](t, s)
	if err != nil {
		return nil, err
	}
	a := &Ages{Name: t.texts("name", s), Selection: s}
	a.names = a.Name
	for _, row := range rows {
		a.Z = append(a.Z, float64(row.Z))
		a.Age = append(a.Age, float64(row.Age))
		a.Err = append(a.Err, float64(row.Err))
		a.Bound = append(a.Bound, row.Bound)
	}
	return a, nil
}
