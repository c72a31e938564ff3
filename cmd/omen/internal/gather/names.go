package gather

import (
	"slices"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/result"
)

// Symbol is the symbol of a quantity and its unit.
func Symbol(name string) (symbol, unit figure.Label) {
	if name == "H0t0" {
		return figure.Markup("*H*_0 *t*_0"), nil
	}
	return figure.Symbol(name)
}

func axis(name string) figure.Label { return figure.WithUnit(Symbol(name)) }

// Value is a quantity in words: "Om 0.293 ± 0.011".
func Value(q result.Quantity) string {
	s := q.Name + " " + digits.Value(float64(q.Mean), float64(q.SD), float64(q.MCSE))
	if q.Unit != "" {
		s += " " + q.Unit
	}
	if !q.Constrained {
		s += " (not constrained)"
	}
	return s
}

// Find is the parameter or derived quantity of a name.
func Find(s *result.Summary, name string) (result.Quantity, bool) {
	for _, qs := range [][]result.Quantity{s.Parameters, s.Derived} {
		if i := slices.IndexFunc(qs, func(q result.Quantity) bool { return q.Name == name }); i >= 0 {
			return qs[i], true
		}
	}
	return result.Quantity{}, false
}

// Values lists quantities in words.
func (r *Run) Values(names ...string) string {
	var out []string
	for _, name := range names {
		if q, ok := Find(r.Summary, name); ok {
			out = append(out, Value(q))
		}
	}
	return strings.Join(out, ", ")
}
