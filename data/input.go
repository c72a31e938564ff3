package data

import (
	"bufio"
	"bytes"
	"compress/gzip"
	"io"
)

// Decompress returns what r holds, unpacked if it starts with the two bytes of a gzip file (RFC 1952, §2.3.1).
func Decompress(r io.Reader) (io.Reader, error) {
	b := bufio.NewReaderSize(r, 1<<16)
	head, err := b.Peek(2)
	if err != nil && err != io.EOF {
		return nil, err
	}
	if len(head) < 2 || head[0] != 0x1f || head[1] != 0x8b {
		return b, nil
	}
	return gzip.NewReader(b)
}

// longestLine bounds the memory a file without line ends can cost.
const longestLine = 1 << 20

const byteOrderMark = "\xef\xbb\xbf" // of UTF-8

// text returns r unpacked and without its byte-order mark, refusing what is not text in an ASCII-compatible
// encoding.
func text(r io.Reader, file string) (*bufio.Reader, error) {
	u, err := Decompress(r)
	if err != nil {
		return nil, failed(file, err)
	}
	b := bufio.NewReaderSize(u, longestLine)
	head, err := b.Peek(512)
	if err != nil && err != io.EOF {
		return nil, failed(file, err)
	}
	switch {
	case bytes.HasPrefix(head, []byte(byteOrderMark)):
		_, _ = b.Discard(len(byteOrderMark)) // it is in the buffer
	case bytes.HasPrefix(head, []byte("\xff\xfe")), bytes.HasPrefix(head, []byte("\xfe\xff")):
		return nil, &Error{File: file, Message: message("text in UTF-16", "UTF-8", "save it again as UTF-8")}
	case bytes.IndexByte(head, 0) >= 0:
		return nil, &Error{File: file, Message: message("binary data", "text", "check that this is the file you meant")}
	}
	return b, nil
}
