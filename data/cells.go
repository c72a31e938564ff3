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

// rule is what a number must be: finite, above a bound and, for a redshift, below another.
type rule struct {
	above    float64
	want     string
	redshift bool
	uncut    bool // the caller's user has no cut to leave a row out with
}

var (
	anyNumber   = rule{above: math.Inf(-1), want: "a finite number"}
	aboveZero   = rule{above: 0, want: "a finite number above 0"}
	fromZero    = rule{above: -math.SmallestNonzeroFloat64, want: "a finite number, 0 or above"}
	redshift0   = rule{above: fromZero.above, want: fromZero.want, redshift: true}
	redshift    = rule{above: aboveZero.above, want: aboveZero.want, redshift: true}
	redshiftHel = rule{above: -1, want: "a finite number above -1", redshift: true}
)

// highest is a redshift that no object is seen at; the last scattering of the microwave background, at about 1090
// (Planck Collaboration 2020, A&A 641, A6), lies below.
const highest = 2000

// largest is the size of a measured number, and its inverse that of an error, beyond which their squares are no numbers
// any more; no unit needs it.
const largest = 1e100

// parse reads a cell that must obey the rule. The error is the message of an Error without its place.
func (r rule) parse(cell string) (float64, error) {
	v, ok := parse(cell)
	if ok && v > r.above && !math.IsInf(v, 0) {
		if r.redshift && v >= highest {
			return 0, errors.New(message(clip(cell), "a redshift below 2000", "is this a velocity, or another column?"))
		}
		if !r.uncut && (math.Abs(v) > largest || r.above == 0 && v < 1/largest) {
			return 0, errors.New(message(clip(cell), "a number that can be squared, 1e-100 to 1e100 in size", "correct the cell, or leave the row out with a cut"))
		}
		return v, nil
	}
	found, do := quoted(cell), "correct the cell, or leave the row out with a cut"
	if r.uncut {
		do = "correct the cell, or remove the row"
	}
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

// fromHere is a cell of a row struct that holds a redshift, 0 or above.
type fromHere float64

// UnmarshalCSV is called by gocsv.
func (p *fromHere) UnmarshalCSV(cell string) error {
	v, err := redshift0.parse(cell)
	*p = fromHere(v)
	return err
}

// distant is a cell of a row struct that holds a redshift above 0.
type distant float64

// UnmarshalCSV is called by gocsv.
func (p *distant) UnmarshalCSV(cell string) error {
	v, err := redshift.parse(cell)
	*p = distant(v)
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
