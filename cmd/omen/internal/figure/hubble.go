package figure

import (
	"errors"
	"fmt"
	"math"
)

// Band is a function over redshift or time with its posterior bands, tabulated at X, ascending. The bands may be
// nil; where a value is NaN nothing is drawn.
type Band struct {
	X          []float64
	Best       []float64 // the best fit
	Lo68, Hi68 []float64
	Lo95, Hi95 []float64
}

func (b *Band) check(name string) error {
	if len(b.X) < 2 || len(b.Best) != len(b.X) {
		return fmt.Errorf("figure: %s: %d abscissae and %d values of the best fit", name, len(b.X), len(b.Best))
	}
	for _, s := range [][]float64{b.Lo68, b.Hi68, b.Lo95, b.Hi95} {
		if s != nil && len(s) != len(b.X) {
			return fmt.Errorf("figure: %s: a band of %d values at %d abscissae", name, len(s), len(b.X))
		}
	}
	return nil
}

// best interpolates the best fit linearly in ln x, NaN outside.
func (b *Band) best(x float64) float64 {
	for i := 1; i < len(b.X); i++ {
		if x >= b.X[i-1] && x <= b.X[i] {
			t := math.Log(x/b.X[i-1]) / math.Log(b.X[i]/b.X[i-1])
			return b.Best[i-1] + t*(b.Best[i]-b.Best[i-1])
		}
	}
	return math.NaN()
}

// relative maps every value v of the band to f(v, best).
func (b *Band) relative(f func(v, best float64) float64) Band {
	apply := func(s []float64) []float64 {
		if s == nil {
			return nil
		}
		out := make([]float64, len(s))
		for i := range s {
			out[i] = f(s[i], b.Best[i])
		}
		return out
	}
	return Band{b.X, apply(b.Best), apply(b.Lo68), apply(b.Hi68), apply(b.Lo95), apply(b.Hi95)}
}

// Points are measurements of one kind: a data set of supernovae, or one BAO quantity.
type Points struct {
	Name  Label
	Z     []float64 // redshift, positive
	Value []float64
	Err   []float64 // standard deviation
	Best  []float64 // the best fit at each point; nil to interpolate the band
}

func (p *Points) check() error {
	n := len(p.Z)
	if n == 0 || len(p.Value) != n || len(p.Err) != n || p.Best != nil && len(p.Best) != n {
		return fmt.Errorf("figure: %s: %d redshifts, %d values, %d errors", p.Name, n, len(p.Value), len(p.Err))
	}
	for i, z := range p.Z {
		if !(z > 0) || !finite(p.Value[i]) || !(p.Err[i] >= 0) {
			return fmt.Errorf("figure: %s: point %d at z = %g is %g ± %g", p.Name, i+1, z, p.Value[i], p.Err[i])
		}
	}
	return nil
}

func (p *Points) best(i int, b *Band) float64 {
	if p.Best != nil {
		return p.Best[i]
	}
	return b.best(p.Z[i])
}

// BAO is one quantity measured at several redshifts with its model.
type BAO struct {
	Points
	Model Band
}

// Hubble is the input of the Hubble diagram. Either of supernovae and BAO may be missing.
type Hubble struct {
	Magnitude  Label    // title of the vertical axis, with unit: distance modulus or magnitude
	Supernovae []Points // in the unit of Magnitude, offsets between sets already applied
	Model      Band     // in the same unit, dense enough to interpolate
	BAO        []BAO
	Unfinished bool
}

// manyPoints is how many supernovae are drawn one by one with errors; more are drawn faintly below binned points.
const manyPoints = 150

// hubbleRoom is for the tick labels at the left of every panel, so that the titles above them line up.
const hubbleRoom = 24.

