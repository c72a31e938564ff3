package evidence

import "math"

// box maps the inside of a box to unbounded coordinates, t = ln((x−lo)/(hi−x)), so that a proposal can neither
// leave it nor waste itself outside.
type box struct{ lo, hi []float64 }

// toOpen writes t of x and returns ln |dx/dt|, to be added to ln p. A coordinate on an edge counts as just
// inside.
func (b box) toOpen(t, x []float64) (logJacobian float64) {
	for i, v := range x {
		w := b.hi[i] - b.lo[i]
		u := math.Max(v-b.lo[i], 1e-15*w)
		d := math.Max(b.hi[i]-v, 1e-15*w)
		t[i] = math.Log(u / d)
		logJacobian += math.Log(u) + math.Log(d/w)
	}
	return logJacobian
}

// toBox writes x of t and returns the same.
func (b box) toBox(x, t []float64) (logJacobian float64) {
	for i, v := range t {
		w := b.hi[i] - b.lo[i]
		e := math.Exp(-math.Abs(v)) // the smaller of the two distances to an edge is w·e/(1+e)
		if v < 0 {
			x[i] = b.lo[i] + w*e/(1+e)
		} else {
			x[i] = b.hi[i] - w*e/(1+e)
		}
		logJacobian += math.Log(w*e) - 2*math.Log1p(e)
	}
	return logJacobian
}
