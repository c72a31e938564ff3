// Package compare sets several runs side by side: what each says about every
// quantity, and how far two of them are apart in units of the scatter that the
// difference should have.
package compare

import (
	"fmt"
	"math"
	"path/filepath"
	"slices"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/result"
	"omen/likelihood"
)

// Run is one of the runs with a short name of its own.
type Run struct {
	*gather.Run
	Name string
}

// Amiss is what keeps a run from being whole: that it stopped before its goal, that
// its chain was not read to its end.
func (r Run) Amiss() []string {
	var list []string
	if r.Unfinished() {
		m := r.Summary.Sampling
		list = append(list, fmt.Sprintf("unfinished: effective samples %.0f (goal %d), R-hat %.4f; omen resume %s goes on",
			math.Floor(float64(m.MinESS)), m.Goal, float64(m.MaxRHat), r.Dir))
	}
	if r.Cut != "" {
		list = append(list, r.Cut)
	}
	return list
}

// Quantity is what the runs say about one quantity, nil where a run does not have
// it or does not constrain it.
type Quantity struct {
	Name, Unit string
	Values     []*result.Quantity // one for each run
	Instead    []string           // what a run without a value says: "0, fixed", "not constrained" or nothing
}

// Comparison is several runs side by side.
type Comparison struct {
	Runs       []Run
	Quantities []Quantity
	Pairs      []Pair
}

// New compares runs, two or more.
func New(runs []*gather.Run) *Comparison {
	c := &Comparison{}
	for i, name := range shortNames(runs) {
		c.Runs = append(c.Runs, Run{runs[i], name})
	}
	c.collect()
	for a := range c.Runs {
		for b := a + 1; b < len(c.Runs); b++ {
			c.Pairs = append(c.Pairs, c.pair(a, b))
		}
	}
	return c
}

// shortNames are the last parts of the folders, as many as tell them apart.
func shortNames(runs []*gather.Run) []string {
	names := make([]string, len(runs))
	rest := make([]string, len(runs))
	for i, r := range runs {
		dir := r.Dir
		if abs, err := filepath.Abs(dir); err == nil {
			dir = abs
		}
		names[i], rest[i] = filepath.Base(dir), filepath.Dir(dir)
	}
	for range 20 {
		seen := map[string]int{}
		for _, n := range names {
			seen[n]++
		}
		if len(seen) == len(names) {
			break
		}
		for i, n := range slices.Clone(names) {
			if seen[n] > 1 {
				names[i] = filepath.ToSlash(filepath.Join(filepath.Base(rest[i]), n))
				rest[i] = filepath.Dir(rest[i])
			}
		}
	}
	return names
}

// collect lists the quantities of all runs, parameters before derived ones.
func (c *Comparison) collect() {
	var names []string
	for _, list := range []func(*result.Summary) []result.Quantity{
		func(s *result.Summary) []result.Quantity { return s.Parameters },
		func(s *result.Summary) []result.Quantity { return s.Derived },
	} {
		for _, r := range c.Runs {
			for _, q := range list(r.Summary) {
				if !slices.Contains(names, q.Name) {
					names = append(names, q.Name)
				}
			}
		}
	}
	for _, name := range names {
		q := Quantity{Name: name, Values: make([]*result.Quantity, len(c.Runs)), Instead: make([]string, len(c.Runs))}
		n := 0
		for i, r := range c.Runs {
			if v, ok := gather.Find(r.Summary, name); ok && v.Constrained {
				q.Unit, q.Values[i] = v.Unit, &v
				n++
				continue
			}
			q.Instead[i] = r.instead(name)
		}
		if n > 0 {
			c.Quantities = append(c.Quantities, q)
		}
	}
}

// instead is what a run says of a quantity that it has no constraint on.
func (r Run) instead(name string) string {
	if _, ok := gather.Find(r.Summary, name); ok {
		return "not constrained"
	}
	f := r.Job.Space.Family()
	v, fixed := f.Fixed[name]
	switch {
	case fixed:
	case name == "Ok" && f.Flat, name == "wa" && f.DarkEnergy != likelihood.W0Wa:
		v = 0
	case name == "w0" && f.DarkEnergy == likelihood.Constant:
		v = -1
	default:
		return ""
	}
	return fmt.Sprintf("%g, fixed", v)
}

