package compare

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
)

// mostWhiskers is how many quantities are drawn: a page full.
const mostWhiskers = 8

// mostRegions is how many runs can be told apart in a plane.
const mostRegions = 6

// Pictures are the figures of a comparison: the runs in one plane, and their
// constraints side by side.
func (c *Comparison) Pictures() []*gather.Picture {
	plane, first := c.plane()
	return []*gather.Picture{plane, c.whiskers(first)}
}

// pairs are the planes that can be shown, the more telling ones first.
var pairs = [][2]string{{"Om", "OL"}, {"w0", "wa"}, {"Om", "w0"}, {"Om", "H0"}, {"Om", "hrd"}, {"H0", "hrd"}, {"Om", "M"}}

// plane is the regions of all runs that have both of two parameters, the pair
// that most runs have, and the lines of those that are flat. It returns the runs in
// it, too: in that order.
func (c *Comparison) plane() (*gather.Picture, []int) {
	var best [2]string
	var in []int
	for _, pair := range pairs {
		have := c.having(pair)
		if len(have) > max(1, len(in)) {
			best, in = pair, have
		}
	}
	if in == nil {
		return gather.Absent("plane", "One plane", "no two parameters are free in two of the runs"), nil
	}
	var runs []*gather.Run
	var names, values, left []string
	lines := false
	for _, i := range in {
		r := c.Runs[i]
		runs, names = append(runs, r.Run), append(names, r.Name)
		values = append(values, r.Name+": "+r.Values(best[0], best[1]))
		lines = lines || !r.Has(best[1])
	}
	for i, r := range c.Runs {
		if !slices.Contains(in, i) {
			left = append(left, r.Name)
		}
	}
	caption := fmt.Sprintf("Regions of highest density that hold 68%% and 95%% of the posterior of %s and %s in each run.", best[0], best[1])
	if lines {
		caption += " A run in flat space is a line, thick over 68% and thin over 95%."
	}
	if len(left) > 0 {
		caption += " Not shown: " + strings.Join(left, ", ") + "."
	}
	return gather.PlaneOf(runs, names, best, caption, "Regions of each run. "+strings.Join(values, "; ")+"."), in
}

// having are the runs that a plane can show: first those that have both parameters, then,
// beside such, those whose universes lie on a line of it.
func (c *Comparison) having(pair [2]string) []int {
	var both, flat []int
	for i, r := range c.Runs {
		switch {
		case r.Has(pair[0]) && r.Has(pair[1]):
			both = append(both, i)
		case r.OnLine(pair):
			flat = append(flat, i)
		}
	}
	if len(both) == 0 {
		return nil
	}
	in := append(both, flat...)
	return in[:min(len(in), mostRegions)]
}

// whiskers is the constraints of all runs side by side, those of the plane first,
// so that they have the same colours.
func (c *Comparison) whiskers(first []int) *gather.Picture {
	in := figure.Whiskers{Unfinished: c.Unfinished()}
	order := slices.Clone(first)
	for i := range c.Runs {
		if !slices.Contains(first, i) {
			order = append(order, i)
		}
	}
	for _, i := range order {
		in.Runs = append(in.Runs, figure.Plain(c.Runs[i].Name))
	}
	var parts []string
	for _, q := range c.chosen() {
		symbol, unit := gather.Symbol(q.Name)
		f := figure.Quantity{Symbol: symbol, Unit: unit}
		for _, i := range order {
			v, w := q.Values[i], figure.Constraint{Median: math.NaN(), Note: figure.Plain(instead(q.Instead[i]))}
			if v != nil {
				w = figure.Constraint{Median: float64(v.Median), Lo68: float64(v.Interval68[0]), Hi68: float64(v.Interval68[1]),
					Lo95: float64(v.Interval95[0]), Hi95: float64(v.Interval95[1])}
				parts = append(parts, fmt.Sprintf("%s of %s %s", q.Name, c.Runs[i].Name, report.MeanSD(*v)))
			}
			f.Runs = append(f.Runs, w)
		}
		in.Quantities = append(in.Quantities, f)
	}
	return gather.NewPicture("whiskers", "Constraints side by side",
		"Median, central 68% interval (thick) and central 95% interval (thin) of each run.",
		strings.Join(parts, "; ")+".", len(in.Quantities) > 2,
		func(w figure.Width) (*figure.Figure, error) { return figure.DrawWhiskers(in, w) })
}

// instead is what stands in place of a bar.
func instead(said string) string {
	if said == "" {
		return "–"
	}
	return strings.Replace(said, "-", "−", 1)
}

// chosen are the quantities to draw: those that several runs have come first.
func (c *Comparison) chosen() []Quantity {
	var several, one []Quantity
	for _, q := range c.Quantities {
		n := 0
		for _, v := range q.Values {
			if v != nil {
				n++
			}
		}
		if n > 1 {
			several = append(several, q)
		} else {
			one = append(one, q)
		}
	}
	if len(several) == 0 {
		several = one
	}
	return several[:min(len(several), mostWhiskers)]
}
