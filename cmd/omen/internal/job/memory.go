package job

import (
	"runtime"

	"omen/cmd/omen/internal/cache"
	"omen/likelihood"
)

// memory is the part of a cache that belongs to one noise.
type memory struct {
	cache *cache.Cache
	noise cache.Key
}

var _ likelihood.Memory = memory{}

// key names a condensed form. Processors differ in the last bit.
func (m memory) key(numbers []float64) cache.Key {
	k := cache.NewKey("condensed " + runtime.GOARCH)
	k.Text(string(m.noise[:]))
	k.Numbers(numbers)
	return k.Key()
}

// Recall looks a condensed form up.
func (m memory) Recall(key []float64) ([]float64, bool) { return m.cache.Get(m.key(key)) }

// Keep puts one away. A cache that cannot be written is no reason to stop.
func (m memory) Keep(key, x []float64) { _ = m.cache.Put(m.key(key), x) }
