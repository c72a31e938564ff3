package model

import "math"

// Times are integrals of dt = d(ln a)/H. Inside this file they are in units of 1/H0.

// timeRate is dt/ds = 1/E at s = ln a, and its rounding error.
func (e *expansion) timeRate(s points, n int) (v points, noise float64) {
	a := s
	exponentials(a[:n])
	dark := e.dark(&s, &a, n)
	for k, t := range a[:n] {
		var err float64
		v[k], err = e.inverse(1/t, dark[k])
		if err > noise {
			noise = err
		}
	}
	return v, noise
}

// timeRateAt is timeRate at one point.
func (e *expansion) timeRateAt(s float64) float64 {
	a := math.Exp(s)
	return 1 / math.Sqrt(e.squared(1/a, -s, a))
}

// between is the time from s1 = ln a1 to s2 = ln a2, with no zero of E² in between.
func (e *expansion) between(s1, s2 float64) float64 {
	if s1 == s2 {
		return 0
	}
	return whole.integrate(e.timeRate, s1, s2, integralTail)
}

// sinceBigBang is the time from the big bang to the scale factor a, in a universe that had one. If dark energy is
// or nearly is a cosmological constant the integral runs over the conformal time η that a universe of this matter
// and radiation alone would have, a = √Or η + Om η²/4, in which the integrand is smooth down to η = 0; with
// w0+wa ≤ -2/3 dark energy adds a term a⁻ᵖ with p ≤ 1 to the a⁻³ of matter. For other dark energy the integral
// runs over ln a in steps, and what is left is a pure power law.
func (e *expansion) sinceBigBang(a float64) float64 {
	if e.om >= 0 && e.or >= 0 && e.om+e.or > 0 && (e.lambda || e.p <= 1) {
		return whole.integrate(e.conformalRate, 0, 2*a/(math.Sqrt(e.or+e.om*a)+math.Sqrt(e.or)), looseTail)
	}
	const end = 50
	s, t := math.Log(a), 0.0
	for step := 1.5; step < end; step *= 2 {
		dt := whole.integrate(e.timeRate, s-step, s, looseTail)
		s -= step
		t += dt
		if dt < 1e-15*t {
			break
		}
	}
	_, n := e.early()
	return t + 2/n*e.timeRateAt(s)
}

// conformalRate is dt/dη = a√((Or + Om a)/(a⁴E²)), and its rounding error.
func (e *expansion) conformalRate(eta points, n int) (v points, noise float64) {
	root, quarter := math.Sqrt(e.or), e.om/4
	a := eta
	for k, t := range eta[:n] {
		a[k] = t * (root + quarter*t)
	}
	s := a
	if !e.lambda {
		logarithms(s[:n])
	}
	dark := e.dark(&s, &a, n)
	for k, t := range a[:n] {
		square := t * t
		free, curved, dark := e.or+e.om*t, e.ok*square, dark[k]*square*square // of a⁴E²
		inverse := 1 / (free + curved + dark)
		v[k] = t * math.Sqrt(free*inverse)
		if err := v[k] * (1 + (math.Abs(curved)+math.Abs(dark))*math.Abs(inverse)); err > noise {
			noise = err
		}
	}
	return v, rounding * noise
}

// untilTurnaround is the time from ln a = s to the zero of E² at st > s.
func (e *expansion) untilTurnaround(s, st float64) float64 {
	c := e.crest(st)
	return whole.integrate(c.rate, 0, math.Sqrt(st-s), integralTail)
}

// crest is the neighbourhood of a turnaround, a zero of E² at ln a = st, in the variable v = √(st - ln a).
type crest struct {
	at, b, q     float64 // scale factor, and b and q as in zeros.go
	rad, m, dark float64 // what radiation, matter and dark energy contribute to r = a²E²
	slope        float64 // dr/d ln a, negative
}

func (e *expansion) crest(st float64) crest {
	at := math.Exp(st)
	x := 1 / at
	c := crest{at: at, b: e.b, q: e.p - 2, rad: e.or * x * x, m: e.om * x}
	if e.ol != 0 {
		c.dark = e.ol * math.Exp(c.b*(at-1)-c.q*st)
	}
	c.slope = c.dark*(c.b*at-c.q) - c.m - 2*c.rad
	return c
}

// rate is -dt/dv and its rounding error: 1/E has an integrable singularity at the zero, which this variable
// removes. E² is evaluated as its difference from the value 0 at the zero, term by term with expm1, so it keeps
// its relative accuracy as it vanishes.
func (c *crest) rate(v points, n int) (f points, noise float64) {
	for k, x := range v[:n] {
		d := -x * x
		if d == 0 {
			f[k] = 2 * c.at / math.Sqrt(-c.slope)
			continue
		}
		back := math.Expm1(-d)
		scale := 1 / (1 + back)
		grow := -back * scale // expm1(d)
		matter, dark := c.m*back, 0.0
		if c.dark != 0 {
			dark = c.dark * math.Expm1(c.b*c.at*grow-c.q*d)
		}
		if c.rad != 0 {
			matter += c.rad * back * (2 + back) // expm1(-2d)
		}
		r := matter + dark
		f[k] = 2 * c.at * scale / math.Sqrt(r/-d)
		if err := f[k] * (1 + math.Abs(dark/r)); err > noise {
			noise = err
		}
	}
	return f, rounding * noise
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
	case a*a < at: // the turnaround is far, and the time to it may be immense
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
		for step := 1.0; s < 40; step *= 2 {
			t += whole.integrate(e.timeRate, s, s+step, looseTail)
			s += step
		}
		return u.HubbleTime() * (t - 2/e.p*e.timeRateAt(s))
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
