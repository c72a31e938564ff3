package data

import (
	"io"
	"math"
)

// scanner reads numbers from text at the speed of memory: it parses them where they lie in its buffer.
type scanner struct {
	file     string
	r        io.Reader
	buf      []byte // what has been read and not yet used
	space    []byte // the array behind buf
	line     int
	ended    bool
	pending  []token
	lookback bool
}

// token is a number and the line it stands in.
type token struct {
	value float64
	line  int
}

// longestNumber bounds what a number may take in the file.
const longestNumber = 1 << 10

func newScanner(r io.Reader, file string) *scanner {
	return &scanner{file: file, r: r, space: make([]byte, 1<<18), line: 1}
}

// next returns the next number, io.EOF after the last.
func (s *scanner) next() (token, error) {
	if len(s.pending) > 0 {
		t := s.pending[0]
		s.pending = s.pending[1:]
		return t, nil
	}
	if err := s.skip(); err != nil {
		return token{}, err
	}
	end := s.tokenEnd()
	if end == len(s.buf) && !s.ended {
		if err := s.fill(); err != nil {
			return token{}, err
		}
		end = s.tokenEnd()
	}
	word := s.buf[:end]
	v, ok := parse(word)
	if !ok || end > longestNumber {
		return token{}, &Error{File: s.file, Line: s.line, Message: message(quoted(string(word)), "a number", "correct the matrix; it has no header")}
	}
	s.buf = s.buf[end:]
	return token{v, s.line}, nil
}

// kinds of bytes
const (
	inNumber = iota
	separating
	lineEnd
	commenting
)

var kinds = func() (k [256]uint8) {
	for _, c := range " \t\r\v\f,;" {
		k[c] = separating
	}
	k['\n'], k['#'] = lineEnd, commenting
	return k
}()

// skip moves to the start of the next number.
func (s *scanner) skip() error {
	comment := false
	for {
		for i, c := range s.buf {
			switch kinds[c] {
			case lineEnd:
				s.line++
				comment = false
			case commenting:
				comment = true
			case inNumber:
				if !comment {
					s.buf = s.buf[i:]
					return nil
				}
			}
		}
		s.buf = s.buf[:0]
		if s.ended {
			return io.EOF
		}
		if err := s.fill(); err != nil {
			return err
		}
	}
}

// tokenEnd is the length of the number at the start of buf.
func (s *scanner) tokenEnd() int {
	for i, c := range s.buf {
		if kinds[c] != inNumber {
			return i
		}
	}
	return len(s.buf)
}

// fill moves what is left to the front and reads more.
func (s *scanner) fill() error {
	n := copy(s.space, s.buf)
	if n > longestNumber {
		s.ended = true // the token is refused whatever follows
		return nil
	}
	m, err := io.ReadFull(s.r, s.space[n:])
	s.buf = s.space[:n+m]
	if err == io.EOF || err == io.ErrUnexpectedEOF && !s.truncated() {
		s.ended = true
		return nil
	}
	if err != nil {
		return failed(s.file, err)
	}
	return nil
}

// truncated tells a gzip stream that ends early from a file that ends.
func (s *scanner) truncated() bool {
	_, err := s.r.Read(make([]byte, 1))
	return err != io.EOF
}

// takeLine appends the numbers of the line in which the next number stands.
func (s *scanner) takeLine(line []token) ([]token, error) {
	for {
		t, err := s.next()
		if err == io.EOF {
			return line, nil
		}
		if err != nil {
			return nil, err
		}
		if len(line) > 0 && t.line != line[0].line {
			s.pending = append(s.pending, t)
			return line, nil
		}
		line = append(line, t)
	}
}

var _ = math.Inf