// DrawHubble draws the Hubble diagram, residuals from the best fit below it, and BAO ratios to the best fit
// in a panel of their own.
func DrawHubble(in Hubble, width Width) (*Figure, error) {
	if err := in.check(); err != nil {
		return nil, err
	}
	sn, bao := len(in.Supernovae) > 0, len(in.BAO) > 0
	var panels []float64 // heights, top to bottom
	if sn {
		panels = append(panels, 118, 62)
	}
	if bao {
		panels = append(panels, 84)
	}
	if width == Page {
		for i := range panels {
			panels[i] *= 1.35
		}
	}
	const gap = aboveAxis + 10
	x := in.redshifts(width.points() - 42)
	height := 1 + belowAxis(x) + 2
	for _, h := range panels {
		height += h + gap
	}
	f := newFigure("Hubble diagram", width, height-10)
	top := f.h - aboveAxis - 2
	next := func(h float64) rect {
		r := rect{31, top - h, f.w - 6, top}
		top -= h + gap
		return r
	}
	if sn {
		in.drawDiagram(f, next(panels[0]), x)
		in.drawResiduals(f, next(panels[1]), x, !bao)
	}
	if bao {
		in.drawBAO(f, next(panels[len(panels)-1]), x)
	}
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

func (in *Hubble) check() error {
	if len(in.Supernovae) == 0 && len(in.BAO) == 0 {
		return errors.New("figure: a Hubble diagram needs supernovae or BAO")
	}
	for i := range in.Supernovae {
		if err := in.Supernovae[i].check(); err != nil {
			return err
		}
	}
	if len(in.Supernovae) > 0 {
		if err := in.Model.check("model of the supernovae"); err != nil {
			return err
		}
	}
	for i := range in.BAO {
		if err := in.BAO[i].check(); err != nil {
			return err
		}
		if err := in.BAO[i].Model.check(in.BAO[i].Name.String()); err != nil {
			return err
		}
	}
	return nil
}

// redshifts is the axis over the range of the data with a margin, w points long.
func (in *Hubble) redshifts(w float64) axis {
	lo, hi := math.Inf(1), 0.
	add := func(p Points) {
		for _, z := range p.Z {
			lo, hi = min(lo, z), max(hi, z)
		}
	}
	for _, s := range in.Supernovae {
		add(s)
	}
	for _, b := range in.BAO {
		add(b.Points)
	}
	margin := math.Pow(hi/lo, 0.04) * 1.06
	lo, hi = lo/margin, hi*margin
	title := append(Plain("redshift "), Markup("*z*")...)
	return axis{lo: lo, hi: hi, log: true, ticks: logTicks(lo, hi, w), title: title}
}

func (in *Hubble) drawDiagram(f *Figure, r rect, x axis) {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, s := range in.Supernovae {
		for i, v := range s.Value {
			lo, hi = min(lo, v-s.Err[i]), max(hi, v+s.Err[i])
		}
	}
	y := padded(lo, hi, 0.05)
	y.ticks, y.title, y.room = linearTicks(y.lo, y.hi, 5), in.Magnitude, hubbleRoom
	x.bare, x.title = true, nil
	p := &panel{r, x, y}
	f.bands(p, &in.Model, 0)
	f.curve(p, in.Model.X, in.Model.Best, pen{ink: inkText, width: 0.8})
	for i := range in.Supernovae {
		s := &in.Supernovae[i]
		s.draw(f, p, i, in.many(), func(k int) float64 { return s.Value[k] })
		if in.many() {
			r := s.residuals(&in.Model)
			b := r.binned()
			b.draw(f, p, i, false, func(k int) float64 { return in.Model.best(b.Z[k]) + b.Value[k] })
		}
	}
	f.axes(p)
	in.legend(f, p)
}

// many tells whether there are too many points to draw each with its error.
func (in *Hubble) many() bool {
	n := 0
	for _, s := range in.Supernovae {
		n += len(s.Z)
	}
	return n > manyPoints
}

// legend names the data sets at the lower right of the diagram, which a rising curve leaves free.
func (in *Hubble) legend(f *Figure, p *panel) {
	y := p.y0 + 5 + 10*float64(len(in.Supernovae))
	for i, s := range in.Supernovae {
		name := s.Name.shorten(0.6*p.w(), tickSize)
		w := name.measure(tickSize)
		f.text(name, p.x1-4, y, textStyle{size: tickSize, ink: inkText, h: 1})
		at := pt{p.x1 - 4 - w - 6, y + 2.6}
		if in.many() {
			f.dots([]pt{{at.x - 7, at.y + 1}, {at.x - 8.5, at.y - 1.2}, {at.x - 10.5, at.y + 0.4}}, 1.1, fillInk(i), 0.6)
		}
		f.marks([]pt{at}, markers(i), 3.4, lineInk(i))
		y -= 10
	}
	note := "line: best fit"
	if in.Model.Lo68 != nil {
		note += "; bands: 68% and 95%"
	}
	f.text(Plain(note), p.x1-4, y, textStyle{size: noteSize, ink: inkSoft, h: 1})
}

// draw marks the points, value(i) being where: all with errors, or faintly.
func (s *Points) draw(f *Figure, p *panel, series int, faint bool, value func(int) float64) {
	var at []pt
	var bars []line
	for i, z := range s.Z {
		v := value(i)
		if c := p.at(z, v); p.holds(c) {
			at = append(at, c)
		}
		bars = append(bars, p.path([]float64{z, z}, []float64{v - s.Err[i], v + s.Err[i]}))
	}
	if faint {
		f.dots(at, 1.1, fillInk(series), 0.45)
		return
	}
	f.stroke(clipStroke(bars, p.rect), pen{ink: lineInk(series), width: 0.5})
	f.marks(at, markers(series), 2.8, lineInk(series))
}

func (in *Hubble) drawResiduals(f *Figure, r rect, x axis, last bool) {
	most := 0.0
	var sets []Points
	for i := range in.Supernovae {
		s := in.Supernovae[i].residuals(&in.Model)
		if in.many() {
			b := s.binned()
			for k, v := range b.Value {
				most = max(most, math.Abs(v)+1.3*b.Err[k])
			}
			most = max(most, 1.2*spread(s.Value))
		} else {
			for k, v := range s.Value {
				most = max(most, math.Abs(v)+s.Err[k])
			}
		}
		sets = append(sets, s)
	}
	y := axis{lo: -1.08 * most, hi: 1.08 * most, room: hubbleRoom, title: Plain("residual (mag)")}
	y.ticks = someTicks(y.lo, y.hi, 2, 3)
	if !last {
		x.bare, x.title = true, nil
	}
	p := &panel{r, x, y}
	rel := in.Model.relative(func(v, best float64) float64 { return v - best })
	f.bands(p, &rel, 0)
	f.curve(p, []float64{x.lo, x.hi}, []float64{0, 0}, pen{ink: inkText, width: 0.6})
	for i := range sets {
		sets[i].draw(f, p, i, in.many(), func(k int) float64 { return sets[i].Value[k] })
	}
	if in.many() {
		for i := range sets {
			b := sets[i].binned()
			b.draw(f, p, i, false, func(k int) float64 { return b.Value[k] })
		}
		f.text(Plain("binned; errors without correlations"), p.x1-4, p.y1+7, textStyle{size: noteSize, ink: inkSoft, h: 1})
	}
	f.axes(p)
}

func (s *Points) residuals(model *Band) Points {
	out := Points{Name: s.Name}
	for i, z := range s.Z {
		if b := s.best(i, model); finite(b) {
			out.Z, out.Value, out.Err = append(out.Z, z), append(out.Value, s.Value[i]-b), append(out.Err, s.Err[i])
		}
	}
	return out
}

// spread is the root mean square.
func spread(v []float64) float64 {
	sum := 0.0
	for _, x := range v {
		sum += x * x
	}
	return math.Sqrt(sum / float64(max(1, len(v))))
}

// binned averages points in even bins of ln z with weights 1/Err² (their independence is assumed). Bins with few
// points join their neighbour.
func (s *Points) binned() Points {
	lo, hi := math.Inf(1), 0.
	for _, z := range s.Z {
		lo, hi = min(lo, z), max(hi, z)
	}
	const bins = 18
	var w, wz, wv [bins]float64
	var n [bins]int
	for i, z := range s.Z {
		k := min(bins-1, int(bins*math.Log(z/lo)/math.Log(hi/lo*(1+1e-9))))
		g := 1 / (s.Err[i] * s.Err[i])
		n[k]++
		w[k] += g
		wz[k] += g * math.Log(z)
		wv[k] += g * s.Value[i]
	}
	out := Points{Name: s.Name}
	for k := range bins {
		if few := max(5, len(s.Z)/200); n[k] < few && k+1 < bins {
			n[k+1], w[k+1], wz[k+1], wv[k+1] = n[k+1]+n[k], w[k+1]+w[k], wz[k+1]+wz[k], wv[k+1]+wv[k]
			continue
		}
		if n[k] > 0 {
			out.Z = append(out.Z, math.Exp(wz[k]/w[k]))
			out.Value, out.Err = append(out.Value, wv[k]/w[k]), append(out.Err, 1/math.Sqrt(w[k]))
		}
	}
	return out
}

// bands fills the 95% and the 68% band of a series.
func (f *Figure) bands(p *panel, b *Band, series int) {
	if b.Lo95 != nil && b.Hi95 != nil {
		f.band(p, b.X, b.Lo95, b.Hi95, fillInk(series), 0.22)
	}
	if b.Lo68 != nil && b.Hi68 != nil {
		f.band(p, b.X, b.Lo68, b.Hi68, fillInk(series), 0.32)
	}
}

func (in *Hubble) drawBAO(f *Figure, r rect, x axis) {
	most := 0.0
	var rel []Points
	for i := range in.BAO {
		s := in.BAO[i].Points
		q := Points{Name: s.Name, Z: s.Z}
		for k := range s.Z {
			b := s.best(k, &in.BAO[i].Model)
			q.Value, q.Err = append(q.Value, s.Value[k]/b), append(q.Err, s.Err[k]/b)
			most = max(most, math.Abs(s.Value[k]/b-1)+s.Err[k]/b)
		}
		rel = append(rel, q)
	}
	// The names stand in the strip left free below the points.
	y := axis{lo: 1 - 1.5*most, hi: 1 + 1.1*most, room: hubbleRoom, title: Plain("BAO: measured / best fit")}
	y.ticks = someTicks(y.lo, y.hi, 3, 3)
	p := &panel{r, x, y}
	for i := range in.BAO {
		b := in.BAO[i].Model.relative(func(v, best float64) float64 { return v / best })
		if b.Lo68 != nil && b.Hi68 != nil {
			f.band(p, b.X, b.Lo68, b.Hi68, fillInk(i+1), 0.2)
		}
		for _, e := range [][]float64{b.Lo95, b.Hi95} {
			if e != nil { // bands of several quantities overlap; the outer ones are lines
				f.curve(p, b.X, e, pen{ink: lineInk(i + 1), width: 0.45, dash: dashes(i + 1)})
			}
		}
	}
	f.curve(p, []float64{x.lo, x.hi}, []float64{1, 1}, pen{ink: inkText, width: 0.6})
	for i := range rel {
		rel[i].draw(f, p, i+1, false, func(k int) float64 { return rel[i].Value[k] })
	}
	f.axes(p)
	at := p.x0 + 6.
	for i, s := range rel {
		f.marks([]pt{{at, p.y0 + 7.6}}, markers(i+1), 3.6, lineInk(i+1))
		f.text(s.Name, at+5, p.y0+5, textStyle{size: tickSize, ink: inkText})
		at += s.Name.measure(tickSize) + 18
	}
}

// padded is an axis over an interval with a margin on either side.
func padded(lo, hi, margin float64) axis {
	if !(hi > lo) {
		d := max(math.Abs(lo)*0.1, 1e-9)
		lo, hi = lo-d, hi+d
	}
	d := margin * (hi - lo)
	return axis{lo: lo - d, hi: hi + d}
}
