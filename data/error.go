package data

import (
	"compress/flate"
	"compress/gzip"
	"errors"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// Error is a mistake in an input file, told in one line:
//
//	file:line: column "x": found …, expected …; do …
//
// Line is 0 where no single line is at fault, Column is empty where no column is.
type Error struct {
	File    string
	Line    int
	Column  string
	Message string
}

func (e *Error) Error() string {
	var b strings.Builder
	b.WriteString(e.File)
	if e.Line > 0 {
		b.WriteByte(':')
		b.WriteString(strconv.Itoa(e.Line))
	}
	b.WriteString(": ")
	if e.Column != "" {
		fmt.Fprintf(&b, "column %q: ", e.Column)
	}
	b.WriteString(e.Message)
	return b.String()
}

// CutError is an [Error] whose cause is [Options].Cut: the caller knows where the cut was written, and can say so.
type CutError struct{ Err error }

func (e *CutError) Error() string { return e.Err.Error() }

// Unwrap gives the Error: the file, and what in it the cut does not fit.
func (e *CutError) Unwrap() error { return e.Err }

// message builds the part after the place: what was found, what was expected, what to do.
func message(found, expected, do string) string {
	return "found " + found + ", expected " + expected + "; " + do
}

// failed turns an error of the underlying reader into the one to return. A damaged gzip stream is the file's
// fault, anything else (a disk, a closed pipe) is passed on with the file's name.
func failed(file string, err error) error {
	var own *Error
	var corrupt flate.CorruptInputError
	switch {
	case errors.As(err, &own):
		return own
	case errors.As(err, &corrupt), errors.Is(err, gzip.ErrChecksum), errors.Is(err, gzip.ErrHeader),
		errors.Is(err, io.ErrUnexpectedEOF):
		return &Error{File: file, Message: message("a damaged or cut-off file", "a whole one", "copy or download it again")}
	}
	return fmt.Errorf("%s: %w", file, err)
}

// quoted shows a piece of a file in a message: quoted, on one line, and never longer than a few words.
func quoted(s string) string { return strconv.Quote(clip(s)) }

func clip(s string) string {
	const most = 40
	if r := []rune(s); len(r) > most {
		return string(r[:most]) + "…"
	}
	return s
}

// short shows a value as a user would write it.
func short(v float64) string { return strconv.FormatFloat(v, 'g', 6, 64) }
