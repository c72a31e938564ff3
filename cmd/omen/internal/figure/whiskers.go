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
	Note       Label // in place of a median; nil to say "not constrained"
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

// DrawWhiskers draws one panel per parameter with one row per run: the median as a tick, a thick bar for 68% and
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
	l := in.lay(width.points())
	rows := (len(in.Quantities) + l.columns - 1) / l.columns
	f := newFigure("Constraints of each run", width, float64(rows)*(l.h+l.below)+9)
	for k, q := range in.Quantities {
		row, col := k/l.columns, k%l.columns
		y0 := l.below + float64(rows-1-row)*(l.h+l.below)
		if col == 0 {
			in.names(f, l, y0)
		}
		x0 := l.left + float64(col)*(l.w+whiskerGap)
		q.draw(f, rect{x0, y0, x0 + l.w, y0 + l.h}, l.pitch)
	}
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

// whiskerLayout places the panels: columns of them in a row, w × h points, below the room for axes.
type whiskerLayout struct {
	left, w, h, pitch, below float64
	columns                  int
	lines                    [][]Label // names of the runs
}

const whiskerGap = 12.

// lay makes as many columns as can be read, and rows of them if that is not all.
func (in *Whiskers) lay(width float64) whiskerLayout {
	l := whiskerLayout{pitch: 15}
	for _, r := range in.Runs {
		lines := r.wrap(0.3*width, tickSize)
		for _, v := range lines {
			l.left = max(l.left, v.measure(tickSize))
		}
		if len(lines) > 1 {
			l.pitch = 20
		}
		l.lines = append(l.lines, lines)
	}
	l.left += 20
	l.h = l.pitch * float64(len(in.Runs))
	n := len(in.Quantities)
	room := width - l.left - 8 + whiskerGap
	most := max(1, min(n, int(room/(42+whiskerGap))))
	rows := (n + most - 1) / most
	l.columns = (n + rows - 1) / rows
	l.w = room/float64(l.columns) - whiskerGap
	l.below = belowAxis(axis{title: Plain("x")}) + 1
	if !in.unitsFit(l.w + whiskerGap) {
		l.below += 9
	}
	if rows > 1 {
		l.below += 6
	}
	return l
}

// names writes the names of the runs at the left of a row of panels.
func (in *Whiskers) names(f *Figure, l whiskerLayout, y0 float64) {
	for i, lines := range l.lines {
		y := y0 + l.h - l.pitch*(float64(i)+0.5)
		f.marks([]pt{{l.left - 12, y}}, markers(i), 3.8, lineInk(i))
		for k, v := range lines {
			at := y + 8.6*(float64(len(lines)-1)/2-float64(k))
			f.text(v, l.left-17, at, textStyle{size: tickSize, ink: inkText, h: 1, v: 0.5})
		}
	}
}

func (in *Whiskers) unitsFit(w float64) bool {
	for _, q := range in.Quantities {
		if WithUnit(q.Symbol, q.Unit).measure(titleSize) > w {
			return false
		}
	}
	return true
}

func (q *Quantity) draw(f *Figure, r rect, pitch float64) {
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
		f.constraint(p, c, r.y1-pitch*(float64(i)+0.5), i)
	}
	f.segment(r.x0, r.y0, r.x1, r.y0, pen{ink: inkText, width: axisWidth})
	f.ticksBelow(p, pen{ink: inkText, width: axisWidth})
	q.name(f, p)
}

// constraint draws one row.
func (f *Figure) constraint(p *panel, c Constraint, y float64, run int) {
	if !finite(c.Median) {
		none := c.Note
		if none == nil {
			none = Plain("not constrained")
		}
		if none.measure(noteSize) > p.w()+whiskerGap-4 {
			none = Plain("none")
		}
		f.text(none, (p.x0+p.x1)/2, y, textStyle{size: noteSize, ink: inkSoft, h: 0.5, v: 0.5, halo: true})
		return
	}
	k := lineInk(run)
	f.segment(p.at(c.Lo95, 0).x, y, p.at(c.Hi95, 0).x, y, pen{ink: k, width: 0.7})
	f.segment(p.at(c.Lo68, 0).x, y, p.at(c.Hi68, 0).x, y, pen{ink: k, width: 3})
	at := p.at(c.Median, 0).x
	f.segment(at, y-4, at, y+4, pen{ink: inkPaper, width: 2.4})
	f.segment(at, y-4, at, y+4, pen{ink: k, width: 1.1})
}

// name writes symbol and unit below, on two lines if need be.
func (q *Quantity) name(f *Figure, p *panel) {
	s := textStyle{size: titleSize, ink: inkText, h: 0.5}
	at, y := (p.x0+p.x1)/2, p.y0-belowAxis(axis{title: q.Symbol})+2.5
	if both := WithUnit(q.Symbol, q.Unit); both.measure(titleSize) <= p.w()+whiskerGap {
		f.text(both, at, y, s)
		return
	}
	f.text(q.Symbol, at, y, s)
	f.text(parenthesised(q.Unit), at, y-9, textStyle{size: noteSize, ink: inkText, h: 0.5})
}
