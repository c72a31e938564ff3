package likelihood

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"omen/model"
)

// DarkEnergy is the family of equations of state that a Space allows.
type DarkEnergy uint8

// The families: w = -1; w = w0, constant; w(a) = w0 + wa (1-a).
const (
	Constant DarkEnergy = iota
	W
	W0Wa
)

// String is the family's name in a run file.
func (d DarkEnergy) String() string { return [...]string{"constant", "w", "w0-wa"}[d] }

// Parameter is one free parameter: its name (design: Om, OL, w0, …) and prior.
type Parameter struct {
	Name  string
	Prior Prior
}

// ReferenceH0 (km/s/Mpc) stands in for H0 where a run does not know it. It then
// enters nothing but the radiation density taken from the CMB temperature.
const ReferenceH0 = 70

// Family describes a set of universes before it is checked.
type Family struct {
	Flat             bool       // OL follows from Om; OL is then no parameter
	Critical         bool       // matter and radiation alone, flat: Om follows from Or; nothing else has parameters
	DarkEnergy       DarkEnergy // which of w0, wa exist
	FromTemperature  bool       // Or from the CMB temperature; otherwise Radiation
	Radiation        float64    // Or today where FromTemperature is false
	RequireBigBang   bool       // exclude universes that bounced
	RequireMatterEra bool       // for w0-wa, exclude w0+wa >= 0
	Free             []Parameter
	Fixed            map[string]float64
}

// quantity is one named slot of a Point: the index of a free parameter, or -1
// and a fixed value (NaN where the run does not know it).
type quantity struct {
	index int
	value float64
}

func (q quantity) at(x []float64) float64 {
	if q.index >= 0 {
		return x[q.index]
	}
	return q.value
}

func (q quantity) known() bool { return q.index >= 0 || !math.IsNaN(q.value) }

// Space is a checked Family: the map from a vector of free parameters to a
// Point. It is immutable and safe for concurrent use.
type Space struct {
	family                              Family
	om, ol, w0, wa, h0, hrd, rd, ob, mb quantity
}

// Names lists every parameter that a Space can hold, in the order of its vectors.
func Names() []string {
	return []string{"Om", "OL", "w0", "wa", "H0", "hrd", "rd", "ob", "M"}
}

// Unit is the unit of a parameter or derived quantity, "" if it has none.
func Unit(name string) string {
	switch name {
	case "H0":
		return "km/s/Mpc"
	case "hrd", "rd":
		return "Mpc"
	case "M":
		return "mag"
	case "age":
		return "Gyr"
	}
	return ""
}

// NewSpace checks a family and orders its free parameters as Names does. The
// errors are a user's: a parameter that the family does not have, one given
// twice, one missing. A family without a free parameter is a single universe.
func NewSpace(f Family) (*Space, error) {
	if err := checkFamily(f); err != nil {
		return nil, err
	}
	order := Names()
	f.Free = slices.Clone(f.Free)
	slices.SortFunc(f.Free, func(a, b Parameter) int {
		return slices.Index(order, a.Name) - slices.Index(order, b.Name)
	})
	s := &Space{family: f}
	for name, slot := range s.slots() {
		*slot = quantity{-1, math.NaN()}
		if v, ok := f.Fixed[name]; ok {
			slot.value = v
		}
		if i := slices.IndexFunc(f.Free, func(p Parameter) bool { return p.Name == name }); i >= 0 {
			slot.index = i
		}
	}
	s.setDefaults()
	return s, nil
}

func (s *Space) slots() map[string]*quantity {
	return map[string]*quantity{"Om": &s.om, "OL": &s.ol, "w0": &s.w0, "wa": &s.wa,
		"H0": &s.h0, "hrd": &s.hrd, "rd": &s.rd, "ob": &s.ob, "M": &s.mb}
}

func (s *Space) setDefaults() {
	if !s.w0.known() {
		s.w0.value = -1
	}
	if !s.wa.known() {
		s.wa.value = 0
	}
}

func checkFamily(f Family) error {
	given := map[string]bool{}
	for _, p := range f.Free {
		given[p.Name] = true
		if _, twice := f.Fixed[p.Name]; twice {
			return fmt.Errorf("%s is both free and fixed", p.Name)
		}
	}
	for name := range f.Fixed {
		given[name] = true
	}
	for name := range given {
		if !slices.Contains(Names(), name) {
			return fmt.Errorf("%s is not a parameter; the parameters are %s", name, strings.Join(Names(), ", "))
		}
	}
	return checkGiven(f, given)
}

