package model

import (
	"math"
	"math/rand/v2"
)

// randomUniverse draws from the prior range: a third each with a cosmological constant, constant w and w0-wa,
// half of them with radiation, some with much of it, some exactly flat. H0 is such that times come out in 1/H0.
func randomUniverse(rng *rand.Rand) Universe {
	u := Universe{Om: 1.6 * rng.Float64(), OL: -0.5 + 2.3*rng.Float64(), H0: HubbleTime1, W0: -1}
	if rng.IntN(2) == 0 {
		u.Or = math.Pow(10, -5+2*rng.Float64())
	}
	if rng.IntN(6) == 0 {
		u.Or = rng.Float64()
	}
	kind := rng.IntN(3)
	if kind > 0 {
		u.W0 = -3 + 4*rng.Float64()
	}
	if kind > 1 {
		u.Wa = -3 + 5*rng.Float64()
	}
	if rng.IntN(10) == 0 {
		u.OL = 1 - u.Om - u.Or
	}
	return u
}
