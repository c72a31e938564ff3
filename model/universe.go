package model

import "math"

// C is the speed of light in km/s, exact by definition of the metre.
const C = 299792.458

// HubbleTime1 is 1/H0 in Gyr for H0 = 1 km/s/Mpc: Mpc/km over 10⁹ Julian years of 365.25 days.
const HubbleTime1 = 977.792221680789

// Universe is a homogeneous universe by its density parameters today. A cosmological constant is W0 = -1, Wa = 0;
// H0 is only needed for distances in Mpc and times in Gyr.
type Universe struct {
	Om float64 // matter
	OL float64 // dark energy
	Or float64 // radiation
	H0 float64 // Hubble constant in km/s/Mpc
	W0 float64 // dark-energy equation of state today
	Wa float64 // its change: w(a) = W0 + Wa(1-a)
}

// RadiationFromTemperature is the Or of a universe with photons of 2.7255 K and 3.044 massless neutrino
// species, 4.1826e-5/h² with h = h0/100: ωγ = 2.47298e-5 times 1 + 0.22710732 Neff (common practice).
func RadiationFromTemperature(h0 float64) float64 {
	h := h0 / 100
	return 4.1826e-5 / (h * h)
}

// Ok is the curvature density parameter 1-Om-OL-Or: positive in an open universe, negative in a closed one. A
// remainder within the rounding error of the subtraction is exactly zero, so that a universe made flat by
// OL = 1-Om-Or is flat; the fate of dying dark energy would otherwise hang on the last bit.
func (u Universe) Ok() float64 {
	ok := 1 - u.Om - u.OL - u.Or
	if math.Abs(ok) <= 0x1p-51*(1+math.Abs(u.Om)+math.Abs(u.OL)+math.Abs(u.Or)) {
		return 0
	}
	return ok
}

// Frozen is the same universe with its equation of state held at today's value (Wa = 0), for fates that do
// not extrapolate the formula w0-wa into the future.
func (u Universe) Frozen() Universe {
	u.Wa = 0
	return u
}

// W is the equation of state of dark energy at scale factor a, w0 + wa(1-a).
func (u Universe) W(a float64) float64 { return u.W0 + u.Wa*(1-a) }

// E2 is E²(a) = H²(a)/H0². It may be zero or negative, where the universe cannot be; NaN unless a > 0.
func (u Universe) E2(a float64) float64 {
	if !(a > 0) {
		return math.NaN()
	}
	e := u.expansion()
	if e.lambda {
		return e.squared(1/a, 0, a)
	}
	return e.squared(1/a, -math.Log(a), a)
}

// E is H(z)/H0; NaN where E² ≤ 0 and for z ≤ -1. It looks at the one redshift only: a value does not say that
// the universe can be followed from here to there, which the distances do.
func (u Universe) E(z float64) float64 {
	e2 := u.E2(1 / (1 + z))
	if !(e2 > 0) {
		return math.NaN()
	}
	return math.Sqrt(e2)
}

// Q is the deceleration parameter -ä a/ȧ² at scale factor a; NaN where E² ≤ 0.
func (u Universe) Q(a float64) float64 {
	if !(a > 0) {
		return math.NaN()
	}
	e := u.expansion()
	r, dr := e.reduced(math.Log(a))
	if !(r > 0) {
		return math.NaN()
	}
	return -dr / (2 * r)
}

// Q0 is the deceleration parameter today, Or + Om/2 + (1+3w0)OL/2.
func (u Universe) Q0() float64 { return u.Or + u.Om/2 + (1+3*u.W0)*u.OL/2 }

// HubbleTime is 1/H0 in Gyr.
func (u Universe) HubbleTime() float64 { return HubbleTime1 / u.H0 }

// expansion is a Universe prepared for many evaluations of E².
type expansion struct {
	or, om, ok, ol float64
	p, b           float64 // dark energy goes as a^-p e^(b(a-1)): p = 3(1+w0+wa), b = 3wa
	lambda         bool    // p = b = 0, or no dark energy at all
}

func (u Universe) expansion() expansion {
	return expansion{
		or: u.Or, om: u.Om, ok: u.Ok(), ol: u.OL,
		p: 3 * (1 + u.W0 + u.Wa), b: 3 * u.Wa,
		lambda: u.OL == 0 || u.W0 == -1 && u.Wa == 0,
	}
}

// squared is E² from x = 1/a, y = ln x and a, which the caller has at hand. With a cosmological constant only
// x is used; otherwise the power law and the exponential cost one exp between them.
func (e *expansion) squared(x, y, a float64) float64 {
	rest := ((e.or*x+e.om)*x + e.ok) * x * x
	if e.lambda {
		return rest + e.ol
	}
	return rest + e.ol*math.Exp(e.p*y+e.b*(a-1))
}

// inverse is 1/E and a bound on its rounding error, which grows as E² vanishes by cancellation; from x = 1/a and
// what dark energy contributes to E².
func (e *expansion) inverse(x, dark float64) (v, noise float64) {
	v = 1 / math.Sqrt(((e.or*x+e.om)*x+e.ok)*x*x+dark)
	terms := ((math.Abs(e.or)*x+math.Abs(e.om))*x + math.Abs(e.ok)) * x * x
	return v, rounding * v * (1 + terms*v*v)
}

// dark is what dark energy contributes to E² at each of the first n scale factors a; s = ln a is not used with a
// cosmological constant.
func (e *expansion) dark(s, a *points, n int) (d points) {
	if e.lambda {
		for k := range d[:n] {
			d[k] = e.ol
		}
		return d
	}
	for k, t := range a[:n] {
		d[k] = e.b*(t-1) - e.p*s[k]
	}
	exponentials(d[:n])
	for k := range d[:n] {
		d[k] *= e.ol
	}
	return d
}

// reduced is r = a²E² = (ȧ/H0)² at s = ln a, and dr/ds, whose sign is that of the acceleration.
func (e *expansion) reduced(s float64) (r, dr float64) {
	a := math.Exp(s)
	x := 1 / a
	m, rad := e.om*x, e.or*x*x
	q := e.p - 2
	de := 0.0
	if e.ol != 0 {
		de = e.ol * math.Exp(e.b*(a-1)-q*s)
	}
	return rad + m + e.ok + de, de*(e.b*a-q) - m - 2*rad
}
