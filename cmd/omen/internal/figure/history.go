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
	Scale      Band    // X is time from today, Best and bands the scale factor a, 1 today. Before its big bang and after its crunch a universe counts as a = 0 in the bands; Best is NaN there
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
	if in.Scale.Lo95 != nil && in.Scale.Hi95 != nil {
		taken.area(p.between(in.Scale.X, in.Scale.Lo95, in.Scale.Hi95), 0.4)
	}
	for _, b := range [][]float64{in.Scale.Lo95, in.Scale.Hi95, in.Scale.Lo68, in.Scale.Hi68} {
		if b != nil {
			taken.lines(p.paths(in.Scale.X, b), 2)
		}
	}
	in.coasting(f, p, taken)
	f.curve(p, in.Scale.X, in.Scale.Best, pen{ink: lineInk(0), width: 1.2})
	taken.lines(p.paths(in.Scale.X, in.Scale.Best), 5)
	in.today(f, p, taken)
	in.nameCoasting(f, p, taken)
	f.axes(p)
	in.key(f, p, taken)
	in.moments(f, p, taken)
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
	x, y := in.coastingLine(p)
	f.curve(p, x, y, pen{ink: inkSoft, width: 0.7, dash: []float64{4, 2}})
	taken.lines([]line{p.path(x, y)}, 5)
}

func (in *History) coastingLine(p *panel) (x, y []float64) {
	x = []float64{p.x.lo, p.x.hi}
	return x, []float64{1 + in.Coasting*x[0], 1 + in.Coasting*x[1]}
}

// nameCoasting writes its name along the line where it crosses nothing else.
func (in *History) nameCoasting(f *Figure, p *panel, taken *occupied) {
	if in.Coasting == 0 {
		return
	}
	name := Plain("coasting")
	l := clipStroke([]line{p.path(in.coastingLine(p))}, p.rect)
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
	taken.lines([]line{{pts: []pt{{at.x, p.y0}, {at.x, p.y1}}}, {pts: []pt{{p.x0, at.y}, at}}}, 5)
	f.marks([]pt{at}, disc, 4.4, inkText)
	s := textStyle{size: tickSize, ink: inkText}
	right := s
	right.h = 1
	f.put(taken, Plain("today"), []spot{
		{x: at.x - 4, y: p.y1 - 9, style: right}, {x: at.x + 4, y: p.y0 + 5, style: s},
		{x: at.x + 4, y: p.y1 - 9, style: s, penalty: 0.05}, {x: at.x - 4, y: p.y0 + 5, style: right, penalty: 0.05},
	}, 10)
}

// moments marks events on the best fit, or on the time axis where it has ended, with their interval.
func (in *History) moments(f *Figure, p *panel, taken *occupied) {
	for i, m := range in.Moments {
		at := p.at(m.Time, max(0, zeroNaN(in.Scale.at(m.Time))))
		if !(at.x >= p.x0 && at.x <= p.x1) {
			continue
		}
		if finite(m.Lo68) && finite(m.Hi68) {
			a, b := p.at(m.Lo68, 0).x, p.at(m.Hi68, 0).x
			f.segment(max(a, p.x0), at.y, min(b, p.x1), at.y, pen{ink: lineInk(1), width: 1})
		}
		f.marks([]pt{at}, markers(i+2), 4.4, lineInk(1))
		var spots []spot
		for _, d := range [7]float64{6, 9, 14, 20, 28, 38, 50} {
			for a := range 5 { // upwards from left to right
				sin, cos := math.Sincos(math.Pi * float64(a) / 4)
				q := spot{x: at.x + d*cos, y: at.y + d*sin, penalty: 0.006 * d,
					style: textStyle{size: noteSize, ink: lineInk(1), h: 0.5 - 0.5*cos, v: 0.5 - 0.5*sin}}
				if d > 10 {
					q.leader = &pt{at.x, at.y}
				}
				spots = append(spots, q)
				if a == 2 {
					q.style.h = 0
					spots = append(spots, q)
					q.style.h = 1
					spots = append(spots, q)
				}
			}
		}
		f.put(taken, m.Name, spots, math.Inf(1))
		taken.area([]line{(rect{at.x, at.y, at.x, at.y}).grown(3).outline()}, 5)
	}
}

func zeroNaN(v float64) float64 {
	if finite(v) {
		return v
	}
	return 0
}

// at interpolates the best fit linearly, NaN outside.
func (b *Band) at(x float64) float64 {
	for i := 1; i < len(b.X); i++ {
		if x >= b.X[i-1] && x <= b.X[i] {
			return b.Best[i-1] + (x-b.X[i-1])/(b.X[i]-b.X[i-1])*(b.Best[i]-b.Best[i-1])
		}
	}
	return math.NaN()
}

// key explains line and bands in the corner that is freest.
func (in *History) key(f *Figure, p *panel, taken *occupied) {
	rows := []string{"best fit"}
	if in.Scale.Lo68 != nil {
		rows = append(rows, "68%")
	}
	if in.Scale.Lo95 != nil {
		rows = append(rows, "95%")
	}
	const w, pitch = 52., 10.
	h := pitch*float64(len(rows)) + 4
	best, price := rect{}, math.Inf(1)
	for _, c := range []pt{{p.x0 + 8, p.y1 - 8 - h}, {p.x1 - 8 - w, p.y1 - 8 - h}, {p.x1 - 8 - w, p.y0 + 8}, {p.x0 + 8, p.y0 + 8}} {
		r := rect{c.x, c.y, c.x + w, c.y + h}
		if v := taken.price(r.outline()); v < price {
			best, price = r, v
		}
	}
	y := best.y1 - 7
	for i, name := range rows {
		r := rect{best.x0, y - 3, best.x0 + 13, y + 3}
		switch {
		case i == 0:
			f.segment(r.x0, y, r.x1, y, pen{ink: lineInk(0), width: 1.2})
		default:
			f.fill([]line{r.outline()}, fillInk(0), 0.22)
			if name == "68%" {
				f.fill([]line{r.outline()}, fillInk(0), 0.32)
			}
		}
		f.text(Plain(name), r.x1+5, y, textStyle{size: noteSize, ink: inkText, v: 0.5})
		y -= pitch
	}
	taken.area([]line{best.outline()}, 5)
}
