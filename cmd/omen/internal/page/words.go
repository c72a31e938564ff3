package page

import (
	"fmt"
	"html/template"
	"math"
	"regexp"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
)

// symbols are quantities as a page shows them; others keep their names.
var symbols = map[string]template.HTML{
	"Om": "Ω<sub>m</sub>", "OL": "Ω<sub>Λ</sub>", "Ok": "Ω<sub>k</sub>", "Or": "Ω<sub>r</sub>",
	"H0": "<i>H</i><sub>0</sub>", "w0": "<i>w</i><sub>0</sub>", "wa": "<i>w</i><sub>a</sub>", "q0": "<i>q</i><sub>0</sub>",
	"rd": "<i>r</i><sub>d</sub>", "hrd": "<i>h</i>\u00a0<i>r</i><sub>d</sub>", "ob": "Ω<sub>b</sub><i>h</i><sup>2</sup>", "M": "<i>M</i>",
	"age": "<i>t</i><sub>0</sub>", "H0t0": "<i>H</i><sub>0</sub><i>t</i><sub>0</sub>",
}

func symbol(name string) template.HTML {
	if s, ok := symbols[name]; ok {
		return s
	}
	return template.HTML(template.HTMLEscapeString(name))
}

var quantities = regexp.MustCompile(`\b(Om|OL|Ok|w0|wa|q0)\b`)

// named is a text of our own, such as "closed (Ok < 0)", with symbols for its quantities.
func named(s string) template.HTML {
	return template.HTML(quantities.ReplaceAllStringFunc(string(text(s)), func(name string) string { return string(symbol(name)) }))
}

// text is a plain text as the page shows it: escaped, with a minus that is one,
// and without a break around ± and signs of order.
func text(s string) template.HTML {
	r := []rune(s)
	for i, c := range r {
		if c == '-' && i+1 < len(r) && r[i+1] >= '0' && r[i+1] <= '9' && (i == 0 || r[i-1] == ' ' || r[i-1] == '[') {
			r[i] = '−'
		}
	}
	s = unbroken.Replace(string(r))
	return template.HTML(template.HTMLEscapeString(s))
}

// unbroken keeps a number with its error or bound on one line.
var unbroken = strings.NewReplacer(" ± ", "\u00a0±\u00a0", " < ", "\u00a0<\u00a0", " > ", "\u00a0>\u00a0")

// words is the result in a few sentences.
func words(r *gather.Run) []template.HTML {
	s := r.Summary
	out := []template.HTML{constraints(r), probability(fate(r))}
	if l := likeliest(s.Nested); l != "" {
		out = append(out, l)
	}
	return append(out, today(r), text(fit(s)), text(converged(s)))
}

// constraints names what the data know.
func constraints(r *gather.Run) template.HTML {
	var known, open []string
	for _, q := range r.Summary.Parameters {
		if q.Constrained {
			known = append(known, value(q))
		} else {
			open = append(open, string(symbol(q.Name)))
		}
	}
	if !r.Job.Space.Family().Flat {
		if q, ok := gather.Find(r.Summary, "Ok"); ok {
			known = append(known, value(q))
		}
	}
	s := "In " + universe(r.Job.Space.Family()) + " these data give " + join(known) + "."
	if len(known) == 0 {
		s = "In " + universe(r.Job.Space.Family()) + " these data constrain no parameter."
	}
	if len(open) > 0 {
		s += " They do not constrain " + join(open) + "."
	}
	return template.HTML(s) // symbols, numbers and our own words
}

// value is a quantity in a sentence.
func value(q result.Quantity) string {
	s := string(symbol(q.Name)) + "\u00a0=\u00a0" + string(text(report.MeanSD(q)))
	if q.Unit != "" {
		s += "\u00a0" + template.HTMLEscapeString(q.Unit)
	}
	return s
}

func universe(f likelihood.Family) string {
	energy := map[likelihood.DarkEnergy]string{likelihood.Constant: "a cosmological constant",
		likelihood.W: "dark energy of constant w", likelihood.W0Wa: "dark energy whose w may change"}[f.DarkEnergy]
	if f.Flat {
		return "a flat universe of matter and " + energy
	}
	return "a universe of matter, " + energy + " and any curvature"
}