// Unfinished reports whether a run stopped before its goal.
func (c *Comparison) Unfinished() bool {
	return slices.ContainsFunc(c.Runs, func(r Run) bool { return r.Unfinished() })
}

// Rule is how the scatter of a difference is found.
type Rule uint8

const (
	// Independent is for runs without a file in common: √(σ₁² + σ₂²).
	Independent Rule = iota
	// Nested is for runs of which one has all the data of the other and no wider a
	// family of universes: √|σ₁² − σ₂²| (Gratton & Challinor 2020, MNRAS 499, 3410;
	// for any efficient and a less efficient estimate Hausman 1978, Econometrica
	// 46, 1251; both from memory). It holds for Gaussian posteriors.
	Nested
	// Overlapping is for runs that share data in another way. Estimates with data
	// in common move together, so that the scatter is at most that of independent
	// ones, and the shift at least what this gives.
	Overlapping
)

// Formula is the scatter in symbols.
func (r Rule) Formula() string {
	return [...]string{"√(σ₁² + σ₂²)", "√|σ₁² − σ₂²|", "at most √(σ₁² + σ₂²)"}[r]
}

// Pair is two runs and how far apart they are.
type Pair struct {
	A, B   int
	Rule   Rule
	Shared int // inputs in common
	Shifts []Shift
}

// Why says in words which rule was taken.
func (p Pair) Why() string {
	switch p.Rule {
	case Independent:
		return "no input in common, taken as independent"
	case Nested:
		return digits.Count(p.Shared, "input") + " in common, one run nested in the other"
	}
	return digits.Count(p.Shared, "input") + " in common but not nested: the shifts are at least these"
}

// Shift is the difference of the means, second minus first.
type Shift struct {
	Name       string
	Difference float64
	Scatter    float64 // expected; NaN where the two widths are too alike to tell it
}

// Sigmas is the difference in units of its scatter.
func (s Shift) Sigmas() float64 { return s.Difference / s.Scatter }

func (c *Comparison) pair(a, b int) Pair {
	p := Pair{A: a, B: b}
	p.Rule, p.Shared = rule(c.Runs[a], c.Runs[b])
	for _, q := range c.Quantities {
		if u, v := q.Values[a], q.Values[b]; u != nil && v != nil {
			p.Shifts = append(p.Shifts, Shift{q.Name, float64(v.Mean - u.Mean), scatter(p.Rule, u, v)})
		}
	}
	return p
}

// rule compares inputs by what is in them, not by their names, and the families.
func rule(a, b Run) (Rule, int) {
	shared, onlyA := overlap(a.Summary.Inputs, b.Summary.Inputs)
	_, onlyB := overlap(b.Summary.Inputs, a.Summary.Inputs)
	fa, fb := a.Job.Space.Family(), b.Job.Space.Family()
	switch {
	case shared == 0:
		return Independent, 0
	case onlyB == 0 && within(fa, fb), onlyA == 0 && within(fb, fa):
		return Nested, shared
	}
	return Overlapping, shared
}

// overlap counts the inputs of a that b has too, and the others.
func overlap(a, b []result.InputFile) (shared, others int) {
	for _, f := range a {
		if slices.ContainsFunc(b, func(g result.InputFile) bool { return f.SHA256 == g.SHA256 }) {
			shared++
		} else {
			others++
		}
	}
	return shared, others
}

// within reports whether every universe of family a is one of b.
func within(a, b likelihood.Family) bool {
	return (a.Flat || !b.Flat) && a.DarkEnergy <= b.DarkEnergy
}

// scatter is the standard deviation that a difference of means should have.
func scatter(r Rule, a, b *result.Quantity) float64 {
	va, vb := float64(a.SD)*float64(a.SD), float64(b.SD)*float64(b.SD)
	if r != Nested {
		return math.Sqrt(va + vb)
	}
	// The Monte Carlo error of a variance σ² from n draws is σ²√(2/n).
	noise := math.Hypot(va*relativeError(a.ESS), vb*relativeError(b.ESS))
	d := math.Abs(va - vb)
	if !(d > 2*noise) {
		return math.NaN()
	}
	return math.Sqrt(d)
}

// relativeError is that of a variance from so many draws; none of an integral.
func relativeError(ess result.Number) float64 {
	if !(ess > 0) {
		return 0
	}
	return math.Sqrt(2 / float64(ess))
}
