package data

import (
	"bufio"
	"bytes"
	"encoding/csv"
	"io"
	"strings"
)

const blank = ' ' // stands for any run of blanks and tabs

// layout is how a table is written, found from its first lines.
type layout struct {
	separator rune
	header    []string // nil: the first row of body is the header
	surplus   []string // the last name of a header that has one more than the rows have cells
	line      int      // of the header
	first     int      // line at which body starts
	body      io.Reader
}

// look reads up to the second line that is neither blank nor a comment, decides, and puts what it read back.
func look(b *bufio.Reader, file string) (layout, error) {
	var (
		l       layout
		content []string
		replay  bytes.Buffer
		comment string // the last before the first row
		at      int    // its line
	)
	for n, ended := 1, false; len(content) < 2 && !ended; n++ {
		line, err := b.ReadSlice('\n')
		switch ended = err == io.EOF; {
		case err == bufio.ErrBufferFull:
			return l, tooLong(file, n)
		case err != nil && !ended:
			return l, failed(file, err)
		}
		s := strings.TrimSpace(string(line))
		if strings.Contains(s, "\r") {
			return l, &Error{File: file, Line: n, Message: message("lines that end in a carriage return alone", "a line feed after every row",
				"save it again with the line ends of Unix or Windows")}
		}
		isComment := strings.HasPrefix(s, "#")
		if s != "" && !isComment {
			if content = append(content, s); len(content) == 1 {
				l.first = n
			}
		}
		if len(content) > 0 {
			replay.Write(line)
		} else if isComment {
			comment, at = s, n
		}
	}
	if len(content) == 0 {
		return l, empty(file)
	}
	l.body = io.MultiReader(&replay, b)
	l.separator = separator(content)
	return l, l.findHeader(file, content[0], comment, at)
}

func empty(file string) error {
	return &Error{File: file, Message: message("an empty file", "a header row and rows of measurements",
		"check that it was written completely")}
}

func tooLong(file string, line int) error {
	return &Error{File: file, Line: line, Message: message("a line longer than a megabyte", "a table of text",
		"check that this is the file you meant")}
}

// separator picks the one that splits both lines into the same number of fields, at least two; failing that,
// the one that splits the first. A single column needs none.
func separator(lines []string) rune {
	fallback := blank
	for _, sep := range []rune{blank, '\t', ',', ';'} {
		n := len(split(lines[0], sep))
		if n > 1 {
			fallback = sep
		}
	}
	if len(lines) < 2 {
		return fallback
	}
	for _, sep := range []rune{';', ',', '\t', blank} {
		n := len(split(lines[0], sep))
		if n > 1 && n == len(split(lines[1], sep)) {
			return sep
		}
	}
	return fallback
}

// split is the fields of one line, or none if its quotes do not match.
func split(line string, sep rune) []string {
	if sep == blank {
		fields, _ := splitBlanks(nil, line)
		return fields
	}
	r := csv.NewReader(strings.NewReader(line))
	r.Comma = sep
	r.TrimLeadingSpace = sep != '\t'
	fields, err := r.Read()
	if err != nil {
		return nil
	}
	return fields
}

// findHeader decides between a header row and a header in the comment before the first row. The tables of
// Scolnic et al. 2018 name one column in such a comment, the last, that their rows do not have.
func (l *layout) findHeader(file, first, comment string, commentLine int) error {
	row := split(first, l.separator)
	l.line = l.first
	if !numeric(row) {
		return nil
	}
	if comment != "" && commentLine == l.first-1 {
		h := split(strings.TrimLeft(comment, "# \t"), l.separator)
		if n := len(h) - len(row); n == 0 || n == 1 {
			l.header, l.line, l.surplus = h[:len(row)], commentLine, h[len(row):]
			return nil
		}
	}
	return &Error{File: file, Line: l.first, Message: message("numbers in the first row", "the names of the columns",
		"write a header row above it")}
}

// numeric tells a row of measurements, at least half of it numbers, from a row of names.
func numeric(row []string) bool {
	n := 0
	for _, cell := range row {
		if _, ok := parse(strings.TrimSpace(cell)); ok {
			n++
		}
	}
	return n > 0 && 2*n >= len(row)
}
