package model

import "math"

// neff is the effective number of neutrino species of the standard model.
const neff = 3.044

// SoundHorizon is the comoving sound horizon at the drag epoch in Mpc from the physical baryon density
// ob = Ωb h², the matter density om = Ωm (massive neutrinos included) and h0 in km/s/Mpc:
//
//	rd = 147.05 (ωb/0.02236)^-0.13 (ωm/0.1432)^-0.23 (Neff/3.04)^-0.1 Mpc,   ωm = Ωm (h0/100)²
//
// with Neff = 3.044 (Brieden, Gil-Marín & Verde 2023, arXiv:2212.04522, as in DESI DR2, arXiv:2503.14738,
// eq. 2). At the Planck 2018 best fit it is 0.02% below the numerical value. NaN unless ob, om and h0 are
// positive.
func SoundHorizon(ob, om, h0 float64) float64 {
	if !(ob > 0 && om > 0 && h0 > 0) {
		return math.NaN()
	}
	h := h0 / 100
	return 147.05 * math.Pow(ob/0.02236, -0.13) * math.Pow(om*h*h/0.1432, -0.23) * math.Pow(neff/3.04, -0.1)
}
