package data

import (
	"fmt"
	"io"
	"math"
)

// readMatrixText reads both text formats. A first line of one number is the size; a first line of several is
// the first row, unless the lines do not fit that.
func readMatrixText(r io.Reader, file string) (*Matrix, error) {
	s := newScanner(r, file)
	first, err := s.takeLine(math.MaxInt)
	if err != nil {
		return nil, err
	}
	if len(first) == 0 {
		return nil, &Error{File: file, Message: message("an empty file", "a matrix", "check that it was written completely")}
	}
	second, err := s.takeLine(len(first) + 1)
	if err != nil {
		return nil, err
	}
	s.takeBack(second...)
	if n, leading := size(first, len(second)); leading {
		s.takeBack(first[1:]...)
		return readFlowing(s, n)
	}
	s.takeBack(first...)
	return readRows(s, len(first))
}

// size tells from the first line, and the length of the second, whether the first number is the size of the
// matrix (0 if it cannot be one); if not, the first line is its first row.
func size(first []token, second int) (n int, leading bool) {
	v := first[0].value
	whole := v >= 1 && v <= 1<<20 && v == math.Trunc(v)
	if whole {
		n = int(v)
	}
	switch {
	case second == 0:
		return n, whole && len(first) == 1+n*n
	case len(first) == 1:
		return n, true
	}
	return n, whole && second != len(first)
}

// readFlowing reads n² numbers, whatever their lines.
func readFlowing(s *scanner, n int) (*Matrix, error) {
	if n < 1 {
		return nil, &Error{File: s.file, Line: 1, Message: message("a first line of one number that is no size", "the number of rows, or a whole row",
			"write the number of rows first")}
	}
	b := &builder{file: s.file, n: n}
	read := 0
	for ; ; read++ {
		t, err := s.next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if read < n*n {
			if err := b.add(t.value, t.line); err != nil {
				return nil, err
			}
		}
	}
	if read != n*n {
		return nil, &Error{File: s.file, Message: message(fmt.Sprintf("%s after the size %d", count(read, "number"), n),
			fmt.Sprintf("%d² = %d", n, n*n), "check that the matrix is complete")}
	}
	return b.matrix()
}

// readRows reads n lines of n numbers.
func readRows(s *scanner, n int) (*Matrix, error) {
	b := &builder{file: s.file, n: n}
	line, inLine := 0, 0
	for {
		t, err := s.next()
		if err != nil && err != io.EOF {
			return nil, err
		}
		if line > 0 && (err == io.EOF || t.line != line) && inLine != n {
			return nil, &Error{File: s.file, Line: line, Message: message(count(inLine, "number"), fmt.Sprintf("%d as in the first row", n),
				"check the row")}
		}
		if err == io.EOF {
			break
		}
		if t.line != line {
			line, inLine = t.line, 0
		}
		inLine++
		if b.i < n {
			if err := b.add(t.value, t.line); err != nil {
				return nil, err
			}
		} else if inLine == n {
			b.i++
		}
	}
	if b.i != n {
		return nil, &Error{File: s.file, Message: message(fmt.Sprintf("%s of %d numbers", count(b.i, "row"), n), "as many rows as columns",
			"check that the matrix is complete")}
	}
	return b.matrix()
}
