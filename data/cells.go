package data

import (
	"encoding/csv"
	"errors"
	"io"
	"maps"
	"math"
	"slices"
	"strings"

	"github.com/gocarina/gocsv"
)

// rule is what a number must be: finite and above a bound.
type rule struct {
	above float64
	want  string
}

var (
	anyNumber   = rule{math.Inf(-1), "a finite number"}
	aboveZero   = rule{0, "a finite number above 0"}
	fromZero    = rule{-math.SmallestNonzeroFloat64, "a finite number, 0 or above"}
	aboveMinus1 = rule{-1, "a finite number above -1"}
)

// parse reads a cell that must obey the rule. The error is the message of an Error without its place.
func (r rule) parse(cell string) (float64, error) {
	v, ok := parse(cell)
	if ok && v > r.above && !math.IsInf(v, 0) {
		return v, nil
	}
	found, do := quoted(cell), "correct the cell, or leave the row out with a cut"
	switch {
	case ok:
		found = clip(cell)
	case cell == "":
		found = "an empty cell"
	case strings.Count(cell, ",") == 1:
		do = "write the decimal mark as a point"
	}
	return 0, errors.New(message(found, r.want, do))
}

// notNegative is a cell of a row struct that must be 0 or above.
type notNegative float64

// UnmarshalCSV is called by gocsv.
func (p *notNegative) UnmarshalCSV(cell string) error {
	v, err := fromZero.parse(cell)
	*p = notNegative(v)
	return err
}

// positive is a cell of a row struct that must be above 0.
type positive float64

// UnmarshalCSV is called by gocsv.
func (p *positive) UnmarshalCSV(cell string) error {
	v, err := aboveZero.parse(cell)
	*p = positive(v)
	return err
}

// decode turns the kept rows of a table into structs whose fields carry our names. It serves the tables that
// have words in their rows; supernovae come by the million and are read by columns (see BenchmarkRows).
func decode[T any](t *table, s Selection) ([]T, error) {
	k := &keptRows{t: t, s: s}
	k.names = slices.SortedFunc(maps.Keys(t.places), func(a, b string) int { return t.places[a] - t.places[b] })
	var rows []T
	err := gocsv.UnmarshalCSV(k, &rows)
	var wrong *csv.ParseError
	if errors.As(err, &wrong) {
		// gocsv counts the header as line 1.
		place := t.places[k.names[wrong.Column-1]]
		return nil, &Error{t.file, s.Lines[wrong.Line-2], t.names[place], wrong.Err.Error()}
	}
	return rows, err
}

// keptRows gives gocsv the kept rows under our names.
type keptRows struct {
	t     *table
	s     Selection
	names []string
	next  int
}

var _ gocsv.CSVReader = (*keptRows)(nil)

// Read returns the header first, then a row at a time.
func (k *keptRows) Read() ([]string, error) {
	if k.next == 0 {
		k.next++
		return k.names, nil
	}
	if k.next > len(k.s.Kept) {
		return nil, io.EOF
	}
	row := make([]string, len(k.names))
	for i, name := range k.names {
		row[i] = k.t.columns[k.t.places[name]].cell(k.s.Kept[k.next-1])
	}
	k.next++
	return row, nil
}

// ReadAll returns the header and all kept rows.
func (k *keptRows) ReadAll() ([][]string, error) {
	var all [][]string
	for {
		row, err := k.Read()
		if err == io.EOF {
			return all, nil
		}
		if err != nil {
			return nil, err
		}
		all = append(all, row)
	}
}
