package data

import (
	"fmt"
	"io"
	"strings"
)

// Templates are systematic errors of a table: column s of row k is the change of the k-th kept row's value when
// the s-th systematic is off by one standard deviation. Their covariance is Σ over s of the outer products.
type Templates struct {
	Names  []string
	Values []float64 // row-major, kept rows × len(Names), in the unit of the table's values
}

// ReadTemplates reads a table with one column for each systematic and one row for each of the rows that s was
// made from, in their order, and keeps the rows that s kept. It reads in one pass and stores nothing but the
// result.
func ReadTemplates(r io.Reader, file string, s Selection) (*Templates, error) {
	t, err := open(r, file)
	if err != nil {
		return nil, err
	}
	out := &Templates{Names: t.names, Values: make([]float64, 0, len(s.Kept)*len(t.names))}
	kept, n := s.Kept, 0
	for ; ; n++ {
		row, line, err := t.rows.read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if len(row) != len(t.names) {
			return nil, t.ragged(line, len(row))
		}
		if len(kept) == 0 || kept[0] != n {
			continue
		}
		kept = kept[1:]
		if err := t.appendRow(out, row, line); err != nil {
			return nil, err
		}
	}
	if n != s.Read {
		return nil, &Error{File: file, Message: message(count(n, "row"), fmt.Sprintf("%d as in %s before cuts", s.Read, s.File),
			"give the templates that belong to the table")}
	}
	return out, nil
}

func (t *table) appendRow(out *Templates, row []string, line int) error {
	for i, cell := range row {
		v, err := anyNumber.parse(strings.TrimSpace(cell))
		if err != nil {
			return &Error{t.file, line, t.names[i], err.Error()}
		}
		out.Values = append(out.Values, v)
	}
	return nil
}
