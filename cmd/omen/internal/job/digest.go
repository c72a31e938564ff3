package job

import (
	"crypto/sha256"
	"encoding/hex"
	"io"
)

// digest is the SHA-256 of what is written to it, computed while the writer goes
// on. It must be closed.
type digest struct {
	*io.PipeWriter
	sum chan []byte
}

func newDigest() digest {
	r, w := io.Pipe()
	d := digest{w, make(chan []byte, 1)}
	go func() {
		h := sha256.New()
		// Neither a hash nor a pipe returns an error that was not put in.
		_, _ = io.CopyBuffer(h, r, make([]byte, 1<<18))
		d.sum <- h.Sum(nil)
	}()
	return d
}

// hex ends the writing, and is the digest in hexadecimal.
func (d digest) hex() string {
	d.Close()
	return hex.EncodeToString(<-d.sum)
}
