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
	if _, dr := e.reduced(0); !(dr > 0) {
		return math.NaN()
	}
	if e.b == 0 && e.p < 2 && e.ol > 0 && e.om >= 0 && e.or >= 0 {
		return e.onlyOnset()
	}
	return e.lastOnset()
}

// onlyOnset is the onset for constant w < -1/3, with no density negative but that of curvature. ä then has the
// sign of
//
//	f(a) = k aⁿ - Om a - 2Or,   k = -q OL, n = 2-q
//
// which is convex and has one positive root. a²E² is least there: if it is negative the universe bounced later.
// Newton's method approaches the root from above, beginning with the smaller of its step from the root
// A = (Om/k)^(1/(n-1)) without radiation and of A + (2Or/k)^(1/n), neither of which is below it.
func (e *expansion) onlyOnset() float64 {
	k, n := (2-e.p)*e.ol, 4-e.p
	a := root(e.om/k, n-1)
	if e.or > 0 {
		bound := a + root(2*e.or/k, n)
		a = min(bound, 1, a+2*e.or/((n-1)*e.om))
		for range 200 {
			p := k * power(a, n-1)
			next := a - (a*(p-e.om)-2*e.or)/(n*p-e.om)
			if !(next < a) {
				break
			}
			a = next
		}
	}
	if a <= earliest || !(e.ok >= 0 || e.sign(a) > 0) {
		return math.Inf(1)
	}
	return 1/a - 1
}

// power is xⁿ, and root its inverse: with a cosmological constant n is 3 or 4.
func power(x, n float64) float64 {
	if n == 3 {
		return x * x * x
	}
	return math.Pow(x, n)
}

func root(x, n float64) float64 {
	switch n {
	case 3:
		return math.Cbrt(x)
	case 4:
		return math.Sqrt(math.Sqrt(x))
	}
	return math.Pow(x, 1/n)
}

// earliest is the scale factor beyond which the onset of acceleration is not followed.
const earliest = 1e-30

// lastOnset is the onset in any universe that accelerates today.
func (e *expansion) lastOnset() float64 {
	start, hi := e.pastZero(), 1.0
	cuts, n := e.accelerationCuts(start)
	for i := n - 1; i >= 0; i-- {
		if _, dr := e.reduced(math.Log(cuts[i])); dr <= 0 {
			return e.onsetBetween(cuts[i], hi)
		}
		hi = cuts[i]
	}
	lo := max(start, earliest)
	if _, dr := e.reduced(math.Log(lo)); dr > 0 {
		return math.Inf(1)
	}
	return e.onsetBetween(lo, hi)
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

// onsetBetween is the redshift at which ä changes sign, from not positive at the scale factor lo to positive at
// hi: by Newton's method for ln(OL L D/G), which is nearly linear in s = ln a, kept inside a shrinking bracket.
func (e *expansion) onsetBetween(lo, hi float64) float64 {
	l, h := math.Log(lo), math.Log(hi)
	q := e.p - 2
	s := h
	for range 200 {
		a := math.Exp(s)
		m, rad := e.om/a, e.or/(a*a)
		steep, brake := e.b*a-q, m+2*rad // L and G
		ratio := e.ol * steep * math.Exp(e.b*(a-1)-q*s) / brake
		if ratio > 1 {
			h = s
		} else {
			l = s
		}
		next := s - math.Log(ratio)/(e.b*a/steep+steep+(m+4*rad)/brake)
		if math.Abs(next-s) <= 2e-16*max(1, math.Abs(s)) {
			break
		}
		if !(next > l && next < h) {
			next = l + (h-l)/2
		}
		if next == l || next == h {
			break
		}
		s = next
	}
	return math.Expm1(-s)
}
