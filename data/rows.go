package data

import (
	"bufio"
	"encoding/csv"
	"errors"
	"io"
	"strings"
)

// rowReader returns one row after another with the line it starts at, io.EOF after the last. The slice is reused.
type rowReader interface {
	read() ([]string, int, error)
}

var (
	_ rowReader = (*separatedRows)(nil)
	_ rowReader = (*blankRows)(nil)
)

// rows reads the rows of the table that l describes.
func (l layout) rows(file string) rowReader {
	if l.separator == blank {
		return &blankRows{file: file, b: bufio.NewReaderSize(l.body, longestLine), line: l.first - 1}
	}
	r := csv.NewReader(l.body)
	r.Comma = l.separator
	r.Comment = '#'
	r.ReuseRecord = true
	r.FieldsPerRecord = -1                   // ragged rows get our own message
	r.TrimLeadingSpace = l.separator != '\t' // it would swallow empty cells between tabs
	return &separatedRows{file: file, r: r, before: l.first - 1}
}

type separatedRows struct {
	file   string
	r      *csv.Reader
	before int // lines of the file that r does not see
}

func (s *separatedRows) read() ([]string, int, error) {
	for {
		row, err := s.r.Read()
		if err == io.EOF {
			return nil, 0, err
		}
		var wrong *csv.ParseError
		if errors.As(err, &wrong) {
			return nil, 0, strayQuote(s.file, wrong.StartLine+s.before)
		}
		if err != nil {
			return nil, 0, failed(s.file, err)
		}
		if isRow(row) {
			line, _ := s.r.FieldPos(0)
			return row, line + s.before, nil
		}
	}
}

// isRow is false for a line of blanks and for an indented comment, which package csv takes for rows.
func isRow(row []string) bool {
	if len(row) == 1 && strings.TrimSpace(row[0]) == "" {
		return false
	}
	return !strings.HasPrefix(row[0], "#")
}

func strayQuote(file string, line int) error {
	return &Error{File: file, Line: line, Message: message("a stray quotation mark", "a pair around a whole cell",
		"remove it, or double it inside a quoted cell")}
}

// blankRows reads cells separated by runs of blanks.
type blankRows struct {
	file string
	b    *bufio.Reader
	line int
	row  []string
}

func (s *blankRows) read() ([]string, int, error) {
	for {
		line, err := s.b.ReadSlice('\n')
		if err == bufio.ErrBufferFull {
			return nil, 0, tooLong(s.file, s.line+1)
		}
		if err != nil && (err != io.EOF || len(line) == 0) {
			if err != io.EOF {
				err = failed(s.file, err)
			}
			return nil, 0, err
		}
		s.line++
		var ok bool
		if s.row, ok = splitBlanks(s.row[:0], string(line)); !ok {
			return nil, 0, strayQuote(s.file, s.line)
		}
		if len(s.row) > 0 && !strings.HasPrefix(s.row[0], "#") {
			return s.row, s.line, nil
		}
	}
}

// splitBlanks appends the cells of a line to row; ok is false if a quotation mark is not closed.
func splitBlanks(row []string, line string) (_ []string, ok bool) {
	for {
		line = strings.TrimLeft(line, " \t\r\n\v\f")
		if line == "" {
			return row, true
		}
		if line[0] != '"' {
			end := strings.IndexAny(line, " \t\r\n\v\f")
			if end < 0 {
				end = len(line)
			}
			row = append(row, line[:end])
			line = line[end:]
			continue
		}
		end := closing(line)
		if end < 0 {
			return row, false
		}
		row = append(row, strings.ReplaceAll(line[1:end], `""`, `"`))
		line = line[end+1:]
	}
}

// closing is the place of the quotation mark that closes the one at the start of s; a doubled one does not.
func closing(s string) int {
	for i := 1; i < len(s); i++ {
		if s[i] != '"' {
			continue
		}
		if i+1 == len(s) || s[i+1] != '"' {
			return i
		}
		i++
	}
	return -1
}
