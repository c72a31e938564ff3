package figure

import (
	"errors"
	"fmt"
	"math"
)

// Constraint is what one run says about one parameter; NaN in Median if nothing, or nothing beyond the prior.
type Constraint struct {
	Median     float64
	Lo68, Hi68 float64
	Lo95, Hi95 float64
}

// Quantity is one column of the comparison: a parameter and what each run says about it.
type Quantity struct {
	Symbol, Unit Label
	Runs         []Constraint // one per run
}

// Whiskers is the input of the comparison of runs.
type Whiskers struct {
	Runs       []Label // top to bottom
	Quantities []Quantity
	Unfinished bool
}

// DrawWhiskers draws one column per parameter and one row per run: the median as a tick, a thick bar for 68% and
// a thin one for 95%.
func DrawWhiskers(in Whiskers, width Width) (*Figure, error) {
	if len(in.Runs) == 0 || len(in.Quantities) == 0 {
		return nil, errors.New("figure: nothing to compare")
	}
	for _, q := range in.Quantities {
		if len(q.Runs) != len(in.Runs) {
			return nil, fmt.Errorf("figure: %s: %d constraints for %d runs", q.Symbol, len(q.Runs), len(in.Runs))
		}
	}
	left := 0.0
	for _, r := range in.Runs {
		left = max(left, r.measure(tickSize))
	}
	left = min(left, 0.4*width.points()) + 18
	const gap, pitch = 12., 15.
	n := float64(len(in.Quantities))
	w := (width.points() - left - 8 - (n-1)*gap) / n
	bottom := belowAxis(axis{title: Plain("x")}) + 1
	if !in.unitsFit(w + gap) {
		bottom += 9
	}
	h := pitch * float64(len(in.Runs))
	f := newFigure("Constraints of each run", width, bottom+h+10)
	for i, r := range in.Runs {
		y := bottom + h - pitch*(float64(i)+0.5)
		f.marks([]pt{{left - 12, y}}, markers(i), 3.8, lineInk(i))
		f.text(r, left-17, y, textStyle{size: tickSize, ink: inkText, h: 1, v: 0.5})
	}
	for k, q := range in.Quantities {
		x0 := left + float64(k)*(w+gap)
		q.draw(f, rect{x0, bottom, x0 + w, bottom + h}, pitch, gap)
	}
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

func (in *Whiskers) unitsFit(w float64) bool {
	for _, q := range in.Quantities {
		if WithUnit(q.Symbol, q.Unit).measure(titleSize) > w {
			return false
		}
	}
	return true
}

func (q *Quantity) draw(f *Figure, r rect, pitch, gap float64) {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, c := range q.Runs {
		if finite(c.Median) {
			lo, hi = min(lo, c.Lo95), max(hi, c.Hi95)
		}
	}
	x := axis{lo: 0, hi: 1}
	if hi > lo {
		x = padded(lo, hi, 0.08)
		x.ticks = fittingTicks(x, r.w(), false)
	}
	p := &panel{r, x, axis{lo: 0, hi: 1}}
	for _, t := range x.ticks {
		at := p.at(t.at, 0).x
		f.segment(at, r.y0, at, r.y1, pen{ink: inkRule, width: 0.35})
	}
	for i, c := range q.Runs {
		y := r.y1 - pitch*(float64(i)+0.5)
		if !finite(c.Median) {
			f.text(Plain("not constrained"), (r.x0+r.x1)/2, y, textStyle{size: noteSize, ink: inkSoft, h: 0.5, v: 0.5, halo: true})
			continue
		}
		f.segment(p.at(c.Lo95, 0).x, y, p.at(c.Hi95, 0).x, y, pen{ink: lineInk(i), width: 0.7})
		f.segment(p.at(c.Lo68, 0).x, y, p.at(c.Hi68, 0).x, y, pen{ink: lineInk(i), width: 3})
		at := p.at(c.Median, 0).x
		f.segment(at, y-4, at, y+4, pen{ink: inkPaper, width: 2.4})
		f.segment(at, y-4, at, y+4, pen{ink: lineInk(i), width: 1.1})
	}
	f.segment(r.x0, r.y0, r.x1, r.y0, pen{ink: inkText, width: axisWidth})
	f.ticksBelow(p, pen{ink: inkText, width: axisWidth})
	q.name(f, p, gap)
}

// name writes symbol and unit below, on two lines if need be.
func (q *Quantity) name(f *Figure, p *panel, gap float64) {
	s := textStyle{size: titleSize, ink: inkText, h: 0.5}
	at, y := (p.x0+p.x1)/2, p.y0-belowAxis(axis{title: q.Symbol})+2.5
	if both := WithUnit(q.Symbol, q.Unit); both.measure(titleSize) <= p.w()+gap {
		f.text(both, at, y, s)
		return
	}
	f.text(q.Symbol, at, y, s)
	f.text(parenthesised(q.Unit), at, y-9, textStyle{size: noteSize, ink: inkText, h: 0.5})
}
