package report

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode/utf8"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/result"
)

// fates writes a block of probabilities: within the family, what the chain alone says, and
// averaged over the nested universes, as far as there are such.
func fates(b *strings.Builder, title string, own, averaged []result.Fate) {
	if len(own) == 0 {
		return
	}
	columns := []string{"probability"}
	counted := slices.ContainsFunc(own, func(f result.Fate) bool { return f.Chain != nil })
	if counted {
		columns = append(columns, "from the chain")
	}
	if len(averaged) > 0 {
		columns = append(columns, "over nested")
	}
	row := func(name string, cells []string) {
		text := pad(name, 32)
		for _, c := range cells {
			text += " " + pad(c, 16)
		}
		line(b, text)
	}
	row(title, columns)
	for _, name := range names(own, averaged) {
		f, here := find(own, name)
		cells := []string{"0"}
		if here {
			cells[0] = Probability(f)
		}
		if counted {
			cells = append(cells, Counted(f))
		}
		if len(averaged) > 0 {
			a, ok := find(averaged, name)
			if !ok {
				a = result.Fate{Upper95: result.Number(math.NaN()), Exact: true}
			}
			a.Exact = a.Exact || here && f.Exact
			cells = append(cells, Probability(a))
		}
		row("  "+name, cells)
	}
	b.WriteString("\n")
}

// Counted writes what the chain says of a probability that was integrated: a dash where
// the family has no such universe, which no chain could count.
func Counted(f result.Fate) string {
	if f.Chain == nil {
		return "–"
	}
	return Probability(*f.Chain)
}

// explain says below the tables of fates what their last column and a plain 0 are.
func explain(b *strings.Builder, s *result.Summary) {
	if s.Averaged == nil {
		return
	}
	Wrap(b, "  ", "over nested: averaged over the nested universes below, "+Odds(s.Nested))
	if slices.ContainsFunc(s.Averaged.Fates, func(f result.Fate) bool { _, here := find(s.Fates, f.Name); return !here }) ||
		slices.ContainsFunc(s.Averaged.Today, func(f result.Fate) bool { _, here := find(s.Today, f.Name); return !here }) {
		Wrap(b, "  ", "0: such universes have no volume in this run's family")
	}
	b.WriteString("\n")
}

// Odds says in words what the prior odds of the nested universes are.
func Odds(models []result.Nested) string {
	var odds []string
	equal := true
	for _, m := range models {
		odds = append(odds, fmt.Sprintf("%g for %s", float64(m.Odds), m.Words))
		equal = equal && m.Odds == models[0].Odds
	}
	if equal {
		return "at equal prior odds"
	}
	return "at prior odds of " + strings.Join(odds, ", ")
}

// names lists those of the family and then those that only nested universes have.
func names(own, averaged []result.Fate) []string {
	var out []string
	for _, f := range append(own[:len(own):len(own)], averaged...) {
		if !slices.Contains(out, f.Name) {
			out = append(out, f.Name)
		}
	}
	return out
}

func find(fs []result.Fate, name string) (result.Fate, bool) {
	i := slices.IndexFunc(fs, func(f result.Fate) bool { return f.Name == name })
	if i < 0 {
		return result.Fate{}, false
	}
	return fs[i], true
}

// tiniest is the probability below which none is written: the model of the errors is
// trusted no further, and no prior is known so well.
const tiniest = 1e-12

// Probability writes a probability with its error, or the limit that a count of none (or
// of all) leaves. What was integrated has an error below the digits that are shown.
func Probability(f result.Fate) string {
	p, e, up := float64(f.Probability), float64(f.Error), float64(f.Upper95)
	level := " (95%)"
	if f.Exact {
		level = ""
	}
	switch rest := 1 - p; {
	case math.IsInf(e, 1):
		return "not known"
	case p == 0 && up > 0:
		return "< " + small(max(up, tiniest)) + level
	case p == 1 && up >= 1:
		return "> 0" + level
	case p == 1 && up > 1e-4:
		return "> " + digits.Format(1-up, min(limitPlace(up), limitPlace(1-up))) + level
	case p == 1 && up > 0:
		return "> 1 - " + small(max(up, tiniest)) + level
	case p == 0 || p == 1:
		return strconv.Itoa(int(p))
	case p < tiniest:
		return "< " + small(tiniest)
	case rest < tiniest:
		return "> 1 - " + small(tiniest)
	case p < 1e-3 && (!(e > 0) || e < p/30):
		return small(p)
	case rest < 1e-3 && (!(e > 0) || e < rest/30):
		return "1 - " + small(rest)
	case !(e > 0) || e < 5e-5:
		return digits.Format(p, -4)
	}
	return digits.Share(p, e)
}

// small writes a small number with two digits, below 1e-4 with an exponent.
func small(p float64) string {
	if p >= 1e-4 {
		return digits.Error(p)
	}
	s := strconv.FormatFloat(p, 'e', 1, 64)
	return strings.Replace(strings.Replace(s, "e-0", "e-", 1), ".0e", "e", 1)
}

