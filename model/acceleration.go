package model

import "math"

// AccelerationOnset is the redshift at which the spell of accelerated expansion that lasts to today began.
// NaN if the expansion does not accelerate today, +Inf if it always did as far back as it can be followed.
//
// ä has the sign of OL L D/G - 1, with L = -(1+3w(a)) = b a - q, G = 2Or a⁻² + Om a⁻¹ and q, b, D as in
// zeros.go. The derivative of that ratio vanishes at the roots of the cubic
// (L² + b a)(2Or + Om a) + L(4Or + Om a), between which it is monotonic. They matter to universes that bounced,
// decelerated and accelerate again, which takes much radiation and a negative OL.
func (u Universe) AccelerationOnset() float64 {
	e := u.expansion()
	accelerates := func(a float64) float64 {
		_, dr := e.reduced(math.Log(a))
		return dr
	}
	if !(accelerates(1) > 0) {
		return math.NaN()
	}
	start := e.pastZero()
	hi := 1.0
	cuts, n := e.accelerationCuts(start)
	for i := n - 1; i >= 0; i-- {
		if accelerates(cuts[i]) <= 0 {
			return 1/signChange(accelerates, cuts[i], hi) - 1
		}
		hi = cuts[i]
	}
	lo := max(start, 1e-30)
	if accelerates(lo) > 0 {
		return math.Inf(1)
	}
	return 1/signChange(accelerates, lo, hi) - 1
}

// accelerationCuts are the scale factors in (start, 1), ascending, between which the sign of ä changes at most
// once.
func (e *expansion) accelerationCuts(start float64) ([3]float64, int) {
	q, b, g, m := e.p-2, e.b, 2*e.or, e.om
	// L² + ba = q² + (b-2qb)a + b²a², times g + m a, plus (ba-q)(2g + m a).
	return cubicRoots([4]float64{
		q*q*g - 2*q*g,
		q*q*m + (b-2*q*b)*g + 2*b*g - q*m,
		(b-2*q*b)*m + b*b*g + b*m,
		b * b * m,
	}, start, 1)
}

// signChange finds by bisection in ln a where f, not positive at lo and positive at hi, changes sign.
func signChange(f func(float64) float64, lo, hi float64) float64 {
	for hi-lo > 4e-16*hi {
		mid := middle(lo, hi)
		if mid <= lo || mid >= hi {
			break
		}
		if f(mid) > 0 {
			hi = mid
		} else {
			lo = mid
		}
	}
	return hi
}
