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
	// Mapping writes an entry of Columns as the user of the caller would, for messages that propose one; nil
	// writes columns = { z = "zHD" }.
	Mapping func(name, column string) string
}

// mapping is an entry of Columns for a message.
func (o Options) mapping(name, column string) string {
	if o.Mapping != nil {
		return o.Mapping(name, column)
	}
	return fmt.Sprintf("columns = { %s = %q }", name, column)
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
func (h headings) resolve(fields []field, o Options) (map[string]int, error) {
	columns := o.Columns
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
			return nil, h.missing(name, "the one mapped to "+f.name, f.name, h.free(fields, columns), o)
		case !f.optional:
			return nil, h.missing(name, f.what, f.name, h.free(fields, columns), o)
		}
	}
	return places, nil
}

// free is the columns that carry none of the fields.
func (h headings) free(fields []field, columns map[string]string) []string {
	used := map[string]bool{"": true}
	for _, f := range fields {
		name, mapped := columns[f.name]
		if !mapped {
			name = f.name
		}
		used[name] = true
	}
	return slices.DeleteFunc(slices.Clone(h.names), func(name string) bool { return used[name] })
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
				fmt.Sprintf("did you mean %q?", Nearest(name, known)))}
		}
	}
	return nil
}

// missing shows how to map the column most likely meant: one that is known to carry the quantity, else the one
// whose name is nearest. If none is near it lists a few and leaves the choice to the user.
func (h headings) missing(name, what, ours string, free []string, o Options) error {
	do := "add it"
	near := byDistance(name, free)
	if known, ok := Recognise(free)[ours]; ok {
		do = fmt.Sprintf("the nearest is %q: %s", known, o.mapping(ours, known))
	} else if len(near) > 0 && distance(name, near[0]) <= farthest {
		do = fmt.Sprintf("the nearest is %q: %s", near[0], o.mapping(ours, near[0]))
	} else if len(near) > 0 {
		do = fmt.Sprintf("name one, such as %s: %s", strings.Join(near[:min(5, len(near))], ", "), o.mapping(ours, "…"))
	}
	return &Error{h.file, h.line, name, message("no such column", what, do)}
}
