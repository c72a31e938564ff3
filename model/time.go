package model

import "math"

// Times are integrals of dt = d(ln a)/H. Inside this file they are in units of 1/H0.

// timeRate is dt/ds = 1/E at s = ln a, and its rounding error.
func (e *expansion) timeRate(s float64) (v, noise float64) {
	a := math.Exp(s)
	return e.inverse(1/a, -s, a)
}

// between is the time from s1 = ln a1 to s2 = ln a2, with no zero of E² in between.
func (e *expansion) between(s1, s2 float64) float64 {
	if s1 == s2 {
		return 0
	}
	return whole.integrate(e.timeRate, s1, s2)
}

// sinceBigBang is the time from the big bang to the scale factor a, in a universe that had one. If dark energy is
// or nearly is a cosmological constant the integral runs over the conformal time η that a universe of this matter
// and radiation alone would have, a = √Or η + Om η²/4, in which the integrand is smooth down to η = 0; with
// w0+wa ≤ -2/3 dark energy adds a term a⁻ᵖ with p ≤ 1 to the a⁻³ of matter. For other dark energy the integral
// runs over ln a in steps, and what is left is a pure power law.
func (e *expansion) sinceBigBang(a float64) float64 {
	if e.om >= 0 && e.or >= 0 && e.om+e.or > 0 && (e.lambda || e.p <= 1) {
		return whole.integrate(e.conformalRate, 0, 2*a/(math.Sqrt(e.or+e.om*a)+math.Sqrt(e.or)))
	}
	const step, steps = 2, 20
	s, t := math.Log(a), 0.0
	for range steps {
		dt := e.between(s-step, s)
		s -= step
		t += dt
		if dt < 1e-15*t {
			break
		}
	}
	_, n := e.early()
	rate, _ := e.timeRate(s)
	return t + 2/n*rate
}

// conformalRate is dt/dη = a√((Or + Om a)/(a⁴E²)), and its rounding error.
func (e *expansion) conformalRate(eta float64) (v, noise float64) {
	a := eta * (math.Sqrt(e.or) + e.om*eta/4)
	free := e.or + e.om*a
	curved := e.ok * a * a
	dark := e.ol * a * a * a * a
	if !e.lambda {
		dark = e.ol * math.Exp((4-e.p)*math.Log(a)+e.b*(a-1))
	}
	rest := 1 + (curved+dark)/free
	v = a / math.Sqrt(rest)
	return v, rounding * v * (1 + (math.Abs(curved)+math.Abs(dark))/(free*rest))
}

// untilTurnaround is the time from ln a = s to the zero of E² at st > s.
func (e *expansion) untilTurnaround(s, st float64) float64 {
	return whole.integrate(e.turnaroundRate(st), 0, math.Sqrt(st-s))
}

// turnaroundRate returns -dt/dv and its rounding error for v = √(st - ln a) and a zero of E² at ln a = st, where
// 1/E has an integrable singularity which this variable removes. E² is evaluated as its difference from the
// value 0 at the zero, term by term with expm1, so it keeps its relative accuracy as it vanishes.
func (e *expansion) turnaroundRate(st float64) integrand {
	at := math.Exp(st)
	x := 1 / at
	rad, m, q := e.or*x*x, e.om*x, e.p-2
	de := 0.0
	if e.ol != 0 {
		de = e.ol * math.Exp(e.b*(at-1)-q*st)
	}
	slope := de*(e.b*at-q) - m - 2*rad // dr/d ln a of r = a²E², negative
	return func(v float64) (rate, noise float64) {
		d := -v * v
		if d == 0 {
			return 2 * at / math.Sqrt(-slope), 0
		}
		grow := math.Expm1(d)
		matter, dark := m*math.Expm1(-d), 0.0
		if de != 0 {
			dark = de * math.Expm1(e.b*at*grow-q*d)
		}
		if rad != 0 {
			matter += rad * math.Expm1(-2*d)
		}
		r := matter + dark
		rate = 2 * at * (1 + grow) / math.Sqrt(r/-d)
		return rate, rounding * rate * (1 + math.Abs(dark/r))
	}
}

