package likelihood

// Memory keeps what is slow to compute from one run to the next. It may forget at
// any time. What it recalls is what was kept under the same key, bit by bit.
type Memory interface {
	// Recall returns the numbers kept under a key; ok is false if there are none.
	Recall(key []float64) (x []float64, ok bool)
	// Keep keeps x, which the caller does not change any more.
	Keep(key, x []float64)
}

// Remember makes s look up its condensed form before it computes it. The key of an
// entry has all that the form depends on but the noise: a memory is for one noise,
// and must tell that of another table, cut or covariance from it. It is to be called
// before the term becomes part of a posterior.
func (s *Supernovae) Remember(m Memory) { s.memory = m }
