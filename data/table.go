package data

import (
	"fmt"
	"io"
	"strings"
)

// table holds the columns of a file that are used, as text, until the cut has said which rows stay. The text of
// a column lies in one piece: a million rows of five columns then cost some 100 MB and hardly an allocation.
type table struct {
	headings
	rows    rowReader
	columns []*column      // by place in the header; nil where not used
	lines   []int          // of every row
	places  map[string]int // our name → place in the header
	warning error          // about the header
}

// column is the text of one column, cell after cell.
type column struct {
	text strings.Builder
	ends []int
}

func (c *column) add(cell string) {
	c.text.WriteString(cell)
	c.ends = append(c.ends, c.text.Len())
}

func (c *column) cell(row int) string {
	start := 0
	if row > 0 {
		start = c.ends[row-1]
	}
	return c.text.String()[start:c.ends[row]]
}

// open finds the layout and the header of a table.
func open(r io.Reader, file string) (*table, error) {
	b, err := text(r, file)
	if err != nil {
		return nil, err
	}
	l, err := look(b, file)
	if err != nil {
		return nil, err
	}
	t := &table{headings: headings{file, l.line, l.header}, rows: l.rows(file)}
	if len(l.surplus) > 0 {
		t.warning = &Error{file, l.line, l.surplus[0], message(count(len(l.header)+1, "name"),
			fmt.Sprintf("%d as the rows have cells", len(l.header)), "the last is ignored; check that the others stand over their columns")}
	}
	if t.names == nil {
		row, line, err := t.rows.read()
		if err == io.EOF {
			return nil, empty(file)
		}
		if err != nil {
			return nil, err
		}
		t.names, t.line = append([]string(nil), row...), line
	}
	for i, name := range t.names {
		t.names[i] = strings.Clone(strings.TrimSpace(name))
	}
	return t, t.check()
}

// Header reads the column names of a table and nothing else.
func Header(r io.Reader, file string) ([]string, error) {
	t, err := open(r, file)
	if err != nil {
		return nil, err
	}
	return t.names, nil
}

// load reads the wanted columns of all rows.
func (t *table) load(wanted []int) error {
	t.columns = make([]*column, len(t.names))
	for _, i := range wanted {
		t.columns[i] = new(column)
	}
	for {
		row, line, err := t.rows.read()
		if err == io.EOF {
			break
		}
		if err != nil {
			return err
		}
		if len(row) != len(t.names) {
			return t.ragged(line, len(row))
		}
		t.lines = append(t.lines, line)
		for i, c := range t.columns {
			if c != nil {
				c.add(strings.TrimSpace(row[i]))
			}
		}
	}
	if len(t.lines) == 0 {
		return &Error{t.file, t.line, "", message("a header and no rows", "at least one row", "check that the table was written completely")}
	}
	return nil
}

func (t *table) ragged(line, n int) error {
	return &Error{t.file, line, "", message(count(n, "cell"), fmt.Sprintf("%d as in the header in line %d", len(t.names), t.line),
		"add or remove a separator, or quote a cell that contains one")}
}

func count(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}

// read opens a table, finds the columns of the kind that fields describes, reads them and applies the cut.
func read(r io.Reader, file string, o Options, fields func(headings) ([]field, error)) (*table, Selection, error) {
	t, err := open(r, file)
	if err != nil {
		return nil, Selection{}, err
	}
	f, err := fields(t.headings)
	if err != nil {
		return nil, Selection{}, err
	}
	if t.places, err = t.resolve(f, o); err != nil {
		return nil, Selection{}, err
	}
	c, err := newCut(o.Cut, t.headings)
	if err != nil {
		return nil, Selection{}, &CutError{err}
	}
	wanted := c.columns
	for _, i := range t.places {
		wanted = append(wanted, i)
	}
	if err := t.load(wanted); err != nil {
		return nil, Selection{}, err
	}
	s, err := c.apply(t)
	if err != nil {
		return nil, Selection{}, &CutError{err}
	}
	if t.warning != nil {
		s.Warnings = append(s.Warnings, t.warning)
	}
	return t, s, nil
}

// fixed is for the kinds of table whose columns do not depend on the file.
func fixed(fields ...field) func(headings) ([]field, error) {
	return func(headings) ([]field, error) { return fields, nil }
}

// texts is a column of the kept rows as text, nil if the file does not have it.
func (t *table) texts(name string, s Selection) []string {
	i, ok := t.places[name]
	if !ok {
		return nil
	}
	out := make([]string, len(s.Kept))
	for k, row := range s.Kept {
		out[k] = t.columns[i].cell(row)
	}
	return out
}

// numbers is a column of the kept rows, each cell checked, nil if the file does not have it.
func (t *table) numbers(name string, r rule, s Selection) ([]float64, error) {
	i, ok := t.places[name]
	if !ok {
		return nil, nil
	}
	out := make([]float64, len(s.Kept))
	for k, row := range s.Kept {
		v, err := r.parse(t.columns[i].cell(row))
		if err != nil {
			return nil, &Error{t.file, s.Lines[k], t.names[i], err.Error()}
		}
		out[k] = v
	}
	return out, nil
}