// Lookback is the time in Gyr between redshift z and today. NaN for z < 0 and for z at or beyond a bounce.
func (u Universe) Lookback(z float64) float64 {
	e := u.expansion()
	y := math.Log1p(z)
	if !(z >= 0 && y < e.reach()) {
		return math.NaN()
	}
	return u.HubbleTime() * e.between(-y, 0)
}

// Age is the time in Gyr from the big bang to redshift z ≥ 0. NaN for z < 0 and for a universe without a big
// bang.
func (u Universe) Age(z float64) float64 {
	if !(z >= 0) || !u.HasBigBang() {
		return math.NaN()
	}
	e := u.expansion()
	return u.HubbleTime() * e.sinceBigBang(1/(1+z))
}

// AgeToday is the time in Gyr since the big bang; NaN for a universe without one.
func (u Universe) AgeToday() float64 { return u.Age(0) }

// TimeAt is the time in Gyr since the big bang at which the expanding universe reaches the scale factor a,
// which may lie in the future. NaN for a ≤ 0, for a universe without a big bang, and for an a beyond the
// turnaround.
func (u Universe) TimeAt(a float64) float64 {
	if !(a > 0) || !u.HasBigBang() {
		return math.NaN()
	}
	e := u.expansion()
	at := e.futureZero()
	switch {
	case a > at:
		return math.NaN()
	case a <= 1:
		return u.HubbleTime() * e.sinceBigBang(a)
	case math.IsInf(at, 1):
		return u.HubbleTime() * (e.sinceBigBang(1) + e.between(0, math.Log(a)))
	}
	st := math.Log(at)
	return u.HubbleTime() * (e.sinceBigBang(1) + e.untilTurnaround(0, st) - e.untilTurnaround(math.Log(a), st))
}

// Turnaround is the scale factor at which the expansion of a universe that recollapses stops, and the time of
// it in Gyr since the big bang. Both are NaN if it does not, or not before a = 1e150; the time alone is, if there
// was no big bang.
func (u Universe) Turnaround() (a, t float64) {
	if u.Future() != Recollapse {
		return math.NaN(), math.NaN()
	}
	e := u.expansion()
	a = e.futureZero()
	if math.IsInf(a, 1) {
		return math.NaN(), math.NaN()
	}
	if !u.HasBigBang() {
		return a, math.NaN()
	}
	return a, u.HubbleTime() * (e.sinceBigBang(1) + e.untilTurnaround(0, math.Log(a)))
}

// Crunch is the time in Gyr from the big bang to the big crunch. E² depends on a alone, so the contraction is
// the expansion backwards, and this is twice the time of turnaround. NaN for a universe that does not
// recollapse or had no big bang.
func (u Universe) Crunch() float64 {
	_, t := u.Turnaround()
	return 2 * t
}

// Rip is the time in Gyr from today to the big rip; NaN if there is none. For a flat universe of constant
// w < -1 it is (2/3)|1+w|⁻¹ OL^(-1/2)/H0 times a hypergeometric function, of which Caldwell, Kamionkowski &
// Weinberg 2003 (PRL 91, 071301) keep the leading 1.
func (u Universe) Rip() float64 {
	if u.Future() != BigRip {
		return math.NaN()
	}
	e := u.expansion()
	s, t := 0.0, 0.0
	if e.b == 0 {
		// Constant w: beyond a = e⁴⁰ all else is below rounding, and the integral is that of a power law.
		for ; s < 40; s++ {
			t += e.between(s, s+1)
		}
		rate, _ := e.timeRate(s)
		return u.HubbleTime() * (t - 2/e.p*rate)
	}
	for ; s < 600; s++ {
		dt := e.between(s, s+1)
		t += dt
		if dt < 1e-15*t {
			return u.HubbleTime() * t
		}
	}
	return math.NaN() // wa > 0 so small that it does nothing before a overflows
}
