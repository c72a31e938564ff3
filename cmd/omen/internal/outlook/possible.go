package outlook

import (
	"math"
	"slices"

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
	out := futures(f, energy)
	if neverTurns(f) {
		out = slices.DeleteFunc(out, func(x model.Fate) bool { return x == model.Recollapse })
	}
	if !f.RequireBigBang {
		out = append(out, model.NoBigBang)
	}
	return out
}

// futures lists the fates that lie ahead of the universes of a family.
func futures(f likelihood.Family, energy likelihood.DarkEnergy) []model.Fate {
	om, fixedOm := f.Fixed["Om"]
	ol, fixedOL := f.Fixed["OL"]
	switch {
	case f.Critical:
		return []model.Fate{model.Critical}
	case fixedOm && fixedOL && om == 0 && ol == 0:
		return []model.Fate{model.Coasting}
	case fixedOL && ol == 0:
		return []model.Fate{model.Recollapse, model.Decelerating}
	case energy == likelihood.Constant:
		return []model.Fate{model.Recollapse, model.Accelerating}
	case energy == likelihood.W0Wa: // wa = 0 has no volume
		return []model.Fate{model.Recollapse, model.Decelerating, model.BigRip}
	}
	return []model.Fate{model.Recollapse, model.Accelerating, model.Decelerating, model.BigRip}
}

func possibleCurvatures(f likelihood.Family) []int8 {
	if f.Flat || f.Critical {
		return []int8{0}
	}
	return []int8{-1, 1}
}

// neverTurns reports a flat family whose prior leaves dark energy a positive density:
// E² is then a sum of positive terms, and no universe stops expanding.
func neverTurns(f likelihood.Family) bool {
	if !f.Flat {
		return false
	}
	most, known := f.Fixed["Om"]
	if !known {
		most = math.Inf(1)
	}
	for _, p := range f.Free {
		if p.Name == "Om" {
			_, most = p.Prior.Range()
		}
	}
	const radiation = 0.01 // more than any Or with H0 in reason
	return most < 1-radiation-f.Radiation
}
