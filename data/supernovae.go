package data

import (
	"io"
	"strings"
)

// Supernovae are distances to type Ia supernovae, one row each; slices have the length of Selection.Kept.
type Supernovae struct {
	Name, Survey []string  // nil where the table has no such column; names may repeat
	Z            []float64 // in the CMB frame, corrected for peculiar velocities; above 0
	ZHel         []float64 // heliocentric, above -1; nil where the table has none
	Value        []float64 // distance modulus mu, or standardised magnitude mag = mu + M; mag
	Err          []float64 // 1σ error of Value, above 0; nil where the table has none: a total covariance is then needed
	Absolute     bool      // Value is mu
	Selection
}

var (
	fieldZ      = field{name: "z", what: "the redshift in the CMB frame"}
	fieldZHel   = field{name: "z_hel", what: "the heliocentric redshift", optional: true}
	fieldName   = field{name: "name", what: "the name of the object", optional: true}
	fieldSurvey = field{name: "survey", what: "the survey", optional: true}
)

// ReadSupernovae reads a table with columns z, mu or mag, and optionally mu_err or mag_err, z_hel, name, survey.
func ReadSupernovae(r io.Reader, file string, o Options) (*Supernovae, error) {
	value := "mag"
	t, s, err := read(r, file, o, func(h headings) (_ []field, err error) {
		value, err = measured(h, o.Columns)
		return []field{fieldZ, {name: value, what: "the distance modulus (mu) or the standardised magnitude (mag)"},
			{name: value + "_err", what: "the error of " + value, optional: true}, fieldZHel, fieldName, fieldSurvey}, err
	})
	if err != nil {
		return nil, err
	}
	sn := &Supernovae{Name: t.texts("name", s), Survey: t.texts("survey", s), Absolute: value == "mu"}
	share(sn.Survey)
	s.names = sn.Name
	sn.Selection = s
	for _, c := range []struct {
		name string
		rule rule
		into *[]float64
	}{
		{"z", redshift, &sn.Z},
		{"z_hel", redshiftHel, &sn.ZHel},
		{value, anyNumber, &sn.Value},
		{value + "_err", aboveZero, &sn.Err},
	} {
		if *c.into, err = t.numbers(c.name, c.rule, s); err != nil {
			return nil, err
		}
	}
	return sn, nil
}

// measured decides whether the table gives mu or mag.
func measured(h headings, columns map[string]string) (string, error) {
	mu, mag := h.has("mu", columns), h.has("mag", columns)
	if mu && mag {
		// A mapping of one of the two is a choice.
		_, mu = columns["mu"]
		_, mag = columns["mag"]
	}
	switch {
	case mu && mag, !mu && !mag && h.has("mu", columns):
		return "", &Error{h.file, h.line, "", message("both mu and mag", "one of them", `choose with columns = { mu = "mu" } or { mag = "mag" }`)}
	case mu:
		return "mu", nil
	}
	return "mag", nil
}

// share lets equal words use one string, as a handful of surveys names a million rows.
func share(words []string) {
	seen := make(map[string]string)
	for i, w := range words {
		s, ok := seen[w]
		if !ok {
			s = strings.Clone(w)
			seen[s] = s
		}
		words[i] = s
	}
}
