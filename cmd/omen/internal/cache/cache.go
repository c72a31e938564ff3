// Package cache keeps arrays of numbers that are slow to compute, each under a key
// that names all that it was computed from. It may be deleted at any time. An entry
// that is damaged, cut short or of another format is no entry; a disk that is full
// or read-only costs time and nothing else.
package cache

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/hex"
	"fmt"
	"hash"
	"io"
	"io/fs"
	"math"
	"os"
	"path/filepath"
	"slices"
	"time"
)

// Format is part of every key. It changes when the same inputs would be computed
// to other numbers, or written down differently.
const Format = 1

// capacity bounds the bytes of all entries: the oldest go first.
const capacity = 512 << 20

// Cache is a folder of entries. A nil Cache has none and takes none.
type Cache struct {
	dir      string
	capacity int64
}

// Open uses a folder, which is made when the first entry is put.
func Open(dir string) *Cache { return &Cache{dir, capacity} }

// Default is the cache in the user's folder for such things, nil if there is none.
func Default() *Cache {
	dir, err := os.UserCacheDir()
	if err != nil {
		return nil
	}
	return Open(filepath.Join(dir, "omen"))
}

// Key is the SHA-256 of everything that an entry depends on.
type Key [sha256.Size]byte

// KeyWriter gathers what goes into a key.
type KeyWriter struct{ sum hash.Hash }

// NewKey begins the key of an entry of some kind.
func NewKey(kind string) *KeyWriter {
	k := &KeyWriter{sha256.New()}
	k.Text(fmt.Sprintf("omen %s %d", kind, Format))
	return k
}

// Text adds a string.
func (k *KeyWriter) Text(s string) {
	k.Number(uint64(len(s)))
	k.sum.Write([]byte(s))
}

// Number adds a number.
func (k *KeyWriter) Number(n uint64) {
	k.sum.Write(binary.LittleEndian.AppendUint64(nil, n))
}

// Numbers adds a slice.
func (k *KeyWriter) Numbers(x []float64) {
	k.Number(uint64(len(x)))
	buffer := make([]byte, 0, min(piece, 8*len(x)))
	for part := range slices.Chunk(x, piece/8) {
		buffer = buffer[:0]
		for _, v := range part {
			buffer = binary.LittleEndian.AppendUint64(buffer, math.Float64bits(v))
		}
		k.sum.Write(buffer)
	}
}

// Key is the key.
func (k *KeyWriter) Key() (key Key) {
	k.sum.Sum(key[:0])
	return key
}

// An entry is a file: magic, key, checksum of the numbers, the numbers.
const (
	magic  = "omen cache\x00\x01\n"
	suffix = ".entry"
	header = len(magic) + 2*sha256.Size
)

func (c *Cache) path(key Key) string {
	return filepath.Join(c.dir, hex.EncodeToString(key[:])+suffix)
}

// Get returns the numbers kept under a key, bit by bit as they were put.
func (c *Cache) Get(key Key) ([]float64, bool) {
	if c == nil {
		return nil, false
	}
	f, err := os.Open(c.path(key))
	if err != nil {
		return nil, false
	}
	defer f.Close()
	x, ok := read(f, key)
	if ok {
		now := time.Now()
		_ = os.Chtimes(f.Name(), now, now) // the oldest entries are those not used for long
	}
	return x, ok
}

// piece is how many bytes of an entry are read at a time: few enough to be checked
// and taken apart before they leave the processor's own memory.
const piece = 1 << 17

// read is the numbers of an entry. It ends with the file as it was opened.
func read(f *os.File, key Key) ([]float64, bool) {
	info, err := f.Stat()
	if err != nil || info.Size() < int64(header) || (info.Size()-int64(header))%8 != 0 {
		return nil, false
	}
	head := make([]byte, header)
	if _, err := io.ReadFull(f, head); err != nil {
		return nil, false
	}
	n := int(info.Size()-int64(header)) / 8
	x, sum, buffer := make([]float64, 0, n), sha256.New(), make([]byte, piece)
	for len(x) < n {
		part := buffer[:min(piece, 8*(n-len(x)))]
		if _, err := io.ReadFull(f, part); err != nil {
			return nil, false
		}
		sum.Write(part)
		for ; len(part) > 0; part = part[8:] {
			x = append(x, math.Float64frombits(binary.LittleEndian.Uint64(part)))
		}
	}
	return x, bytes.Equal(head, slices.Concat([]byte(magic), key[:], sum.Sum(nil)))
}

// Put keeps numbers under a key. An error is of no consequence.
func (c *Cache) Put(key Key, x []float64) error {
	if c == nil {
		return nil
	}
	if err := os.MkdirAll(c.dir, 0o700); err != nil {
		return err
	}
	text := make([]byte, header, header+8*len(x))
	for _, v := range x {
		text = binary.LittleEndian.AppendUint64(text, math.Float64bits(v))
	}
	sum := sha256.Sum256(text[header:])
	copy(text, slices.Concat([]byte(magic), key[:], sum[:]))
	if err := replace(c.path(key), text); err != nil {
		return err
	}
	return c.prune(key)
}

// replace writes a file that appears complete or not at all. Two processes that
// write the same entry write the same bytes.
func replace(name string, text []byte) error {
	f, err := os.CreateTemp(filepath.Dir(name), "*.new")
	if err != nil {
		return err
	}
	_, err = f.Write(text)
	if closing := f.Close(); err == nil {
		err = closing
	}
	if err == nil {
		err = os.Rename(f.Name(), name)
	}
	if err != nil {
		os.Remove(f.Name())
	}
	return err
}

// prune removes the entries that were used longest ago, but for the newest, until
// the rest are within the capacity; and what a killed process left behind.
func (c *Cache) prune(newest Key) error {
	files, err := os.ReadDir(c.dir)
	if err != nil {
		return err
	}
	var entries []fs.FileInfo
	total := int64(0)
	for _, f := range files {
		info, err := f.Info()
		if err != nil {
			continue // another process removed it
		}
		switch filepath.Ext(f.Name()) {
		case suffix:
			entries = append(entries, info)
			total += info.Size()
		case ".new":
			if time.Since(info.ModTime()) > time.Hour {
				os.Remove(filepath.Join(c.dir, f.Name()))
			}
		}
	}
	slices.SortFunc(entries, func(a, b fs.FileInfo) int { return a.ModTime().Compare(b.ModTime()) })
	for _, e := range entries {
		name := filepath.Join(c.dir, e.Name())
		if total > c.capacity && name != c.path(newest) && os.Remove(name) == nil {
			total -= e.Size()
		}
	}
	return nil
}
