package figure

import (
	"errors"
	"fmt"
	"math"

	"omen/cmd/omen/internal/density"
)

// Set is the posterior of one data set, one combination or one run in a plane: draws, or a tabulated density.
type Set struct {
	Name    Label
	X, Y    []float64        // draws
	Weights []float64        // of the draws; nil for equal ones
	ESS     float64          // how many independent draws they are worth; zero if they are independent
	Density *density.Surface // instead of draws, a density from quadrature
	Best    *[2]float64      // the best fit, marked by a cross; nil for none
	Line    bool             // the draws lie on a straight line, which is drawn thick over 68% and thin over 95%
}

// Divider is a line between two kinds of universe. Walking along it, Left and Right are what lies on either side.
type Divider struct {
	X, Y        []float64
	Left, Right Label
	Exclude     bool // hatch what lies to the left, as excluded by assumption
}

// Plane is the input of the figure of regions in a plane.
type Plane struct {
	X, Y           Label         // axis titles, with unit
	XEdges, YEdges density.Edges // hard edges of the prior; the zero value stands for none
	Sets           []Set         // drawn in this order, the combination last
	Dividers       []Divider
	Frame          *[4]float64 // lowest and highest x, lowest and highest y; nil to fit the regions
	Unfinished     bool
}

// outlines is a set ready to draw.
type outlines struct {
	name     Label
	r68, r95 []density.Loop
	best     *[2]float64
	// of a set on a line, in place of regions
	s68, s95 []stretchOf
}

// stretchOf is a part of a straight line.
type stretchOf struct{ x, y [2]float64 }

