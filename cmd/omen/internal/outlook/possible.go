package outlook

import (
	"omen/likelihood"
	"omen/model"
)

// Possible tells whether a statement can hold for more than a set of measure zero of
// the universes of a family. What cannot has probability zero by construction, which
// no number of draws could show.
func Possible(f likelihood.Family, holds func(Label) bool) bool {
	for _, fate := range possibleFates(f, f.DarkEnergy) {
		for _, held := range possibleFates(f, min(f.DarkEnergy, likelihood.W)) {
			for _, curvature := range possibleCurvatures(f) {
				for _, accelerating := range []bool{false, true} {
					if holds(Label{fate, held, curvature, accelerating}) {
						return true
					}
				}
			}
		}
	}
	return false
}

func possibleFates(f likelihood.Family, energy likelihood.DarkEnergy) []model.Fate {
	var out []model.Fate
	if !f.RequireBigBang {
		out = append(out, model.NoBigBang)
	}
	om, fixedOm := f.Fixed["Om"]
	ol, fixedOL := f.Fixed["OL"]
	switch {
	case f.Critical:
		return append(out, model.Critical)
	case fixedOm && fixedOL && om == 0 && ol == 0:
		return append(out, model.Coasting)
	case fixedOL && ol == 0:
		return append(out, model.Recollapse, model.Decelerating)
	case energy == likelihood.Constant:
		return append(out, model.Recollapse, model.Accelerating)
	case energy == likelihood.W0Wa: // wa = 0 has no volume
		return append(out, model.Recollapse, model.Decelerating, model.BigRip)
	}
	return append(out, model.Recollapse, model.Accelerating, model.Decelerating, model.BigRip)
}

func possibleCurvatures(f likelihood.Family) []int8 {
	if f.Flat || f.Critical {
		return []int8{0}
	}
	return []int8{-1, 1}
}
