package figure

import (
	"fmt"
	"math"

	"omen/cmd/omen/internal/density"
)

// Parameter is one parameter of the matrix of marginals.
type Parameter struct {
	Symbol, Unit Label
	Draws        []float64
	Edges        density.Edges  // hard edges of its prior; the zero value stands for none
	PriorX       []float64      // where the prior density is tabulated, ascending; nil to leave it out
	PriorP       []float64      // the prior density there
	Density      *density.Curve // instead of draws, the marginal from quadrature
	Best         float64        // the best fit; NaN for none
}

// Marginals is the input of the matrix of one- and two-dimensional marginals.
type Marginals struct {
	Parameters []Parameter // one to six
	Weights    []float64   // of the draws; nil for equal ones
	ESS        float64     // independent draws they are worth; zero if they are independent
	// Surfaces are joint marginals from quadrature to be used instead of draws: [2]int{i, j} with i < j has
	// parameter i along x and j along y.
	Surfaces   map[[2]int]*density.Surface
	Unfinished bool
}

const mostParameters = 6

// DrawMarginals draws the marginal of every parameter on the diagonal and of every pair below it.
func DrawMarginals(in Marginals, width Width) (*Figure, error) {
	n := len(in.Parameters)
	if n == 0 || n > mostParameters {
		return nil, fmt.Errorf("figure: %d parameters in the marginals; between 1 and %d can be read", n, mostParameters)
	}
	m := matrix{in: &in, curves: make([]*density.Curve, n), axes: make([]axis, n)}
	for i, p := range in.Parameters {
		c, err := p.curve(in.Weights, in.ESS)
		if err != nil {
			return nil, fmt.Errorf("%s: %w", p.Symbol, err)
		}
		m.curves[i], m.axes[i] = c, p.axis(c)
	}
	m.lay(width)
	for row := range n {
		m.diagonal(row)
		for col := range row {
			if err := m.pair(col, row); err != nil {
				return nil, fmt.Errorf("%s, %s: %w", in.Parameters[col].Symbol, in.Parameters[row].Symbol, err)
			}
		}
	}
	m.key()
	m.f.stampUnfinished(in.Unfinished)
	return m.f, nil
}

func (p *Parameter) curve(w []float64, ess float64) (*density.Curve, error) {
	if p.PriorX != nil && len(p.PriorX) != len(p.PriorP) {
		return nil, fmt.Errorf("figure: a prior of %d values at %d places", len(p.PriorP), len(p.PriorX))
	}
	if p.Density != nil {
		return p.Density, nil
	}
	return density.Estimate(p.Draws, w, ess, edges(p.Edges))
}

// axis spans the region that holds all but 0.2%, with a margin up to the edges of the prior.
func (p *Parameter) axis(c *density.Curve) axis {
	iv := c.Intervals(0.998)
	a := cutAxis(padded(iv[0].Lo, iv[len(iv)-1].Hi, 0.06), edges(p.Edges))
	a.title = p.Symbol
	return a
}

// matrix is the layout of the panels.
type matrix struct {
	in        *Marginals
	f         *Figure
	curves    []*density.Curve
	axes      []axis
	left      float64 // of the first column
	bottom    float64 // of the last row
	w, h      float64 // of a panel
	lines     int     // of axis titles: 1, or 2 with the unit below the symbol
	unitsLeft []Label // units for which an axis had no room
	turned    bool    // labels of the horizontal axes stand upright to fit
}

const matrixGap = 5.

func (m *matrix) lay(width Width) {
	n := float64(len(m.axes))
	total := width.points()
	m.left = 30 // a first guess, to choose ticks
	m.w = (total - m.left - 4 - (n-1)*matrixGap) / n
	for _, turned := range []bool{false, true} {
		m.turned = turned
		least := mostParameters
		for i := range m.axes {
			m.axes[i].ticks = fittingTicks(m.axes[i], m.w, turned)
			least = min(least, len(m.axes[i].ticks))
		}
		if least > 1 {
			break
		}
	}
	label := 0.0
	for _, a := range m.axes[1:] {
		label = max(label, leftOfAxis(a))
	}
	m.left = label + 7 + titleSize
	if n == 1 {
		m.left = 6
	}
	m.w = (total - m.left - 5 - (n-1)*matrixGap) / n
	m.h = min(m.w, 150)
	if n == 1 {
		m.h = 0.55 * m.w
	}
	m.lines = 1
	for _, p := range m.in.Parameters {
		if len(p.Unit) > 0 {
			m.lines = 2
		}
	}
	m.bottom = m.belowTicks() + belowAxis(m.axes[0]) + float64(m.lines-1)*9
	title := "Marginal posterior densities"
	m.f = newFigure(title, width, m.bottom+n*m.h+(n-1)*matrixGap+5)
}

