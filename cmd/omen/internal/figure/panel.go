package figure

import (
	"math"
)

// axis maps an interval of values to the page.
type axis struct {
	lo, hi float64
	log    bool
	title  Label
	ticks  []tick
	bare   bool    // no tick labels
	turned bool    // tick labels below stand upright
	room   float64 // least width for tick labels at the left
}

func (a axis) fraction(v float64) float64 {
	if a.log {
		return math.Log(v/a.lo) / math.Log(a.hi/a.lo)
	}
	return (v - a.lo) / (a.hi - a.lo)
}

// panel is a rectangle with axes.
type panel struct {
	rect
	x, y axis
}

func (p *panel) at(x, y float64) pt {
	return pt{p.x0 + p.x.fraction(x)*p.w(), p.y0 + p.y.fraction(y)*p.h()}
}

// path maps a line of values to the page.
func (p *panel) path(x, y []float64) line {
	l := line{pts: make([]pt, len(x))}
	for i := range x {
		l.pts[i] = p.at(x[i], y[i])
	}
	return l
}

// paths is path in stretches of finite values.
func (p *panel) paths(x, y []float64) []line {
	var out []line
	for i := 0; i < len(x); {
		j := i
		for j < len(x) && finite(y[j]) {
			j++
		}
		out = append(out, p.path(x[i:j], y[i:j]))
		i = j + 1
	}
	return out
}

// curve strokes a line of values inside the panel.
func (c *canvas) curve(p *panel, x, y []float64, k pen) {
	c.stroke(clipStroke(thin(p.paths(x, y)), p.rect), k)
}

// band fills between two lines of values, in stretches where both are finite.
func (c *canvas) band(p *panel, x, lo, hi []float64, k ink, alpha float64) {
	for _, l := range p.between(x, lo, hi) {
		c.fill(thin([]line{l}), k, alpha)
	}
}

// between is the area between two lines of values.
func (p *panel) between(x, lo, hi []float64) []line {
	var out []line
	for i := 0; i < len(x); {
		j := i
		for j < len(x) && finite(lo[j]) && finite(hi[j]) {
			j++
		}
		if j-i > 1 {
			l := p.path(x[i:j], lo[i:j])
			up := p.path(x[i:j], hi[i:j])
			for n := len(up.pts) - 1; n >= 0; n-- {
				l.pts = append(l.pts, up.pts[n])
			}
			l.closed = true
			out = append(out, clipFill([]line{l}, p.rect)...)
		}
		i = j + 1
	}
	return out
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// Lines of axes: thin, ticks outside, no box.
const (
	axisWidth  = 0.6
	tickLength = 2.6
	tickGap    = 1.8
)

// axes draws the two axes of a panel: a line below and one at the left, ticks outside; the title of the
// horizontal axis is centred below, that of the vertical one stands upright above it, where it reads without
// turning the page.
func (c *canvas) axes(p *panel) {
	k := pen{ink: inkText, width: axisWidth}
	c.stroke([]line{{pts: []pt{{p.x0, p.y1}, {p.x0, p.y0}, {p.x1, p.y0}}}}, k)
	c.ticksBelow(p, k)
	c.ticksLeft(p, k)
	if len(p.x.title) > 0 {
		c.text(p.x.title, (p.x0+p.x1)/2, p.y0-belowAxis(p.x)+2.5, textStyle{size: titleSize, ink: inkText, h: 0.5})
	}
	if len(p.y.title) > 0 {
		c.text(p.y.title, p.x0-leftOfAxis(p.y), p.y1+7, textStyle{size: titleSize, ink: inkText})
	}
}

func (c *canvas) ticksBelow(p *panel, k pen) {
	for _, t := range p.x.ticks {
		at := p.at(t.at, p.y.lo)
		n := tickLength
		if t.label == nil {
			n *= 0.6
		}
		c.segment(at.x, p.y0, at.x, p.y0-n, k)
		s := textStyle{size: tickSize, ink: inkText, h: 0.5, v: 1}
		if p.x.turned {
			s.h, s.v, s.angle = 1, 0.5, math.Pi/2
		}
		if !p.x.bare {
			c.text(t.label, at.x, p.y0-tickLength-tickGap, s)
		}
	}
}

func (c *canvas) ticksLeft(p *panel, k pen) {
	for _, t := range p.y.ticks {
		at := p.at(p.x.lo, t.at)
		n := tickLength
		if t.label == nil {
			n *= 0.6
		}
		c.segment(p.x0, at.y, p.x0-n, at.y, k)
		if !p.y.bare {
			c.text(t.label, p.x0-tickLength-tickGap, at.y, textStyle{size: tickSize, ink: inkText, h: 1, v: 0.5})
		}
	}
}

// leftOfAxis is the room that ticks and their labels take at the left.
func leftOfAxis(a axis) float64 {
	w := a.room
	if !a.bare {
		for _, t := range a.ticks {
			w = max(w, t.label.measure(tickSize))
		}
	}
	return w + tickLength + tickGap
}

// belowAxis is the room that ticks, labels and title take below, down to the foot of the title's descenders.
func belowAxis(a axis) float64 {
	h := tickLength
	if !a.bare {
		h += tickGap + capHeight*tickSize
	}
	if len(a.title) > 0 {
		h += 4 + capHeight*titleSize + 2.5
	}
	return h
}

// aboveAxis is the room that the title of the vertical axis takes on top.
const aboveAxis = 7 + titleSize
