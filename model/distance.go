package model

import "math"

// reach is how far back the universe can be followed: the largest ln(1+z), +Inf without a bounce.
func (e *expansion) reach() float64 {
	if a := e.pastZero(); a > 0 {
		return -math.Log(a)
	}
	return math.Inf(1)
}

// comoving is the line-of-sight comoving distance to ln(1+z) = y in units of c/H0: the integral of
// (1+z)/E over ln(1+z).
func (e *expansion) comoving(y float64) float64 {
	if y == 0 {
		return 0
	}
	return whole.integrate(e.comovingRate, 0, y, integralTail)
}

// comovingRate is (1+z)/E at y = ln(1+z), and its rounding error.
func (e *expansion) comovingRate(y points, n int) (v points, noise float64) {
	var s, a points
	for k, t := range y[:n] {
		s[k], a[k] = -t, -t
	}
	exponentials(a[:n])
	dark := e.dark(&s, &a, n)
	for k, t := range a[:n] {
		x := 1 / t
		f, err := e.inverse(x, dark[k])
		v[k] = x * f
		if x*err > noise {
			noise = x * err
		}
	}
	return v, noise
}

// transverse turns a line-of-sight distance into a transverse one, both in units of c/H0:
// sinh(√Ok χ)/√Ok, χ or sin(√-Ok χ)/√-Ok. NaN past the antipode of a closed universe, √-Ok χ > π.
func transverse(ok, chi float64) float64 { return chi * sinc(ok*chi*chi) }

// sinc is sinh(√u)/√u for u > 0 and sin(√-u)/√-u for u < 0, which are one entire function,
// Σ uⁿ/(2n+1)!: the series is summed for |u| ≤ 1, where nine terms are exact to rounding, so nothing happens
// at u = 0. NaN for u < -π².
func sinc(u float64) float64 {
	switch {
	case math.Abs(u) <= 1:
		return 1 + u/6*(1+u/20*(1+u/42*(1+u/72*(1+u/110*(1+u/156*(1+u/210*(1+u/272)))))))
	case u > 0:
		r := math.Sqrt(u)
		return math.Sinh(r) / r
	case u >= -math.Pi*math.Pi:
		r := math.Sqrt(-u)
		return math.Sin(r) / r
	}
	return math.NaN()
}

// hubbleDistance is c/H0 in Mpc.
func (u Universe) hubbleDistance() float64 { return C / u.H0 }

// DC is the line-of-sight comoving distance in Mpc. NaN for z < 0 and for z at or beyond a bounce.
func (u Universe) DC(z float64) float64 {
	e := u.expansion()
	y := math.Log1p(z)
	if !(z >= 0 && y < e.reach()) {
		return math.NaN()
	}
	return u.hubbleDistance() * e.comoving(y)
}

// DM is the transverse comoving distance in Mpc: DC seen through the curvature. NaN where DC is, and past the
// antipode of a closed universe.
func (u Universe) DM(z float64) float64 {
	d := u.hubbleDistance()
	return d * transverse(u.Ok(), u.DC(z)/d)
}

// DA is the angular diameter distance DM/(1+z) in Mpc; NaN where DM is.
func (u Universe) DA(z float64) float64 { return u.DM(z) / (1 + z) }

// DL is the luminosity distance (1+z)DM in Mpc; NaN where DM is.
func (u Universe) DL(z float64) float64 { return u.DM(z) * (1 + z) }

// DH is the Hubble distance c/H(z) in Mpc. NaN for z < 0 and for z at or beyond a bounce.
func (u Universe) DH(z float64) float64 {
	e := u.expansion()
	if !(z >= 0 && math.Log1p(z) < e.reach()) {
		return math.NaN()
	}
	return u.hubbleDistance() / u.E(z)
}

// DV is the dilation scale (z DM² DH)^(1/3) in Mpc that an isotropic BAO analysis measures (common practice,
// Eisenstein et al. 2005, ApJ 633, 560). NaN where DM or DH is.
func (u Universe) DV(z float64) float64 {
	dm := u.DM(z)
	return math.Cbrt(z * dm * dm * u.DH(z))
}

// DistanceModulus is 5 log10[(1+zHel) DM(z)/Mpc] + 25: z is the cosmological redshift, which fixes the
// distance, zHel the observed heliocentric one, which fixes how much the light is dimmed. NaN where DM is.
func (u Universe) DistanceModulus(z, zHel float64) float64 {
	return 5*math.Log10((1+zHel)*u.DM(z)) + 25
}