// belowTicks is the extra height of labels that stand upright.
func (m *matrix) belowTicks() float64 {
	if !m.turned {
		return 0
	}
	w := 0.0
	for _, a := range m.axes {
		for _, t := range a.ticks {
			w = max(w, t.label.measure(tickSize))
		}
	}
	return w - capHeight*tickSize
}

// fittingTicks are at most n that leave room between their labels, and those away from the corners of the panel.
// Labels that stand upright, turned, take a line's height instead of their width.
func fittingTicks(a axis, w float64, turned bool) []tick {
	gap := 3.5
	if turned {
		gap = 1.2
	}
	for n := 5; n > 0; n-- {
		var inner []tick
		widest := 0.0
		for _, t := range linearTicks(a.lo, a.hi, n) {
			half := t.label.measure(tickSize) / 2
			if turned {
				half = 0.4 * tickSize
			}
			if at := a.fraction(t.at) * w; at > half-1.5 && at < w-half+1.5 {
				inner = append(inner, t)
				widest = max(widest, 2*half)
			}
		}
		if len(inner) == 1 || len(inner) > 1 && (inner[1].at-inner[0].at)/(a.hi-a.lo)*w > widest+gap {
			return inner
		}
	}
	return nil
}

// panel is the one in column col and row row, counted from the top left.
func (m *matrix) panel(col, row int, x, y axis) *panel {
	x0 := m.left + float64(col)*(m.w+matrixGap)
	y0 := m.bottom + float64(len(m.axes)-1-row)*(m.h+matrixGap)
	return &panel{rect{x0, y0, x0 + m.w, y0 + m.h}, x, y}
}

// diagonal draws the one-dimensional marginal: areas of 68% and 95%, the curve and the prior behind it. The areas
// are those of highest density, as the regions beside them must be: one key serves both, and where a prior cuts a
// curve they keep its peak, which a central interval would leave out. Tables have central intervals; the key says
// which these are.
func (m *matrix) diagonal(i int) {
	c, p := m.curves[i], &m.in.Parameters[i]
	top := 0.0
	for _, v := range c.P {
		top = max(top, v)
	}
	q := m.panel(i, i, m.axes[i], axis{lo: 0, hi: 1.12 * top})
	f := m.f
	if p.PriorX != nil {
		zero := make([]float64, len(p.PriorX))
		f.band(q, p.PriorX, zero, p.PriorP, inkRule, 0.3)
		f.curve(q, p.PriorX, p.PriorP, pen{ink: inkSoft, width: 0.6, dash: []float64{1.2, 1.2}})
	}
	for _, mass := range [2]float64{0.95, 0.68} {
		for _, v := range c.Intervals(mass) {
			x, y := stretch(c, v)
			f.band(q, x, make([]float64, len(x)), y, fillInk(0), 0.3)
		}
	}
	f.curve(q, c.X, c.P, pen{ink: lineInk(0), width: 0.9})
	if finite(p.Best) && p.Best > q.x.lo && p.Best < q.x.hi {
		f.marks([]pt{{q.at(p.Best, 0).x, q.y0}}, triangle, 4, inkText)
	}
	f.segment(q.x0, q.y0, q.x1, q.y0, pen{ink: inkText, width: axisWidth})
	m.below(q, i, i == len(m.axes)-1)
}

// stretch is the part of a curve over an interval.
func stretch(c *density.Curve, v density.Interval) (x, y []float64) {
	x, y = append(x, v.Lo), append(y, c.At(v.Lo))
	for i, at := range c.X {
		if at > v.Lo && at < v.Hi {
			x, y = append(x, at), append(y, c.P[i])
		}
	}
	return append(x, v.Hi), append(y, c.At(v.Hi))
}

