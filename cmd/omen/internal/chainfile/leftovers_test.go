package chainfile

import (
	"path/filepath"
	"slices"
	"testing"
)

func TestLeftovers(t *testing.T) {
	if names, ok, err := Leftovers(filepath.Join(t.TempDir(), "none")); names != nil || !ok || err != nil {
		t.Error(names, ok, err)
	}
	dir := t.TempDir()
	for _, c := range []struct {
		name string
		size int
		ok   bool
	}{
		{LockName, 60, true}, {"run.toml", 1 << 20, true}, {"run.toml.new", 3, true}, {StateName + ".new", 900, true},
		{ChainName, 40, true}, {SumsName, recordLen, true},
		{SumsName, recordLen + 1, false}, {SumsName, 0, true}, {ChainName, headerSize, false}, {ChainName, 0, true},
		{StateName, 1, false},
	} {
		put(t, dir, c.name, make([]byte, c.size))
		names, ok, err := Leftovers(dir, "run.toml")
		if ok != c.ok || err != nil || slices.Contains(names, filepath.Join(dir, LockName)) {
			t.Errorf("with %s of %d bytes: %v, %v, %v", c.name, c.size, names, ok, err)
		}
	}
}
