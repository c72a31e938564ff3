package data

import "io"

// Column is a column of numbers to be read by ReadColumns.
type Column struct {
	Name        string // ours
	What        string // for messages: "the density parameter of matter"
	Optional    bool
	NotNegative bool // 0 or above; otherwise any finite number
}

// ReadColumns reads numbers by columns from a table of any kind, such as a posterior sample that was published.
// The result has no entry for an optional column that the file lacks; each of its slices has the length of
// Selection.Kept.
func ReadColumns(r io.Reader, file string, o Options, columns ...Column) (map[string][]float64, Selection, error) {
	var fields []field
	for _, c := range columns {
		fields = append(fields, field{name: c.Name, what: c.What, optional: c.Optional})
	}
	t, s, err := read(r, file, o, fixed(fields...))
	if err != nil {
		return nil, s, err
	}
	values := make(map[string][]float64, len(columns))
	for _, c := range columns {
		rule := anyNumber
		if c.NotNegative {
			rule = fromZero
		}
		rule.uncut = true
		v, err := t.numbers(c.Name, rule, s)
		if err != nil {
			return nil, s, err
		}
		if v != nil {
			values[c.Name] = v
		}
	}
	return values, s, nil
}