// DrawPlane draws the regions of highest density that hold 68% and 95% of each set.
func DrawPlane(in Plane, width Width) (*Figure, error) {
	if len(in.Sets) == 0 {
		return nil, errors.New("figure: a plane needs at least one set of draws")
	}
	var sets []outlines
	for _, s := range in.Sets {
		o, err := s.outlines(edges(in.XEdges), edges(in.YEdges))
		if err != nil {
			return nil, fmt.Errorf("%s: %w", s.Name, err)
		}
		sets = append(sets, o)
	}
	height := 0.9 * width.points()
	if width == Page {
		height = 0.62 * width.points()
	}
	f := newFigure("Regions that hold 68% and 95% of the posterior", width, height)
	p := in.panel(f, sets)
	in.draw(f, p, sets)
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

// edges turns the zero value into no edges.
func edges(e density.Edges) density.Edges {
	if e == (density.Edges{}) {
		return density.NoEdges()
	}
	return e
}

func (s *Set) outlines(ex, ey density.Edges) (outlines, error) {
	d := s.Density
	if s.Line {
		return s.onLine()
	}
	if d == nil {
		var err error
		if d, err = density.Estimate2(s.X, s.Y, s.Weights, s.ESS, ex, ey); err != nil {
			return outlines{}, err
		}
	}
	return outlines{name: s.Name.shorten(100, titleSize), r68: d.Region(0.68), r95: d.Region(0.95), best: s.Best}, nil
}

// onLine finds the stretches of highest density of draws on a straight line.
func (s *Set) onLine() (outlines, error) {
	c, err := density.Estimate(s.X, s.Weights, s.ESS, density.NoEdges())
	if err != nil {
		return outlines{}, err
	}
	if len(s.Y) != len(s.X) {
		return outlines{}, fmt.Errorf("figure: %d draws of x and %d of y", len(s.X), len(s.Y))
	}
	lo, hi := 0, 0
	for i, x := range s.X {
		if x < s.X[lo] {
			lo = i
		}
		if x > s.X[hi] {
			hi = i
		}
	}
	y := func(x float64) float64 {
		return s.Y[lo] + (x-s.X[lo])/(s.X[hi]-s.X[lo])*(s.Y[hi]-s.Y[lo])
	}
	stretches := func(mass float64) (out []stretchOf) {
		for _, v := range c.Intervals(mass) {
			out = append(out, stretchOf{[2]float64{v.Lo, v.Hi}, [2]float64{y(v.Lo), y(v.Hi)}})
		}
		return out
	}
	return outlines{name: s.Name.shorten(100, titleSize), best: s.Best, s68: stretches(0.68), s95: stretches(0.95)}, nil
}

// rim is the points of all outlines of 95%, or of the line.
func (o *outlines) rim(p *panel) []line {
	out := loops(p, o.r95)
	for _, v := range o.s95 {
		l := line{}
		for k := range 21 {
			t := float64(k) / 20
			l.pts = append(l.pts, p.at(v.x[0]+t*(v.x[1]-v.x[0]), v.y[0]+t*(v.y[1]-v.y[0])))
		}
		out = append(out, l)
	}
	return out
}

// panel lays the axes out around the regions.
func (in *Plane) panel(f *Figure, sets []outlines) *panel {
	x, y := in.frame(sets)
	x.title, y.title = in.X, in.Y
	r := rect{0, 0, f.w - 7, f.h - aboveAxis - 3}
	x.ticks = linearTicks(x.lo, x.hi, 5)
	y.ticks = linearTicks(y.lo, y.hi, 5)
	r.x0, r.y0 = 2+leftOfAxis(y), 1+belowAxis(x)
	return &panel{r, x, y}
}

// frame is the box around all 95% regions with a margin, cut at the prior's edges.
func (in *Plane) frame(sets []outlines) (x, y axis) {
	if in.Frame != nil {
		v := in.Frame
		return axis{lo: v[0], hi: v[1]}, axis{lo: v[2], hi: v[3]}
	}
	box := rect{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	for _, s := range sets {
		for _, l := range s.r95 {
			for _, p := range l {
				box = rect{min(box.x0, p.X), min(box.y0, p.Y), max(box.x1, p.X), max(box.y1, p.Y)}
			}
		}
		for _, v := range s.s95 {
			box = rect{min(box.x0, v.x[0]), min(box.y0, v.y[0], v.y[1]), max(box.x1, v.x[1]), max(box.y1, v.y[0], v.y[1])}
		}
	}
	return cutAxis(padded(box.x0, box.x1, 0.18), edges(in.XEdges)), cutAxis(padded(box.y0, box.y1, 0.18), edges(in.YEdges))
}

func cutAxis(a axis, e density.Edges) axis {
	a.lo, a.hi = max(a.lo, e.Lo), min(a.hi, e.Hi)
	return a
}

func (in *Plane) draw(f *Figure, p *panel, sets []outlines) {
	taken := newOccupied(p.rect)
	for _, d := range in.Dividers {
		if d.Exclude {
			area := clipFill([]line{d.leftSide(p)}, p.rect)
			f.fill(area, inkRule, 0.18)
			f.stroke(hatch(area, math.Pi/4, 4), pen{ink: inkRule, width: 0.35})
		}
		taken.lines([]line{p.path(d.X, d.Y)}, 5)
	}
	for _, d := range in.Dividers {
		f.curve(p, d.X, d.Y, pen{ink: inkSoft, width: 0.55, dash: []float64{3, 2}})
	}
	for i, s := range sets {
		f.region(p, s.r95, i, 0.28)
		f.region(p, s.r68, i, 0.42)
		taken.area(loops(p, s.r95), 0.8)
		for _, l := range loops(p, append(append([]density.Loop(nil), s.r95...), s.r68...)) {
			taken.lines([]line{l.closedUp()}, 3)
		}
	}
	key := "regions of 68% and 95%"
	for i, s := range sets {
		f.regionLines(p, s, i)
		if len(s.s95) > 0 {
			f.stretches(p, s, i)
			taken.lines(s.rim(p), 5)
			key = "68% and 95%: regions, lines thick and thin"
		}
	}
	f.axes(p)
	f.text(Plain(key), p.x1, p.y1+4, textStyle{size: noteSize, ink: inkSoft, h: 1})
	in.nameSets(f, p, sets, taken)
	for _, d := range in.Dividers {
		f.nameSides(p, d, taken)
	}
}

// loops maps the outlines of a region to the page.
func loops(p *panel, region []density.Loop) []line {
	var out []line
	for _, l := range region {
		q := line{closed: true, pts: make([]pt, len(l))}
		for i, v := range l {
			q.pts[i] = p.at(v.X, v.Y)
		}
		out = append(out, q)
	}
	return out
}

func (f *Figure) region(p *panel, region []density.Loop, series int, alpha float64) {
	f.fill(thin(clipFill(loops(p, region), p.rect)), fillInk(series), alpha)
}

// regionLines strokes the outlines in the dashes of the series and marks the best fit.
func (f *Figure) regionLines(p *panel, s outlines, series int) {
	k := pen{ink: lineInk(series), width: 0.8, dash: dashes(series)}
	f.stroke(clipStroke(thin(loops(p, s.r95)), p.rect), k)
	f.stroke(clipStroke(thin(loops(p, s.r68)), p.rect), k)
	if s.best != nil && p.holds(p.at(s.best[0], s.best[1])) {
		f.marks([]pt{p.at(s.best[0], s.best[1])}, cross, 4, lineInk(series))
	}
}

// stretches draws a set on a line, on white so that it shows across regions.
func (f *Figure) stretches(p *panel, s outlines, series int) {
	draw := func(of []stretchOf, k pen) {
		for _, v := range of {
			f.stroke(clipStroke([]line{p.path(v.x[:], v.y[:])}, p.rect), k)
		}
	}
	draw(s.s95, pen{ink: inkPaper, width: 2.4})
	draw(s.s95, pen{ink: lineInk(series), width: 1.2})
	draw(s.s68, pen{ink: inkPaper, width: 4.2})
	draw(s.s68, pen{ink: lineInk(series), width: 3})
}

// leftSide is the part of the plane to the left of a divider: the line closed around the frame, at a distance.
func (d *Divider) leftSide(p *panel) line {
	l := p.path(d.X, d.Y)
	n := len(l.pts)
	a, b := l.pts[0], l.pts[n-1]
	dir := pt{b.x - a.x, b.y - a.y}
	norm := math.Hypot(dir.x, dir.y)
	far := 4 * (p.w() + p.h())
	out := pt{-dir.y / norm * far, dir.x / norm * far}
	l.pts = append(l.pts, pt{b.x + out.x, b.y + out.y}, pt{a.x + out.x, a.y + out.y})
	l.closed = true
	return l
}

// nameSets writes the name of each set next to its region, with the key to the two shades once.
func (in *Plane) nameSets(f *Figure, p *panel, sets []outlines, taken *occupied) {
	for i, s := range sets {
		var spots []spot
		for _, l := range s.rim(p) {
			for k := 0; k < len(l.pts); k += max(1, len(l.pts)/60) {
				spots = append(spots, around(l.pts[k], lineInk(i))...)
			}
		}
		if !f.put(taken, s.name, spots, 0.9) {
			f.put(taken, s.name, corners(p, lineInk(i)), 10)
		}
	}
}

// around are places for a label beside a point of an outline, the nearer ones preferred.
func around(c pt, k ink) []spot {
	var out []spot
	for _, d := range [7]float64{4, 8, 14, 24, 36, 50, 70} {
		for a := range 8 {
			sin, cos := math.Sincos(float64(a) * math.Pi / 4)
			s := textStyle{size: titleSize, ink: k, h: 0.5 - 0.5*cos, v: 0.5 - 0.5*sin}
			q := spot{x: c.x + d*cos, y: c.y + d*sin, style: s, penalty: d * 0.006}
			if d > 10 {
				q.leader = &pt{c.x, c.y}
			}
			out = append(out, q)
		}
	}
	return out
}

func corners(p *panel, k ink) []spot {
	s := textStyle{size: titleSize, ink: k}
	return []spot{
		{x: p.x1 - 5, y: p.y1 - 5, style: textStyle{size: s.size, ink: k, h: 1, v: 1}},
		{x: p.x0 + 5, y: p.y1 - 5, style: textStyle{size: s.size, ink: k, v: 1}, penalty: 0.01},
		{x: p.x1 - 5, y: p.y0 + 5, style: textStyle{size: s.size, ink: k, h: 1}, penalty: 0.02},
		{x: p.x0 + 5, y: p.y0 + 5, style: s, penalty: 0.03},
	}
}

// nameSides writes what lies on either side of a divider along it, both at the same place.
func (f *Figure) nameSides(p *panel, d Divider, taken *occupied) {
	l := clipStroke([]line{p.path(d.X, d.Y)}, p.rect)
	wl, wr := d.Left.measure(noteSize), d.Right.measure(noteSize)
	left, right := alongLine(l, 1, max(wl, wr)), alongLine(l, -1, max(wl, wr))
	best, price := -1, 0.9
	for i := range left {
		v := left[i].penalty
		if len(d.Left) > 0 {
			v += taken.price(labelBox(wl, left[i]))
		}
		if len(d.Right) > 0 {
			v += taken.price(labelBox(wr, right[i]))
		}
		if v < price {
			best, price = i, v
		}
	}
	if best >= 0 {
		f.put(taken, d.Left, left[best:best+1], math.Inf(1))
		f.put(taken, d.Right, right[best:best+1], math.Inf(1))
	}
}

// alongLine are places for a label of width w parallel to a line, on its left for sign +1.
func alongLine(path []line, sign, w float64) []spot {
	var out []spot
	for _, l := range path {
		arc, total := arcLengths(l.pts)
		for s := w / 2; s < total-w/2; s += 3 {
			a, b := atArc(l.pts, arc, s-w/2), atArc(l.pts, arc, s+w/2)
			angle := math.Atan2(b.y-a.y, b.x-a.x)
			off := pt{-math.Sin(angle) * sign, math.Cos(angle) * sign}
			m := atArc(l.pts, arc, s)
			bend := math.Abs((m.x-a.x)*off.x + (m.y-a.y)*off.y)
			v := 0.0 // the text stands on the line
			if math.Cos(angle) < 0 {
				angle += math.Pi
				v = 1 - v
			}
			if sign < 0 {
				v = 1 - v
			}
			d := 2.8 + bend
			// The middle of the line is preferred a little.
			out = append(out, spot{x: m.x + d*off.x, y: m.y + d*off.y,
				style:   textStyle{size: noteSize, ink: inkSoft, h: 0.5, v: v, angle: angle, halo: true},
				penalty: 0.02*bend + 0.03*math.Abs(2*s/total-1)})
		}
	}
	return out
}

func arcLengths(p []pt) ([]float64, float64) {
	out := make([]float64, len(p))
	for i := 1; i < len(p); i++ {
		out[i] = out[i-1] + math.Hypot(p[i].x-p[i-1].x, p[i].y-p[i-1].y)
	}
	return out, out[len(out)-1]
}

func atArc(p []pt, arc []float64, s float64) pt {
	for i := 1; i < len(p); i++ {
		if s <= arc[i] {
			return along(p[i-1], p[i], (s-arc[i-1])/(arc[i]-arc[i-1]))
		}
	}
	return p[len(p)-1]
}
