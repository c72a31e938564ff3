package sampler

import (
	"math/bits"
	"math/rand/v2"
)

// stream is a sequence of random numbers that can be placed at the start of
// any step of any ensemble without running through the steps before it.
type stream struct {
	pcg rand.PCG
}

// seek places the stream at the start of one step. It does not allocate.
func (s *stream) seek(seed uint64, ensemble, step int) {
	h := mix(seed)
	h = mix(h + uint64(ensemble))
	h = mix(h + uint64(step))
	s.pcg.Seed(h, mix(h))
}

// uniform returns a number in [0, 1).
func (s *stream) uniform() float64 {
	return float64(s.pcg.Uint64()>>11) * 0x1p-53
}

// index returns an integer in [0, n). The multiply-and-shift is biased by
// n/2⁶⁴, which no chain can notice, and takes one number whatever n.
func (s *stream) index(n int) int {
	hi, _ := bits.Mul64(s.pcg.Uint64(), uint64(n))
	return int(hi)
}

// pair returns two different integers in [0, n), n ≥ 2, every ordered pair with
// the same probability.
func (s *stream) pair(n int) (int, int) {
	i, j := s.index(n), s.index(n-1)
	if j >= i {
		j++
	}
	return i, j
}

// mix is the step and finaliser of splitmix64 (Steele, Lea & Flood 2014,
// OOPSLA, doi:10.1145/2714064.2660195; constants from memory): a bijection of
// the 64-bit integers in which every input bit flips every output bit with
// probability near one half, so that neighbouring steps get unrelated seeds.
func mix(x uint64) uint64 {
	x += 0x9e3779b97f4a7c15
	x = (x ^ x>>30) * 0xbf58476d1ce4e5b9
	x = (x ^ x>>27) * 0x94d049bb133111eb
	return x ^ x>>31
}
