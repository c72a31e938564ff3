package model

import "math"

// Fate is what becomes of a universe.
type Fate uint8

// The fates. Unknown is the fate of a universe with a parameter that is not a finite number.
const (
	Unknown      Fate = iota
	Recollapse        // E² has a zero ahead: the expansion stops and reverses
	Accelerating      // expands forever, ä > 0 in the end
	Decelerating      // expands forever, ä ≤ 0 in the end
	Critical          // exactly flat, of matter and radiation alone
	Coasting          // exactly empty
	BigRip            // a becomes infinite in a finite time
	NoBigBang         // E² has a zero, or no growth, behind: there was no big bang
)

var fateNames = [...]string{
	Unknown:      "unknown",
	Recollapse:   "recollapse (big crunch)",
	Accelerating: "expands forever, accelerating",
	Decelerating: "expands forever, decelerating",
	Critical:     "critical",
	Coasting:     "coasting",
	BigRip:       "big rip",
	NoBigBang:    "no big bang in the past",
}

// String is the fate in words, in the same spelling wherever it is shown.
func (f Fate) String() string {
	if int(f) >= len(fateNames) {
		return fateNames[Unknown]
	}
	return fateNames[f]
}

// Fates lists every fate but Unknown, in the order in which they are reported.
func Fates() []Fate {
	return []Fate{Recollapse, Accelerating, Decelerating, Critical, Coasting, BigRip, NoBigBang}
}

// Fate is NoBigBang for a universe without a big bang, and its Future otherwise.
func (u Universe) Fate() Fate {
	future := u.Future()
	if future != Unknown && !u.HasBigBang() {
		return NoBigBang
	}
	return future
}

// Future is what happens from today on, whatever the past was: a Fate other than NoBigBang.
//
// A zero of E² ahead is a Recollapse, also where dark energy would have torn the universe apart later. Without
// one, dark energy that grows is a BigRip: OL > 0 with w0 < -1 (wa = 0), or with wa > 0 whatever w0, because
// the formula then grows as e^(3wa a). With wa < 0 dark energy dies away and matter and curvature decide. Both
// are extrapolations of a formula made for the past; Frozen gives the fate with w as it is today. What is left
// accelerates if OL > 0 and w0 < -1/3 (wa = 0), and decelerates if not, which includes dark energy that
// behaves like matter or curvature: Critical and Coasting ask for OL = 0.
//
// For a cosmological constant this is the boundary of Carroll, Press & Turner 1992 and Felten & Isaacman 1986
// (RMP 58, 689). On the boundary itself the universe approaches a static state for ever: Decelerating.
func (u Universe) Future() Fate {
	if !finite(u) {
		return Unknown
	}
	e := u.expansion()
	grows := e.ol > 0
	switch {
	case e.recollapses():
		return Recollapse
	case e.ol == 0 && e.ok == 0:
		return Critical
	case e.ol == 0 && e.om == 0 && e.or == 0:
		return Coasting
	case e.lambda && grows && e.loiters():
		return Decelerating
	case grows && !e.lambda && (e.b > 0 || e.b == 0 && e.p < 0):
		return BigRip
	case grows && (e.lambda || e.b == 0 && e.p < 2):
		return Accelerating
	}
	return Decelerating
}

// recollapses reports a zero of E² at a > 1.
func (e *expansion) recollapses() bool {
	if e.positive() {
		return false
	}
	if e.lambda && e.or == 0 && e.om > 0 && e.ol > 0 {
		k := -e.ok
		return k > 3*e.ol && 6.75*e.om*e.om*e.ol < k*k*k
	}
	if e.late() < 0 {
		return true
	}
	roots, n := e.stationary(1, math.Inf(1))
	for _, a := range roots[:n] {
		if e.sign(a) < 0 {
			return true
		}
	}
	return false
}

// loiters reports the exact boundary between recollapse and eternal expansion with a cosmological constant.
func (e *expansion) loiters() bool {
	k := -e.ok
	return e.or == 0 && e.om > 0 && k > 3*e.ol && 6.75*e.om*e.om*e.ol == k*k*k
}
