package cache

import (
	"math"
	"os"
	"path/filepath"
	"testing"
	"time"
)

func key(words ...string) Key {
	k := NewKey("test")
	for _, w := range words {
		k.Text(w)
	}
	return k.Key()
}

func put(t *testing.T, c *Cache, k Key, x []float64) {
	t.Helper()
	if err := c.Put(k, x); err != nil {
		t.Fatal(err)
	}
}

// What comes out is what went in, to the last bit.
func TestKeepsEveryBit(t *testing.T) {
	c := Open(filepath.Join(t.TempDir(), "new", "omen"))
	if _, ok := c.Get(key("a")); ok {
		t.Error("an empty cache has an entry")
	}
	want := []float64{0, math.Copysign(0, -1), 1. / 3, 5e-324, math.Inf(1), math.NaN(), -math.MaxFloat64}
	put(t, c, key("a"), want)
	got, ok := c.Get(key("a"))
	if !ok || len(got) != len(want) {
		t.Fatalf("got %v", got)
	}
	for i := range want {
		if math.Float64bits(got[i]) != math.Float64bits(want[i]) {
			t.Errorf("number %d is %v, want %v", i, got[i], want[i])
		}
	}
	if _, ok := c.Get(key("b")); ok {
		t.Error("another key has an entry")
	}
}

// Keys tell their parts apart, wherever one ends and the next begins.
func TestKeys(t *testing.T) {
	numbers := func(x ...float64) Key {
		k := NewKey("test")
		k.Numbers(x)
		return k.Key()
	}
	keys := []Key{key("ab", "c"), key("a", "bc"), key("abc"), key("abc", ""), NewKey("other").Key(), NewKey("test").Key(),
		numbers(1, 2), numbers(2, 1), numbers(1), numbers(0), numbers(math.Copysign(0, -1))}
	for i := range keys {
		for j := range i {
			if keys[i] == keys[j] {
				t.Errorf("keys %d and %d are the same", j, i)
			}
		}
	}
}

// Whatever a byte of an entry becomes, and wherever it ends, it is no entry.
func TestDamage(t *testing.T) {
	c := Open(t.TempDir())
	k := key("a")
	put(t, c, k, []float64{1, 2, 3})
	whole, err := os.ReadFile(c.path(k))
	if err != nil {
		t.Fatal(err)
	}
	for i := range whole {
		damaged := append([]byte(nil), whole...)
		damaged[i] ^= 4
		for _, text := range [][]byte{damaged, whole[:i]} {
			if err := os.WriteFile(c.path(k), text, 0o600); err != nil {
				t.Fatal(err)
			}
			if x, ok := c.Get(k); ok {
				t.Fatalf("byte %d damaged or missing: got %v", i, x)
			}
		}
	}
	// Nor is an entry under another's name.
	if err := os.WriteFile(c.path(key("b")), whole, 0o600); err != nil {
		t.Fatal(err)
	}
	if _, ok := c.Get(key("b")); ok {
		t.Error("an entry answers to another key")
	}
	put(t, c, k, []float64{4})
	if x, ok := c.Get(k); !ok || x[0] != 4 {
		t.Errorf("a damaged entry is not replaced: %v", x)
	}
}

// The entries that were used longest ago go first, and what was left half-written.
func TestPrune(t *testing.T) {
	c := Open(t.TempDir())
	c.capacity = 3 * (int64(header) + 800)
	old := time.Now().Add(-2 * time.Hour)
	if err := os.WriteFile(filepath.Join(c.dir, "1.new"), nil, 0o600); err != nil {
		t.Fatal(err)
	}
	os.Chtimes(filepath.Join(c.dir, "1.new"), old, old)
	names := []string{"a", "b", "c", "d", "e"}
	for i, n := range names[:3] {
		put(t, c, key(n), make([]float64, 100))
		at := old.Add(time.Duration(i) * time.Minute)
		os.Chtimes(c.path(key(n)), at, at)
	}
	c.Get(key("a")) // used again
	put(t, c, key("d"), make([]float64, 100))
	put(t, c, key("e"), make([]float64, 100))
	for i, want := range []bool{true, false, false, true, true} {
		if _, ok := c.Get(key(names[i])); ok != want {
			t.Errorf("entry %s is there: %v, want %v", names[i], ok, want)
		}
	}
	if _, err := os.Stat(filepath.Join(c.dir, "1.new")); err == nil {
		t.Error("a file left half-written is still there")
	}
}

// Without a cache, or a place for one, nothing fails.
func TestNoCache(t *testing.T) {
	var none *Cache
	put(t, none, key("a"), []float64{1})
	if _, ok := none.Get(key("a")); ok {
		t.Error("no cache has an entry")
	}
	file := filepath.Join(t.TempDir(), "file")
	if err := os.WriteFile(file, nil, 0o600); err != nil {
		t.Fatal(err)
	}
	c := Open(filepath.Join(file, "omen"))
	if c.Put(key("a"), []float64{1}) == nil {
		t.Error("no error of a folder that cannot be")
	}
	if _, ok := c.Get(key("a")); ok {
		t.Error("an entry out of nothing")
	}
}