func checkGiven(f Family, given map[string]bool) error {
	switch {
	case f.Critical && (given["Om"] || given["OL"] || f.DarkEnergy != Constant):
		return fmt.Errorf("a critical universe is made of matter and radiation alone, which leaves Om and dark energy no freedom; remove them")
	case f.Critical:
	case !given["Om"]:
		return fmt.Errorf("%s is missing; give it a prior or a fixed value", "Om")
	case f.Flat && given["OL"]:
		return fmt.Errorf("OL follows from Om in a flat universe; remove it, or choose the curved geometry")
	case !f.Flat && !given["OL"]:
		return fmt.Errorf("OL is missing; give it a prior or a fixed value, or choose the flat geometry")
	case f.DarkEnergy == Constant && (given["w0"] || given["wa"]):
		return fmt.Errorf("w0 and wa do not vary when dark energy is constant; choose the w or w0-wa family")
	case f.DarkEnergy == W && given["wa"]:
		return fmt.Errorf("wa belongs to the w0-wa family; remove it, or choose that family")
	case f.DarkEnergy != Constant && !given["w0"]:
		return fmt.Errorf("w0 is missing; give it a prior or a fixed value")
	case f.DarkEnergy == W0Wa && !given["wa"]:
		return fmt.Errorf("wa is missing; give it a prior or a fixed value")
	case given["hrd"] && (given["rd"] || given["ob"]):
		return fmt.Errorf("hrd fixes the sound horizon together with H0; remove rd and ob, or hrd")
	case given["rd"] && given["ob"]:
		return fmt.Errorf("ob decides the sound horizon; remove rd, or ob")
	}
	return nil
}

// Point is one universe with what else the terms need.
type Point struct {
	Universe model.Universe // H0 is ReferenceH0 where the run does not know it
	HRd      float64        // (H0/100)·rd in Mpc, NaN where unknown
	M        float64        // absolute magnitude, NaN where unknown
}

// Dim is the number of free parameters.
func (s *Space) Dim() int { return len(s.family.Free) }

// Free lists the free parameters in the order of the vectors.
func (s *Space) Free() []Parameter { return s.family.Free }

// Family returns what the space was made from, free parameters in order.
func (s *Space) Family() Family { return s.family }

// KnowsH0 reports whether H0 is a parameter, free or fixed: without it times and
// lengths are known in units of 1/H0 alone.
func (s *Space) KnowsH0() bool { return s.h0.known() }

// KnowsHRd reports whether the sound horizon is known in any of its forms.
func (s *Space) KnowsHRd() bool {
	return s.hrd.known() || s.h0.known() && (s.rd.known() || s.ob.known())
}

// KnowsM reports whether the absolute magnitude is a parameter.
func (s *Space) KnowsM() bool { return s.mb.known() }

// Point fills p for the parameters x, whose length must be Dim.
func (s *Space) Point(x []float64, p *Point) {
	u := &p.Universe
	u.H0 = s.h0.at(x)
	if !s.h0.known() {
		u.H0 = ReferenceH0
	}
	u.Or = s.family.Radiation
	if s.family.FromTemperature {
		u.Or = model.RadiationFromTemperature(u.H0)
	}
	u.Om = s.om.at(x)
	u.OL = s.ol.at(x)
	if s.family.Flat {
		u.OL = 1 - u.Om - u.Or
	}
	if s.family.Critical {
		u.Om, u.OL = 1-u.Or, 0
	}
	u.W0, u.Wa = s.w0.at(x), s.wa.at(x)
	p.M = s.mb.at(x)
	p.HRd = s.soundHorizon(u, x)
}

func (s *Space) soundHorizon(u *model.Universe, x []float64) float64 {
	if s.hrd.known() {
		return s.hrd.at(x)
	}
	rd := s.rd.at(x)
	if s.ob.known() {
		rd = model.SoundHorizon(s.ob.at(x), u.Om, u.H0)
	}
	if !s.h0.known() {
		return math.NaN()
	}
	return rd * u.H0 / 100
}

// Allows reports whether the family admits a universe, whatever the priors say of it.
func (s *Space) Allows(u *model.Universe) bool { return s.allowed(u) }

// allowed reports whether the family admits the universe.
func (s *Space) allowed(u *model.Universe) bool {
	if s.family.RequireMatterEra && s.family.DarkEnergy == W0Wa && u.W0+u.Wa >= 0 {
		return false
	}
	return !s.family.RequireBigBang || u.HasBigBang()
}

// logPrior is the sum of the priors' log-densities.
func (s *Space) logPrior(x []float64) float64 {
	sum := 0.0
	for i := range s.family.Free {
		sum += s.family.Free[i].Prior.LogDensity(x[i])
	}
	return sum
}

// Box is a finite box that holds the priors' support; see [Prior.Box].
func (s *Space) Box() (lo, hi []float64) {
	for i := range s.family.Free {
		a, b := s.family.Free[i].Prior.Range()
		lo, hi = append(lo, a), append(hi, b)
	}
	return lo, hi
}
