package figure

import (
	"errors"
	"fmt"
	"math"
)

// Probability is a probability with its error, or an upper limit.
type Probability struct {
	P     float64 // the probability, or the limit; NaN if the series does not have this row
	Err   float64 // standard error; zero if negligible or for a limit
	Limit bool    // P is an upper limit
	Text  Label   // as it is to be printed; nil to format P and Err
}

// FateSeries is one set of probabilities, such as those within the fitted family.
type FateSeries struct {
	Name   Label
	Values []Probability // one per row
}

// Fates is the input of the bar chart of probabilities.
type Fates struct {
	Rows       []Label // fates in words, top to bottom
	Series     []FateSeries
	LimitLevel Label // what the limits are, such as 95% upper limits; nil to say "upper limit"
	Unfinished bool
}

// Faintest is the probability below which none has a bar, but an open arrow with its number.
const Faintest = 1e-6

// DrawFates draws the probabilities as horizontal bars, on a logarithmic axis if some are small but not too small
// for a bar: bars on a linear axis can be compared by their lengths.
func DrawFates(in Fates, width Width) (*Figure, error) {
	if err := in.check(); err != nil {
		return nil, err
	}
	n := len(in.Series)
	const bar = 9.5
	pitch := max(float64(n)*bar+6, 20)
	left, lines := 0.0, make([][]Label, len(in.Rows))
	for i, r := range in.Rows {
		lines[i] = r.wrap(0.34*width.points(), tickSize)
		for _, l := range lines[i] {
			left = max(left, l.measure(tickSize))
		}
	}
	left = min(left, 0.5*width.points()) + 9
	x := in.axis(width.points() - left - in.room())
	bottom := belowAxis(x) + 1
	key := 0.
	if n > 1 {
		key = 11 * float64(n)
	}
	for _, has := range []bool{in.has(x, (*Probability).limits), in.has(x, (*Probability).below)} {
		if has {
			key += 11
		}
	}
	f := newFigure("Probability of each fate", width, bottom+pitch*float64(len(in.Rows))+key+9)
	p := &panel{rect{left, bottom, f.w - in.room(), bottom + pitch*float64(len(in.Rows))}, x, axis{lo: 0, hi: 1}}
	for _, t := range x.ticks {
		if t.label != nil && t.at > x.lo {
			at := p.at(t.at, 0).x
			f.segment(at, p.y0, at, p.y1, pen{ink: inkRule, width: 0.35})
		}
	}
	for r := range in.Rows {
		middle := p.y1 - pitch*(float64(r)+0.5)
		for k, l := range lines[r] {
			y := middle + 8.6*(float64(len(lines[r])-1)/2-float64(k))
			f.text(l, p.x0-6, y, textStyle{size: tickSize, ink: inkText, h: 1, v: 0.5})
		}
		for s := range in.Series {
			y := middle + bar*(float64(n-1)/2-float64(s))
			f.probability(p, in.Series[s].Values[r], y, bar*0.66, s)
		}
	}
	f.segment(p.x0, p.y0, p.x0, p.y1, pen{ink: inkText, width: axisWidth})
	f.segment(p.x0, p.y0, p.x1, p.y0, pen{ink: inkText, width: axisWidth})
	f.ticksBelow(p, pen{ink: inkText, width: axisWidth})
	f.text(x.title, (p.x0+p.x1)/2, p.y0-belowAxis(x)+2.5, textStyle{size: titleSize, ink: inkText, h: 0.5})
	in.key(f, p)
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

func (in *Fates) check() error {
	if len(in.Rows) == 0 || len(in.Series) == 0 {
		return errors.New("figure: no fates to draw")
	}
	for _, s := range in.Series {
		if len(s.Values) != len(in.Rows) {
			return fmt.Errorf("figure: %s: %d probabilities for %d fates", s.Name, len(s.Values), len(in.Rows))
		}
		for i, v := range s.Values {
			if v.P < 0 || v.P > 1+1e-9 || v.Err < 0 {
				return fmt.Errorf("figure: %s: probability %g ± %g of %s", s.Name, v.P, v.Err, in.Rows[i])
			}
		}
	}
	return nil
}

// rare is the probability below which bars on a linear axis could not be told from nothing.
const rare = 0.01

// axis runs from 0 to 1, or over the decades if there are rare fates. A limit alone does not ask for decades.
func (in *Fates) axis(w float64) axis {
	least, limit := 1.0, 1.0
	for _, s := range in.Series {
		for _, v := range s.Values {
			switch {
			case !(v.P >= Faintest):
			case v.Limit:
				limit = min(limit, v.P)
			default:
				least = min(least, v.P)
			}
		}
	}
	title := Plain("probability")
	if least >= rare {
		return axis{lo: 0, hi: 1, ticks: linearTicks(0, 1, 5), title: title}
	}
	lo := math.Pow(10, math.Floor(math.Log10(min(least, limit))-0.3))
	return axis{lo: lo, hi: 1, log: true, ticks: logTicks(lo, 1, w), title: title}
}

// below tells whether a probability is too small for a bar on an axis.
func (v *Probability) below(x axis) bool {
	return v.P > 0 && (x.log && v.P < max(x.lo, Faintest) || !x.log && (v.P < Faintest || v.Limit && v.P < rare))
}

// limits tells whether it is drawn as an upper limit.
func (v *Probability) limits(x axis) bool { return v.Limit && v.P > 0 && !v.below(x) }

// has tells whether some probability is of a kind.
func (in *Fates) has(x axis, kind func(*Probability, axis) bool) bool {
	for _, s := range in.Series {
		for i := range s.Values {
			if kind(&s.Values[i], x) {
				return true
			}
		}
	}
	return false
}

// room is the width of the widest number at the right.
func (in *Fates) room() float64 {
	w := 0.0
	for _, s := range in.Series {
		for _, v := range s.Values {
			w = max(w, v.label().measure(tickSize))
		}
	}
	return w + 8
}

// label is the number in print.
func (v Probability) label() Label {
	switch {
	case v.Text != nil:
		return v.Text
	case math.IsNaN(v.P):
		return Plain("–")
	case v.Limit:
		return append(Plain("< "), scientific(v.P, 1)...)
	case v.Err > 0 && v.P < 1e-3 && v.P > 0:
		e := math.Floor(math.Log10(v.P))
		unit := math.Pow(10, e)
		d := decimalsOf(v.Err / unit)
		return Markup(fmt.Sprintf("(%s ± %s)×10^{−%g}", decimal(v.P/unit, d), decimal(v.Err/unit, d), -e))
	case v.Err > 0:
		d := decimalsOf(v.Err)
		return Plain(decimal(v.P, d) + " ± " + decimal(v.Err, d))
	case v.P > 0.9 && v.P < 1: // the digits that matter are those of 1-P
		return Plain(decimal(v.P, min(8, decimalsOf(1-v.P))))
	case v.P == 1:
		return Plain("1")
	}
	return scientific(v.P, 2)
}

// decimalsOf shows two digits of an error whose leading ones are 100 to 354 or, rounded up, 950 to 999, and one in
// between (Particle Data Group, Review of Particle Physics, Introduction, §5.3).
func decimalsOf(err float64) int {
	e := math.Floor(math.Log10(err) + 1e-12)
	d := int(-e)
	if err/math.Pow(10, e) < 3.55 {
		d++
	}
	return max(0, d)
}

// scientific writes v with the given number of digits, as a decimal unless small.
func scientific(v float64, digits int) Label {
	if v <= 0 {
		return Plain("0")
	}
	e := int(math.Floor(math.Log10(v)))
	if e >= -3 {
		return Plain(decimal(v, max(0, digits-1-e)))
	}
	return Markup(fmt.Sprintf("%s×10^{−%d}", decimal(v/math.Pow(10, float64(e)), digits-1), -e))
}

// probability draws one bar: filled with an error, dashed with an arrow to the left for a limit; what is too small
// for a bar is an open arrow at the foot of the axis with its number.
func (f *Figure) probability(p *panel, v Probability, y, h float64, series int) {
	if v.below(p.x) {
		f.openArrow(p.x0+2.5, y, lineInk(series))
		f.text(v.label(), p.x0+13, y, textStyle{size: tickSize, ink: inkText, v: 0.5, halo: true})
		return
	}
	k := inkText
	if math.IsNaN(v.P) {
		k = inkSoft
	}
	f.text(v.label(), p.x1+6, y, textStyle{size: tickSize, ink: k, v: 0.5})
	if math.IsNaN(v.P) || v.P <= 0 {
		return
	}
	r := rect{p.x0, y - h/2, max(p.at(v.P, 0).x, p.x0+0.5), y + h/2}
	if v.Limit {
		f.stroke([]line{{pts: []pt{{r.x0, r.y0}, {r.x1, r.y0}, {r.x1, r.y1}, {r.x0, r.y1}}}},
			pen{ink: lineInk(series), width: 0.6, dash: []float64{1.6, 1.2}})
		f.arrow(r.x1, y, max(r.x1-14, r.x0+1), lineInk(series))
		return
	}
	f.fill([]line{r.outline()}, fillInk(series), 0.8)
	if series%2 == 1 { // told apart in grey, too
		f.stroke(hatch([]line{r.outline()}, math.Pi/4, 2.4), pen{ink: lineInk(series), width: 0.4})
	}
	f.stroke([]line{r.outline()}, pen{ink: lineInk(series), width: 0.5})
	if v.Err > 0 {
		f.whisker(p, v.P-v.Err, v.P+v.Err, y, h*0.35)
	}
}

// openArrow points to the left with its tip at x.
func (f *Figure) openArrow(x, y float64, k ink) {
	f.stroke([]line{{pts: []pt{{x, y}, {x + 6, y + 2.6}, {x + 6, y - 2.6}}, closed: true}}, pen{ink: k, width: 0.8})
}

// whisker is a horizontal error bar, cut at the ends of the axis.
func (f *Figure) whisker(p *panel, lo, hi, y, cap float64) {
	a, b := p.at(max(lo, p.x.lo), 0).x, p.at(min(hi, p.x.hi), 0).x
	k := pen{ink: inkText, width: 0.8}
	f.segment(a, y, b, y, k)
	if lo > p.x.lo {
		f.segment(a, y-cap, a, y+cap, k)
	}
	if hi < p.x.hi {
		f.segment(b, y-cap, b, y+cap, k)
	}
}

func (f *Figure) arrow(from, y, to float64, k ink) {
	f.segment(from, y, to+2, y, pen{ink: k, width: 0.8})
	f.fill([]line{{pts: []pt{{to, y}, {to + 4, y + 1.8}, {to + 4, y - 1.8}}, closed: true}}, k, 1)
}

// tooSmall says what an open arrow stands for.
func (in *Fates) tooSmall(x axis) Label {
	l := Plain("too small for a bar")
	if in.has(x, func(v *Probability, x axis) bool { return v.Limit && v.below(x) }) {
		l = append(append(l, Plain("; <: ")...), in.limit()...)
	}
	return l
}

// limit is what upper limits are.
func (in *Fates) limit() Label {
	if in.LimitLevel == nil {
		return Plain("upper limit")
	}
	return in.LimitLevel
}

// key names the series and explains limits and arrows above the bars.
func (in *Fates) key(f *Figure, p *panel) {
	y := p.y1 + 8
	if in.has(p.x, (*Probability).below) {
		f.openArrow(p.x0+4, y, inkSoft)
		f.text(in.tooSmall(p.x), p.x0+19, y, textStyle{size: noteSize, ink: inkText, v: 0.5})
		y += 11
	}
	if in.has(p.x, (*Probability).limits) {
		r := rect{p.x0, y - 2.6, p.x0 + 14, y + 2.6}
		f.stroke([]line{{pts: []pt{{r.x0, r.y0}, {r.x1, r.y0}, {r.x1, r.y1}, {r.x0, r.y1}}}},
			pen{ink: inkSoft, width: 0.6, dash: []float64{1.6, 1.2}})
		f.arrow(r.x1, y, r.x0+2, inkSoft)
		f.text(in.limit(), r.x1+5, y, textStyle{size: noteSize, ink: inkText, v: 0.5})
		y += 11
	}
	if len(in.Series) < 2 {
		return
	}
	for s := len(in.Series) - 1; s >= 0; s-- {
		r := rect{p.x0, y - 2.6, p.x0 + 14, y + 2.6}
		f.fill([]line{r.outline()}, fillInk(s), 0.8)
		if s%2 == 1 {
			f.stroke(hatch([]line{r.outline()}, math.Pi/4, 2.4), pen{ink: lineInk(s), width: 0.4})
		}
		f.stroke([]line{r.outline()}, pen{ink: lineInk(s), width: 0.5})
		f.text(in.Series[s].Name.shorten(f.w-r.x1-7, noteSize), r.x1+5, y, textStyle{size: noteSize, ink: inkText, v: 0.5})
		y += 11
	}
}
