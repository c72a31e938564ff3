package data

import "io"

// scanner reads numbers from text at the speed of memory: it parses them where they lie in its buffer.
type scanner struct {
	file    string
	r       io.Reader
	space   []byte  // all of the buffer
	buf     []byte  // the part of it that has been read and not yet used
	pending []token // taken back, to be returned first
	line    int
	ended   bool
	comment bool // the line is a comment from here on
}

// token is a number and the line it stands in.
type token struct {
	value float64
	line  int
}

// longestNumber bounds the bytes of a number; the buffer holds many such.
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
	if len(s.buf) > longestNumber { // it cannot go on in what has not been read
		if v, end, ok := plain(s.buf); ok && kinds[s.buf[end]] != inNumber {
			s.buf = s.buf[end:]
			return token{v, s.line}, nil
		}
	}
	end := s.tokenEnd()
	for end == len(s.buf) && !s.ended && end <= longestNumber {
		if err := s.fill(); err != nil {
			return token{}, err
		}
		end = s.tokenEnd()
	}
	word := s.buf[:end]
	v, ok := parse(word)
	if !ok || end > longestNumber {
		return token{}, s.notNumber(word)
	}
	s.buf = s.buf[end:]
	return token{v, s.line}, nil
}

func (s *scanner) notNumber(word []byte) error {
	return &Error{File: s.file, Line: s.line, Message: message(quoted(string(word)), "a number", "correct the matrix; it has no header")}
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
	for {
		for i, c := range s.buf {
			switch kinds[c] {
			case lineEnd:
				s.line++
				s.comment = false
			case commenting:
				s.comment = true
			case inNumber:
				if !s.comment {
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
	m, err := s.r.Read(s.space[n:])
	s.buf = s.space[:n+m]
	if err == io.EOF {
		s.ended = true
		return nil
	}
	if err != nil {
		return failed(s.file, err)
	}
	return nil
}

// takeLine returns the numbers of the line in which the next number stands, at most most of them.
func (s *scanner) takeLine(most int) ([]token, error) {
	var line []token
	for len(line) < most {
		t, err := s.next()
		if err == io.EOF {
			break
		}
		if err != nil {
			return nil, err
		}
		if len(line) > 0 && t.line != line[0].line {
			s.takeBack(t)
			break
		}
		line = append(line, t)
	}
	return line, nil
}

// takeBack puts numbers before the next.
func (s *scanner) takeBack(t ...token) { s.pending = append(t, s.pending...) }
