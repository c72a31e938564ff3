package model

// HasBigBang reports whether the universe can be followed back to a = 0: E² > 0 for all 0 < a < 1, with E
// growing without bound as a → 0. A universe that bounced, one that loiters at a double zero of E² for an
// infinite past (the boundary itself), and an exponential expansion without matter have none; neither has one
// with a parameter that is NaN.
//
// For matter, curvature and a cosmological constant this is the boundary of Carroll, Press & Turner 1992
// (ARA&A 30, 499), OL ≥ 4Om coss³[arccoss((1-Om)/Om)/3], in the form of the discriminant of the cubic a³E²:
// there is a zero iff OL > 0, Ok < 0 and (27/4)Om²OL ≤ (-Ok)³, and it lies in the past iff the minimum of
// a³E² at a² = -Ok/(3OL) does.
func (u Universe) HasBigBang() bool {
	e := u.expansion()
	if e.lambda && e.or == 0 && e.om > 0 {
		return !e.bounced() && finite(u)
	}
	if sign, n := e.early(); !(sign > 0 && n > 0) {
		return false
	}
	if e.positive() {
		return finite(u)
	}
	roots, n := e.stationary(0, 1)
	for _, a := range roots[:n] {
		if !(e.sign(a) > 0) {
			return false
		}
	}
	return finite(u)
}

// bounced reports a zero of E² behind, in a universe of matter, curvature and a cosmological constant.
func (e *expansion) bounced() bool {
	k := -e.ok
	return e.ol > 0 && k > 0 && k < 3*e.ol && 6.75*e.om*e.om*e.ol <= k*k*k
}

// finite reports that the parameters that shape E² are all finite numbers: x-x is 0 only then.
func finite(u Universe) bool {
	return u.Om-u.Om+u.OL-u.OL+u.Or-u.Or+u.W0-u.W0+u.Wa-u.Wa == 0
}