// fate names the most probable end, and how sure it is.
func fate(r *gather.Run) string {
	fates := r.Summary.Fates
	if len(fates) == 0 {
		return "No fate was determined."
	}
	best := fates[0]
	for _, f := range fates {
		if f.Probability > best.Probability {
			best = f
		}
	}
	lead := "No fate is more probable than not; the first is that it"
	switch {
	case best.Probability > 0.95:
		lead = "Its fate, almost surely: it"
	case best.Probability > 0.5:
		lead = "Its most probable fate: it"
	}
	s := fmt.Sprintf("%s %s, with probability %s.", lead, verb(best.Name), report.Probability(best))
	if len(r.Summary.FatesHeldW) > 0 {
		s += " That extrapolates w0 + wa (1-a) into a future that nobody measured; below are also the fates if w stays as it is today."
	}
	return s
}

// verb makes the name of a fate the end of a sentence.
func verb(name string) string {
	switch {
	case strings.HasPrefix(name, "recollapse"):
		return "recollapses" + strings.TrimPrefix(name, "recollapse")
	case strings.HasPrefix(name, "expands"):
		return name
	case name == "no big bang in the past":
		return "had no big bang in its past"
	case name == "big rip":
		return "ends in a big rip"
	}
	return "is " + name
}

// today is the present state and the age.
func today(r *gather.Run) template.HTML {
	var parts []string
	for _, f := range r.Summary.Today {
		if f.Probability > 0 {
			parts = append(parts, string(named(f.Name))+" with probability "+string(probability(report.Probability(f))))
		}
	}
	s := template.HTML("Today it is " + join(parts) + ".")
	if q, ok := gather.Find(r.Summary, "age"); ok {
		return s + " Its age: " + template.HTML(value(q)) + "."
	}
	if q, ok := gather.Find(r.Summary, "H0t0"); ok {
		return s + " Its age in units of 1/<i>H</i><sub>0</sub>, which these data do not know: " + template.HTML(value(q)) + "."
	}
	return s
}

func fit(s *result.Summary) string {
	f := s.Fit
	return fmt.Sprintf("The best fit has chi-squared %.2f for %s and %s; a larger one has probability %s.",
		float64(f.Chi2), digits.Count(f.Rows, "row"), digits.Count(f.DoF, "degree of freedom"), chance(float64(f.Probability)))
}

func chain(s *result.Summary) string {
	m := s.Sampling
	if m.Ensembles == 0 {
		return fmt.Sprintf("The posterior was integrated by quadrature, without a chain: %d evaluations, ln evidence %.2f.", s.Engine.Evaluations, float64(s.Engine.LogEvidence))
	}
	return fmt.Sprintf("%d ensembles of %d walkers, %s, the first %d discarded as burn-in. Effective samples %.0f at least (goal %d), R-hat %.4f at most. Acceptance %.2f, %d evaluations, seed %d.",
		m.Ensembles, m.Walkers, digits.Count(m.Steps, "step"), m.BurnIn, math.Floor(float64(m.MinESS)), m.Goal, float64(m.MaxRHat), float64(m.Acceptance), m.Evaluations, m.Seed) + engine(s.Engine)
}

// engine is what an integral says of the chain.
func engine(e result.Engine) string {
	if len(e.Exact) == 0 {
		return ""
	}
	s := fmt.Sprintf(" Quadrature beside it: %d evaluations, ln evidence %.2f.", e.Evaluations, float64(e.LogEvidence))
	if d := e.Largest; d != nil {
		s += fmt.Sprintf(" The chain differs from it by %.3f of the posterior's width at most (%s of %s)%s.",
			float64(d.Widths), d.Statistic, d.Quantity, d.Allowance())
	}
	return s
}

// converged is the chain in a sentence.
func converged(s *result.Summary) string {
	if s.Sampling.Ensembles == 0 {
		return "The posterior was integrated by quadrature; no number has a Monte Carlo error."
	}
	state := "The chain converged"
	if !s.Complete {
		state = "The chain has not reached its goal"
	}
	return fmt.Sprintf("%s: effective samples %.0f at least, R-hat %.4f at most.", state, math.Floor(float64(s.Sampling.MinESS)), float64(s.Sampling.MaxRHat))
}

// join writes a list in words.
func join(list []string) string {
	switch n := len(list); n {
	case 0:
		return "nothing"
	case 1:
		return list[0]
	default:
		return strings.Join(list[:n-1], ", ") + " and " + list[n-1]
	}
}

// chance is the probability of a chi-squared.
func chance(p float64) string {
	switch {
	case math.IsNaN(p):
		return "unknown"
	case p < 0.0005:
		return "< 0.001"
	case p > 0.9995:
		return "> 0.999"
	}
	return fmt.Sprintf("%.3f", p)
}
