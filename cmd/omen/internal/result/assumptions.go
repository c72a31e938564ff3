package result

import (
	"fmt"
	"strings"

	"omen/likelihood"
)

// assumptions writes down the priors and what was taken for granted.
func assumptions(r Run) []string {
	j := r.Job
	f := j.Space.Family()
	var out []string
	for _, p := range f.Free {
		out = append(out, fmt.Sprintf("%s: %s", p.Name, p.Prior.String()))
	}
	for _, name := range likelihood.Names() {
		if v, ok := f.Fixed[name]; ok {
			out = append(out, fmt.Sprintf("%s = %g, fixed", name, v))
		}
	}
	out = append(out, geometryWords(f), energyWords(f), radiationWords(j.Space))
	if f.RequireBigBang {
		out = append(out, "there was a big bang: universes that bounced are left out")
	}
	for i, t := range j.Tables {
		if t.Supernovae != nil {
			out = append(out, offsetWords(t.Name, j.Run, i))
		}
	}
	return append(out, nestedWords(r)...)
}

// nestedWords says how the nested universes were compared.
func nestedWords(r Run) []string {
	if r.Nested == nil {
		return nil
	}
	var odds []string
	for _, m := range r.Nested.Models {
		if m.Odds != 1 {
			odds = append(odds, fmt.Sprintf("%s %g", m.Words, m.Odds))
		}
	}
	prior := "the nested universes have equal prior odds"
	if odds != nil {
		prior = "the nested universes have prior odds of 1, but for " + strings.Join(odds, ", ")
	}
	out := []string{prior + ", and each parameter that one keeps has the prior above"}
	for _, m := range r.Nested.Models {
		if m.Own && m.Admitted < 0.9995 {
			out = append(out, fmt.Sprintf("for the evidence the prior is normalised over the %.1f%% of its ranges that these assumptions admit", 100*m.Admitted))
		}
	}
	return out
}

func geometryWords(f likelihood.Family) string {
	if f.Flat {
		return "space is flat: OL follows from Om"
	}
	return "space may be curved"
}

func energyWords(f likelihood.Family) string {
	switch f.DarkEnergy {
	case likelihood.W:
		return "dark energy has a constant equation of state w0"
	case likelihood.W0Wa:
		s := "dark energy has w(a) = w0 + wa (1-a); for wa ≠ 0 its far future is an extrapolation of that formula"
		if f.RequireMatterEra {
			s += "; w0 + wa < 0, so that matter once ruled"
		}
		return s
	}
	return "dark energy is a cosmological constant"
}

func radiationWords(s *likelihood.Space) string {
	f := s.Family()
	switch {
	case f.FromTemperature && s.KnowsH0():
		return "radiation from the CMB temperature (2.7255 K, 3.044 massless neutrinos)"
	case f.FromTemperature:
		return fmt.Sprintf("radiation from the CMB temperature, with H0 = %d km/s/Mpc for that purpose alone", likelihood.ReferenceH0)
	case f.Radiation == 0:
		return "radiation is ignored"
	}
	return fmt.Sprintf("radiation Or = %g", f.Radiation)
}
