package figure

import (
	"fmt"
	"math"
)

// Moment is a dated event of the history, such as the big bang or a crunch.
type Moment struct {
	Name       Label
	Time       float64 // in the unit of the time axis, zero today
	Lo68, Hi68 float64 // its interval; NaN for none
}

// History is the input of the figure of the scale factor against time.
type History struct {
	Scale      Band    // X is time from today, Best and bands the scale factor a, 1 today; NaN where there is no universe
	Unit       Label   // of time: Gyr, or 1/H0
	Coasting   float64 // slope of the coasting line, H0 in the inverse unit of time; zero to leave it out
	Moments    []Moment
	Top        float64 // largest scale factor shown; zero to fit the best fit
	Unfinished bool
}

// DrawHistory draws a(t), past and future.
func DrawHistory(in History, width Width) (*Figure, error) {
	if err := in.Scale.check("history"); err != nil {
		return nil, err
	}
	height := 0.74 * width.points()
	if width == Page {
		height = 0.5 * width.points()
	}
	f := newFigure("Expansion history", width, height)
	p, err := in.panel(f)
	if err != nil {
		return nil, err
	}
	f.bands(p, &in.Scale, 0)
	taken := newOccupied(p.rect)
	for _, b := range [][]float64{in.Scale.Lo95, in.Scale.Hi95, in.Scale.Lo68, in.Scale.Hi68} {
		if b != nil {
			taken.lines([]line{p.path(in.Scale.X, b)}, 0.7)
		}
	}
	in.coasting(f, p, taken)
	f.curve(p, in.Scale.X, in.Scale.Best, pen{ink: lineInk(0), width: 1.2})
	taken.lines([]line{p.path(in.Scale.X, in.Scale.Best)}, 1)
	in.today(f, p, taken)
	f.axes(p)
	in.moments(f, p, taken)
	in.names(f, p, taken)
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

func (in *History) panel(f *Figure) (*panel, error) {
	x := axis{lo: in.Scale.X[0], hi: in.Scale.X[len(in.Scale.X)-1]}
	top := in.Top
	if top == 0 {
		for _, v := range in.Scale.Best {
			if finite(v) {
				top = max(top, v)
			}
		}
		top *= 1.05
	}
	if !(x.hi > x.lo) || !(top > 0) || !finite(x.hi-x.lo) {
		return nil, fmt.Errorf("figure: a history from t = %g to %g up to a = %g", x.lo, x.hi, top)
	}
	x.ticks = linearTicks(x.lo, x.hi, 6)
	x.title = WithUnit(Plain("time from today"), in.Unit)
	y := axis{lo: 0, hi: top, ticks: linearTicks(0, top, 5), title: append(Plain("scale factor "), Markup("*a*")...)}
	return &panel{rect{2 + leftOfAxis(y), 1 + belowAxis(x), f.w - 8, f.h - aboveAxis - 3}, x, y}, nil
}

// coasting draws a = 1 + H0 t for comparison.
func (in *History) coasting(f *Figure, p *panel, taken *occupied) {
	if in.Coasting == 0 {
		return
	}
	x := []float64{p.x.lo, p.x.hi}
	y := []float64{1 + in.Coasting*p.x.lo, 1 + in.Coasting*p.x.hi}
	f.curve(p, x, y, pen{ink: inkSoft, width: 0.7, dash: []float64{4, 2}})
	l := []line{p.path(x, y)}
	taken.lines(l, 1)
	name := Plain("coasting")
	l = clipStroke(l, p.rect)
	spots := append(alongLine(l, -1, name.measure(noteSize)), alongLine(l, 1, name.measure(noteSize))...)
	f.put(taken, name, spots, 0.5)
}

// today marks a = 1 at t = 0.
func (in *History) today(f *Figure, p *panel, taken *occupied) {
	at := p.at(0, 1)
	if !p.holds(at) {
		return
	}
	k := pen{ink: inkSoft, width: 0.5, dash: []float64{1, 1.6}}
	f.segment(at.x, p.y0, at.x, p.y1, k)
	f.segment(p.x0, at.y, at.x, at.y, k)
	taken.lines([]line{{pts: []pt{{at.x, p.y0}, {at.x, p.y1}}}, {pts: []pt{{p.x0, at.y}, at}}}, 1)
	f.marks([]pt{at}, disc, 4.4, inkText)
	s := textStyle{size: tickSize, ink: inkText}
	right := s
	right.h = 1
	f.put(taken, Plain("today"), []spot{
		{at.x - 4, p.y1 - 9, right, 0}, {at.x + 4, p.y0 + 5, s, 0}, {at.x + 4, p.y1 - 9, s, 0.05}, {at.x - 4, p.y0 + 5, right, 0.05},
	}, 10)
}

// moments marks events on the time axis with their interval.
func (in *History) moments(f *Figure, p *panel, taken *occupied) {
	for i, m := range in.Moments {
		at := p.at(m.Time, 0)
		if !(at.x >= p.x0 && at.x <= p.x1) {
			continue
		}
		y := p.y0 + 3.5
		if finite(m.Lo68) && finite(m.Hi68) {
			a, b := p.at(m.Lo68, 0).x, p.at(m.Hi68, 0).x
			f.segment(max(a, p.x0), y, min(b, p.x1), y, pen{ink: lineInk(1), width: 0.8})
		}
		f.marks([]pt{{at.x, y}}, markers(i+2), 3.6, lineInk(1))
		s := textStyle{size: noteSize, ink: lineInk(1), h: 0.5, halo: true}
		l, r := s, s
		l.h, r.h = 1, 0
		f.put(taken, m.Name, []spot{
			{at.x, y + 6, s, 0}, {at.x - 5, y + 3, l, 0.01}, {at.x + 5, y + 3, r, 0.01},
			{at.x, y + 15, s, 0.04}, {at.x - 5, y + 12, l, 0.04}, {at.x + 5, y + 12, r, 0.04},
		}, 10)
	}
}

// names labels the curve and its bands.
func (in *History) names(f *Figure, p *panel, taken *occupied) {
	name := Plain("best fit")
	if in.Scale.Lo68 != nil {
		name = Plain("best fit, 68% and 95%")
	}
	l := clipStroke([]line{p.path(in.Scale.X, in.Scale.Best)}, p.rect)
	w := name.measure(tickSize)
	var spots []spot
	for _, part := range l {
		arc, total := arcLengths(part.pts)
		for s := 0.; s < total; s += 4 {
			q := atArc(part.pts, arc, s)
			for _, d := range [3]float64{5, 12, 22} {
				st := textStyle{size: tickSize, ink: lineInk(0), v: 0.5}
				spots = append(spots, spot{q.x + d, q.y - d/2, st, d * 0.002})
				st.h = 1
				spots = append(spots, spot{q.x - d, q.y + d/2, st, d * 0.002})
			}
		}
	}
	if w < p.w() {
		f.put(taken, name, spots, math.Inf(1))
	}
}
