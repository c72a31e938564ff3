// Package nested compares the simpler universes that a family contains: empty,
// critical, matter alone, flat, a cosmological constant. In a continuous posterior
// each of them has probability zero; as models of their own they have an evidence,
// and with prior odds a probability.
package nested

import (
	"slices"

	"omen/likelihood"
)

// Model is one of the nested universes.
type Model struct {
	Name   string // as in a run file: "flat-lambda"
	Words  string // as in a text: "flat, Λ"
	Own    bool   // the run's own family
	Family likelihood.Family
}

// variant says how a model is cut out of a larger family.
type variant struct {
	name, words string
	flat        bool
	energy      likelihood.DarkEnergy
	om, ol      float64 // held there, if not free
	holdsOm     bool
	holdsOL     bool
}

var variants = []variant{
	{name: "coasting", words: "empty (coasting)", holdsOm: true, holdsOL: true},
	{name: "critical", words: "critical (Om = 1)", om: 1, holdsOm: true, holdsOL: true},
	{name: "matter-only", words: "matter only", holdsOL: true},
	{name: "flat-lambda", words: "flat, Λ", flat: true},
	{name: "curved-lambda", words: "curved, Λ"},
	{name: "flat-w", words: "flat, w", flat: true, energy: likelihood.W},
	{name: "curved-w", words: "curved, w", energy: likelihood.W},
	{name: "flat-w0-wa", words: "flat, w0-wa", flat: true, energy: likelihood.W0Wa},
	{name: "curved-w0-wa", words: "curved, w0-wa", energy: likelihood.W0Wa},
}

// Models lists the models that a family contains, itself among them, from the
// simplest on. A parameter that a model keeps has the prior it had, one that it does
// not keep must have been free, or held at the very value.
func Models(own likelihood.Family) []Model {
	var out []Model
	for _, v := range variants {
		if m, ok := v.within(own); ok {
			out = append(out, m)
		}
	}
	return out
}

// within cuts the model out of a family; ok is false if the family does not hold it.
func (v variant) within(own likelihood.Family) (m Model, ok bool) {
	critical := v.holdsOm && v.om == 1
	switch {
	case v.energy > own.DarkEnergy,
		own.Flat && !v.flat && !critical,
		v.flat && !own.Flat && !free(own, "OL"),
		v.holdsOm && !can(own, "Om", v.om),
		v.holdsOL && !own.Flat && !can(own, "OL", v.ol),
		!v.holdsOL && v.energy < likelihood.W && own.DarkEnergy >= likelihood.W && !can(own, "w0", -1),
		!v.holdsOL && v.energy < likelihood.W0Wa && own.DarkEnergy == likelihood.W0Wa && !can(own, "wa", 0),
		!v.holdsOL && !own.Flat && !free(own, "OL") && own.Fixed["OL"] == 0: // that is matter only
		return Model{}, false
	}
	f := own
	f.Flat, f.DarkEnergy = v.flat, v.energy
	drop := dropped(v)
	f.Free = slices.DeleteFunc(slices.Clone(own.Free), func(p likelihood.Parameter) bool { return slices.Contains(drop, p.Name) })
	f.Fixed = map[string]float64{}
	for name, value := range own.Fixed {
		if !slices.Contains(drop, name) {
			f.Fixed[name] = value
		}
	}
	switch {
	case critical:
		f.Critical = true
	case v.holdsOm: // empty: no radiation either
		f.Fixed["Om"], f.Fixed["OL"] = v.om, v.ol
		f.FromTemperature, f.Radiation = false, 0
	case v.holdsOL:
		f.Fixed["OL"] = v.ol
	}
	m = Model{Name: v.name, Words: v.words, Family: f}
	m.Own = own.Flat == f.Flat && own.DarkEnergy == f.DarkEnergy && len(own.Free) == len(f.Free)
	return m, true
}

// dropped lists the parameters that the model does not have, or that it sets itself.
func dropped(v variant) []string {
	var out []string
	if v.holdsOm {
		out = append(out, "Om")
	}
	if v.holdsOL || v.flat {
		out = append(out, "OL")
	}
	if v.energy < likelihood.W {
		out = append(out, "w0")
	}
	if v.energy < likelihood.W0Wa {
		out = append(out, "wa")
	}
	return out
}

func free(f likelihood.Family, name string) bool {
	return slices.ContainsFunc(f.Free, func(p likelihood.Parameter) bool { return p.Name == name })
}

// can reports whether a family has a parameter that can be set to a value.
func can(f likelihood.Family, name string, value float64) bool {
	v, fixed := f.Fixed[name]
	return free(f, name) || fixed && v == value
}