// below draws the ticks under a panel, with labels and title in the last row.
func (m *matrix) below(q *panel, i int, last bool) {
	q.x.bare, q.x.turned = !last, m.turned
	m.f.ticksBelow(q, pen{ink: inkText, width: axisWidth})
	if !last {
		return
	}
	p := &m.in.Parameters[i]
	at := (q.x0 + q.x1) / 2
	y := q.y0 - m.belowTicks() - belowAxis(m.axes[i]) + 2.5
	both := WithUnit(p.Symbol, p.Unit)
	style := textStyle{size: titleSize, ink: inkText, h: 0.5}
	switch {
	case both.measure(titleSize) < q.w()+matrixGap:
		m.f.text(both, at, y, style)
	default:
		m.f.text(p.Symbol, at, y, style)
		if unit := parenthesised(p.Unit); unit.measure(noteSize) < q.w()+matrixGap {
			m.f.text(unit, at, y-9, textStyle{size: noteSize, ink: inkText, h: 0.5})
		} else {
			m.unitsLeft = append(m.unitsLeft, append(append(append(Label{}, p.Symbol...), Plain(" in ")...), p.Unit...))
		}
	}
}

func parenthesised(unit Label) Label {
	l := append(Plain("("), unit...)
	return append(l, run{text: ")"})
}

// pair draws the joint marginal of two parameters, col along x.
func (m *matrix) pair(col, row int) error {
	a, b := &m.in.Parameters[col], &m.in.Parameters[row]
	s := m.in.Surfaces[[2]int{col, row}]
	if s == nil {
		var err error
		s, err = density.Estimate2(a.Draws, b.Draws, m.in.Weights, m.in.ESS, edges(a.Edges), edges(b.Edges))
		if err != nil {
			return err
		}
	}
	q := m.panel(col, row, m.axes[col], m.axes[row])
	o := outlines{r68: s.Region(0.68), r95: s.Region(0.95)}
	if finite(a.Best) && finite(b.Best) {
		o.best = &[2]float64{a.Best, b.Best}
	}
	m.f.region(q, o.r95, 0, 0.28)
	m.f.region(q, o.r68, 0, 0.42)
	m.f.regionLines(q, o, 0)
	k := pen{ink: inkText, width: axisWidth}
	m.f.stroke([]line{{pts: []pt{{q.x0, q.y1}, {q.x0, q.y0}, {q.x1, q.y0}}}}, k)
	m.below(q, col, row == len(m.axes)-1)
	q.y.bare = col > 0
	m.f.ticksLeft(q, k)
	if col == 0 {
		title := WithUnit(b.Symbol, b.Unit)
		if title.measure(titleSize) > q.h()+matrixGap {
			title = b.Symbol
		}
		m.f.text(title, titleSize+0.5, (q.y0+q.y1)/2, textStyle{size: titleSize, ink: inkText, h: 0.5, angle: math.Pi / 2})
	}
	return nil
}

// key explains shades and marks in the free corner at the upper right.
func (m *matrix) key() {
	n := len(m.axes)
	if n == 1 {
		return
	}
	const height = 67. // of all rows and the margin
	col := min(n-1, int(math.Ceil(height/(m.h+matrixGap))))
	x := m.panel(col, 0, axis{}, axis{}).x0 + 6
	y := m.f.h - 14
	f := m.f
	note := textStyle{size: noteSize, ink: inkText, v: 0.5}
	swatch := func(text string, draw func(r rect)) {
		draw(rect{x, y - 3.2, x + 11, y + 3.2})
		f.text(Plain(text), x+16, y, note)
		y -= 11
	}
	f.text(Plain("highest density"), x, y, note)
	y -= 11
	for i, u := range m.unitsLeft {
		f.text(u, x+60, y-11*float64(i), note)
	}
	swatch("68%", func(r rect) {
		f.fill([]line{r.outline()}, fillInk(0), 0.28)
		f.fill([]line{r.outline()}, fillInk(0), 0.42)
	})
	swatch("95%", func(r rect) { f.fill([]line{r.outline()}, fillInk(0), 0.28) })
	prior, best := false, false
	for _, p := range m.in.Parameters {
		prior, best = prior || p.PriorX != nil, best || finite(p.Best)
	}
	if prior {
		swatch("prior", func(r rect) {
			f.fill([]line{r.outline()}, inkRule, 0.3)
			f.segment(r.x0, r.y1, r.x1, r.y1, pen{ink: inkSoft, width: 0.6, dash: []float64{1.2, 1.2}})
		})
	}
	if best {
		swatch("best fit", func(r rect) {
			c := pt{(r.x0 + r.x1) / 2, (r.y0 + r.y1) / 2}
			f.marks([]pt{{c.x - 3, c.y}}, cross, 4, lineInk(0))
			f.marks([]pt{{c.x + 3.5, c.y}}, triangle, 4, inkText)
		})
	}
}
