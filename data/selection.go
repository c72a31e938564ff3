package data

import (
	"fmt"
	"slices"
)

// Selection says which rows of a file were kept and why the others were not.
type Selection struct {
	File  string     // the table's
	Read  int        // rows in the file
	Kept  []int      // index of every kept row among the file's rows, from 0, ascending
	Lines []int      // line of the file of every kept row
	Cuts  []CutCount // in the order of the expression

	// Warnings are doubts about the file that do not keep it from being read, to be shown with the result.
	Warnings []error

	names []string // of the kept rows, where the table has them: for messages
}

// CutCount says how many rows a condition removed: those that passed all conditions before it and failed it.
// The conditions are the parts of a cut joined by && on its top level.
type CutCount struct {
	Expression string
	Removed    int
}

// Label names the k-th kept row for a person: by its name where the table has names, file and line.
func (s Selection) Label(k int) string {
	if k >= len(s.Lines) {
		return fmt.Sprintf("row %d", k+1)
	}
	if k < len(s.names) && s.names[k] != "" {
		return fmt.Sprintf("%s (%s:%d)", s.names[k], s.File, s.Lines[k])
	}
	return fmt.Sprintf("%s:%d", s.File, s.Lines[k])
}

// Repeat is a name that several rows share, such as a supernova observed by several surveys.
type Repeat struct {
	Name  string
	Lines []int
}

// Repeated lists the names that more than one kept row carries, in the order of their first rows. It is no
// mistake; empty names are not compared.
func (s Selection) Repeated() []Repeat {
	places := make(map[string]int, len(s.names))
	var all []Repeat
	for k, name := range s.names {
		if name == "" {
			continue
		}
		i, seen := places[name]
		if !seen {
			i = len(all)
			places[name] = i
			all = append(all, Repeat{Name: name})
		}
		all[i].Lines = append(all[i].Lines, s.Lines[k])
	}
	return slices.DeleteFunc(all, func(r Repeat) bool { return len(r.Lines) < 2 })
}
