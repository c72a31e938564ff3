package sampler

import "math"

// order returns the indices that put x in ascending order, equal values as they
// came: a radix sort on the bits, several times faster than comparing for the
// 10⁵ to 10⁶ draws of a chain. x must hold no NaN.
func order(x []float64) []uint32 {
	const digit, passes = 11, 6 // 6 × 11 ≥ 64 bits
	type entry struct {
		key   uint64
		index uint32
	}
	from, to := make([]entry, len(x)), make([]entry, len(x))
	var count [passes][1 << digit]uint32
	for i, v := range x {
		key := ascending(v)
		from[i] = entry{key, uint32(i)}
		for p := range count {
			count[p][key>>(p*digit)&(1<<digit-1)]++
		}
	}
	for p := range count {
		offsets(&count[p])
		for _, e := range from {
			at := &count[p][e.key>>(p*digit)&(1<<digit-1)]
			to[*at] = e
			*at++
		}
		from, to = to, from
	}
	index := make([]uint32, len(x))
	for i, e := range from {
		index[i] = e.index
	}
	return index
}

// offsets turns counts of digits into the place of the first of each.
func offsets(count *[1 << 11]uint32) {
	sum := uint32(0)
	for i, n := range count {
		count[i] = sum
		sum += n
	}
}

// ascending maps a number to an integer of the same order: IEEE 754 numbers
// sort as sign and magnitude.
func ascending(x float64) uint64 {
	b := math.Float64bits(x)
	if b>>63 == 1 {
		return ^b
	}
	return b | 1<<63
}
