package data

import (
	"fmt"
	"maps"
	"slices"
	"strings"
)

// Options say how a table is to be read.
type Options struct {
	// Columns maps a name of ours to the column of the file that carries it: {"z": "zHD"}. A name that is not
	// mapped is looked for under itself.
	Columns map[string]string
	// Cut keeps the rows for which it is true: an expression over the file's own column names, such as
	// zHD > 0.01 && IS_CALIBRATOR == 0. A column whose name is not an identifier is $env["3rdvar"]. A column is
	// a number if all its cells are (empty ones count as NaN), otherwise text. Empty keeps all rows.
	Cut string
}

// field is a column that a kind of table can have.
type field struct {
	name     string // ours
	what     string // for messages: "the redshift in the CMB frame"
	optional bool
}

// headings are the column names of a file.
type headings struct {
	file  string
	line  int
	names []string
}

// check refuses two columns of the same name. Empty names are harmless: nothing can ask for them.
func (h headings) check() error {
	seen := make(map[string]int, len(h.names))
	for i, name := range h.names {
		if first, twice := seen[name]; twice && name != "" {
			return &Error{h.file, h.line, name, message(fmt.Sprintf("the name twice, in columns %d and %d", first+1, i+1),
				"every name once", "rename one of them")}
		}
		seen[name] = i
	}
	return nil
}

func (h headings) index(name string) int { return slices.Index(h.names, name) }

// has tells whether the file has a column for this name of ours, mapped or under the name itself.
func (h headings) has(name string, columns map[string]string) bool {
	_, mapped := columns[name]
	return mapped || h.index(name) >= 0
}

// resolve finds the place in the header of every field that the file has.
func (h headings) resolve(fields []field, columns map[string]string) (map[string]int, error) {
	if err := h.checkNames(fields, columns); err != nil {
		return nil, err
	}
	places := make(map[string]int, len(fields))
	for _, f := range fields {
		name, mapped := columns[f.name]
		if !mapped {
			name = f.name
		}
		i := h.index(name)
		switch {
		case i >= 0:
			places[f.name] = i
		case mapped:
			return nil, &Error{h.file, h.line, name, message("no such column", "the one mapped to "+f.name, h.mapNearest(f.name, name))}
		case !f.optional:
			return nil, h.missing(f)
		}
	}
	return places, nil
}

// checkNames refuses to map a name that the kind of table does not know: a silent misspelling would change the fit.
func (h headings) checkNames(fields []field, columns map[string]string) error {
	known := make([]string, len(fields))
	for i, f := range fields {
		known[i] = f.name
	}
	for _, name := range slices.Sorted(maps.Keys(columns)) {
		if !slices.Contains(known, name) {
			return &Error{File: h.file, Message: message(fmt.Sprintf("a mapping of %q", name), "one of "+strings.Join(known, ", "),
				fmt.Sprintf("did you mean %q?", nearest(name, known)))}
		}
	}
	return nil
}

func (h headings) missing(f field) error {
	return &Error{h.file, h.line, f.name, message("no such column", f.what, h.mapNearest(f.name, f.name))}
}

// mapNearest shows how to map the column most likely meant: one that is known to carry the quantity, else the
// one whose name is nearest.
func (h headings) mapNearest(ours, wanted string) string {
	name, known := Recognise(h.names)[ours]
	if !known {
		name = nearest(wanted, h.names)
	}
	return fmt.Sprintf("the nearest is %q: columns = { %s = %q }", name, ours, name)
}

// nearest is the candidate with the fewest edits from name, letters of the other case counting less than others;
// the first of several, "" of none.
func nearest(name string, candidates []string) string {
	best, least := "", -1
	for _, c := range candidates {
		d := 4*edits(strings.ToLower(name), strings.ToLower(c)) + edits(name, c)
		if c != "" && (least < 0 || d < least) {
			best, least = c, d
		}
	}
	return best
}

// edits counts the insertions, deletions and substitutions between a and b (Levenshtein 1966).
func edits(a, b string) int {
	s, t := []rune(a), []rune(b)
	row := make([]int, len(t)+1)
	for j := range row {
		row[j] = j
	}
	for i, c := range s {
		diagonal := row[0]
		row[0] = i + 1
		for j, d := range t {
			cost := 1
			if c == d {
				cost = 0
			}
			diagonal, row[j+1] = row[j+1], min(row[j]+1, row[j+1]+1, diagonal+cost)
		}
	}
	return row[len(t)]
}