func limitPlace(up float64) int {
	p, ok := digits.Spread(up)
	if !ok {
		return -3
	}
	return p
}

// nested writes the table of nested universes.
func nested(b *strings.Builder, models []result.Nested) {
	if len(models) < 2 {
		return
	}
	aic, bic := math.Inf(1), math.Inf(1)
	for _, m := range models {
		if m.Ruled == "" {
			aic, bic = math.Min(aic, float64(m.AIC)), math.Min(bic, float64(m.BIC))
		}
	}
	fmt.Fprintf(b, "%-19s %5s %8s %8s %8s %14s  %s\n", "Nested universes", "free", "chi²", "ΔAIC", "ΔBIC", "ln Bayes", "probability")
	for _, m := range models {
		name := m.Words
		if m.Own {
			name += " *"
		}
		if m.Ruled != "" {
			line(b, fmt.Sprintf("  %s %5d  %s", pad(name, 17), m.Parameters, "cannot be: "+m.Ruled))
			continue
		}
		line(b, fmt.Sprintf("  %s %5d %8.2f %8.2f %8.2f %14s  %s", pad(name, 17), m.Parameters, float64(m.Chi2),
			float64(m.AIC)-aic, float64(m.BIC)-bic, bayes(m), inRoom(modelProbability(m))))
	}
	b.WriteString("  * this run's family; ln Bayes is against the best\n\n")
}

// bayes writes ln of the Bayes factor against the best, with its error where that shows.
func bayes(m result.Nested) string {
	v, e := float64(m.LogBayesFactor), float64(m.BayesError)
	if v == 0 {
		return "0"
	}
	if e < 0.005 {
		return digits.Format(v, -2)
	}
	return digits.Share(v, e)
}

func modelProbability(m result.Nested) string {
	if m.Odds == 0 {
		return "– (odds 0)"
	}
	return Probability(result.Fate{Probability: max(m.Probability, math.SmallestNonzeroFloat64), Error: m.ProbabilityErr, Upper95: result.Number(math.NaN())})
}

// inRoom is a probability in at most ten columns: with the digits that its error leaves it,
// and the error itself where there is room.
func inRoom(text string) string {
	if p, _, ok := strings.Cut(text, " ± "); ok && utf8.RuneCountInString(text) > 10 {
		return p
	}
	return text
}

// priors writes what other priors would change.
func priors(b *strings.Builder, s *result.Summary) {
	if len(s.Priors) == 0 {
		return
	}
	var same []string
	for _, p := range s.Priors {
		if p.Same {
			same = append(same, p.Name)
			continue
		}
		changed(b, s, p)
	}
	if len(same) > 0 {
		b.WriteString("Other priors\n")
		Wrap(b, "  ", strings.Join(same, " or ")+": the same density as this prior, for the map is linear; only where the ranges end could differ")
		b.WriteString("\n")
	}
}

// changed writes the probabilities under another prior.
func changed(b *strings.Builder, s *result.Summary, p result.Prior) {
	if p.Effective == 0 {
		return
	}
	title := "Prior " + p.Name
	if p.Averaged == nil {
		p.Averaged = &result.Averaged{}
	}
	fates(b, title, join(p.Fates, p.Today), join(p.Averaged.Fates, p.Averaged.Today))
	fates(b, title+", w held", p.Held, p.Averaged.FatesHeldW)
	if p.Effective < 0.2 {
		Wrap(b, "  ", fmt.Sprintf("the reweighting leaves %.0f%% of the sample effective: take these as rough", 100*float64(p.Effective)))
		b.WriteString("\n")
	}
}

func join(a, b []result.Fate) []result.Fate { return append(a[:len(a):len(a)], b...) }

// times writes when things happen.
func times(b *strings.Builder, s *result.Summary) {
	if len(s.Times) == 0 {
		return
	}
	fmt.Fprintf(b, "%-38s %-8s %-15s %s\n", "Times", "median", "68% interval", "95% interval")
	for _, t := range s.Times {
		name := t.Words
		if t.Unit != "" {
			name += " [" + t.Unit + "]"
		}
		if math.IsNaN(float64(t.Median)) {
			line(b, fmt.Sprintf("  %s –  too few draws of such: %.0f", pad(name, 36), math.Max(0, float64(t.ESS))))
			continue
		}
		spread := float64(t.Interval68[1]-t.Interval68[0]) / 2
		place := digits.Place(spread, float64(t.MCSE))
		cell := func(v result.Number) string { return digits.Format(float64(v), place) }
		line(b, fmt.Sprintf("  %s %s %s %s", pad(name, 36), pad(cell(t.Median), 8), pad(cell(t.Interval68[0])+" … "+cell(t.Interval68[1]), 15),
			cell(t.Interval95[0])+" … "+cell(t.Interval95[1])))
	}
	b.WriteString("  each in those universes alone in which it comes to be\n\n")
}
