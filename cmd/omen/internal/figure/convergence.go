package figure

import (
	"errors"
	"fmt"
	"math"
)

// Trace is one parameter of the chain over the steps.
type Trace struct {
	Symbol          Label
	Ensembles       [][]float64 // mean of the walkers of every ensemble at every recorded step
	Autocorrelation []float64   // by lag in recorded steps, starting with 1 at lag zero; nil for none
	Time            float64     // integrated autocorrelation time in recorded steps; NaN for unknown
}

// Convergence is the input of the figure of convergence.
type Convergence struct {
	Traces     []Trace
	Every      float64 // steps of the chain per recorded step; zero means one
	BurnIn     float64 // steps taken as burn-in
	Checks     []Check // over the course of the run
	RhatGoal   float64 // the largest R-hat that counts as converged
	ESSGoal    float64 // effective samples asked for
	Unfinished bool
}

// Check is the state of the diagnostics after a number of steps.
type Check struct{ Step, Rhat, ESS float64 }

// DrawConvergence draws traces with burn-in shaded, autocorrelation, and R-hat and effective samples over steps.
func DrawConvergence(in Convergence, width Width) (*Figure, error) {
	steps, err := in.check()
	if err != nil {
		return nil, err
	}
	n := len(in.Traces)
	const trace, lower = 42., 62.
	below, above := belowAxis(axis{title: Plain("step")}), aboveAxis+3.
	rows := float64(n)*(trace+6) + 6
	lowerRows := 1.
	if width == Column {
		lowerRows = 3
	}
	height := 14 + rows + lowerRows*(lower+below+above) + below
	f := newFigure("Convergence of the chain", width, height)
	left := 38.
	for i := range in.Traces { // its symbol, and the labels of its axis
		left = max(left, in.Traces[i].Symbol.measure(titleSize)+6+leftOfAxis(in.traceAxis(i)))
	}
	top := f.h - 14
	for i := range in.Traces {
		r := rect{left, top - trace, f.w - 8, top}
		in.trace(f, r, i, steps, i == n-1)
		top -= trace + 6
	}
	top -= below + above - 6
	third := (f.w - 8 - left - 2*44) / 3
	x0 := left
	for _, draw := range []func(*Figure, rect, float64){in.autocorrelation, in.rhat, in.ess} {
		if width == Column {
			draw(f, rect{left, top - lower, f.w - 8, top}, steps)
			top -= lower + below + above
			continue
		}
		draw(f, rect{x0, top - lower, x0 + third, top}, steps)
		x0 += third + 44
	}
	f.stampUnfinished(in.Unfinished)
	return f, nil
}

func (in *Convergence) check() (steps float64, err error) {
	if len(in.Traces) == 0 {
		return 0, errors.New("figure: no traces to draw")
	}
	if in.Every == 0 {
		in.Every = 1
	}
	for _, t := range in.Traces {
		if len(t.Ensembles) == 0 {
			return 0, fmt.Errorf("figure: %s: no ensembles", t.Symbol)
		}
		for _, e := range t.Ensembles {
			if len(e) < 2 {
				return 0, fmt.Errorf("figure: %s: a trace of %d steps", t.Symbol, len(e))
			}
			steps = max(steps, float64(len(e))*in.Every)
		}
	}
	return steps, nil
}

// trace draws one parameter, one line per ensemble.
func (in *Convergence) trace(f *Figure, r rect, i int, steps float64, last bool) {
	t, y := in.Traces[i], in.traceAxis(i)
	x := axis{lo: 0, hi: steps, ticks: linearTicks(0, steps, 6), bare: !last}
	if last {
		x.title = Plain("step")
	}
	p := &panel{r, x, y}
	if in.BurnIn > 0 {
		b := rect{r.x0, r.y0, p.at(min(in.BurnIn, steps), y.lo).x, r.y1}
		f.fill([]line{b.outline()}, inkRule, 0.3)
		if i == 0 {
			f.text(Plain("burn-in"), b.x0+2, r.y1+3, textStyle{size: noteSize, ink: inkSoft})
		}
	}
	for k, e := range t.Ensembles {
		xs := make([]float64, len(e))
		for s := range xs {
			xs[s] = float64(s+1) * in.Every
		}
		f.stroke(clipStroke(envelope(p.path(xs, e)), r), pen{ink: lineInk(k), width: 0.4, alpha: 0.85})
	}
	f.axes(p)
	f.text(t.Symbol, r.x0-leftOfAxis(y)-4, (r.y0+r.y1)/2, textStyle{size: titleSize, ink: inkText, h: 1, v: 0.5})
	if i == 0 {
		f.text(Plain(fmt.Sprintf("mean of the walkers in each of %d ensembles", len(t.Ensembles))), r.x1-2, r.y1+3,
			textStyle{size: noteSize, ink: inkSoft, h: 1})
	}
}

// traceAxis spans all ensembles of a parameter.
func (in *Convergence) traceAxis(i int) axis {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, e := range in.Traces[i].Ensembles {
		for _, v := range e {
			lo, hi = min(lo, v), max(hi, v)
		}
	}
	y := padded(lo, hi, 0.05)
	y.ticks = someTicks(y.lo, y.hi, 2, 2)
	return y
}

// envelope keeps lowest and highest of the points that share a fifth of a point on the page.
func envelope(l line) []line {
	const w = 0.2
	var out []pt
	for i := 0; i < len(l.pts); {
		lo, hi := i, i
		j := i
		for ; j < len(l.pts) && l.pts[j].x-l.pts[i].x < w; j++ {
			if l.pts[j].y < l.pts[lo].y {
				lo = j
			}
			if l.pts[j].y > l.pts[hi].y {
				hi = j
			}
		}
		out = append(out, l.pts[min(lo, hi)])
		if lo != hi {
			out = append(out, l.pts[max(lo, hi)])
		}
		i = j
	}
	return []line{{pts: out}}
}

func (in *Convergence) autocorrelation(f *Figure, r rect, _ float64) {
	most := 0
	for _, t := range in.Traces {
		k := 0
		for k < len(t.Autocorrelation) && t.Autocorrelation[k] > 0.02 {
			k++
		}
		most = max(most, k)
	}
	hi := max(float64(most)*1.6, 4) * in.Every
	p := &panel{r, axis{lo: 0, hi: hi, ticks: linearTicks(0, hi, 5), title: Plain("lag (steps)")},
		axis{lo: -0.15, hi: 1, ticks: linearTicks(0, 1, 2), title: Plain("autocorrelation")}}
	f.curve(p, []float64{0, hi}, []float64{0, 0}, pen{ink: inkRule, width: 0.5})
	taken := newOccupied(r)
	for i, t := range in.Traces {
		x := make([]float64, len(t.Autocorrelation))
		for k := range x {
			x[k] = float64(k) * in.Every
		}
		f.curve(p, x, t.Autocorrelation, pen{ink: lineInk(i), width: 0.8, dash: dashes(i)})
		taken.lines([]line{p.path(x, t.Autocorrelation)}, 1)
	}
	f.axes(p)
	y := r.y1 - 2
	for i, t := range in.Traces {
		l := t.Symbol
		if finite(t.Time) {
			l = append(append(Label{}, l...), Markup(": *τ* = "+decimal(t.Time*in.Every, max(0, 1-int(math.Log10(t.Time*in.Every)))))...)
		}
		w := l.measure(noteSize)
		f.segment(r.x1-w-18, y-2.5, r.x1-w-4, y-2.5, pen{ink: lineInk(i), width: 0.8, dash: dashes(i)})
		f.text(l, r.x1, y, textStyle{size: noteSize, ink: inkText, h: 1, v: 1})
		y -= 9.5
	}
}

func (in *Convergence) rhat(f *Figure, r rect, steps float64) {
	hi := max(1+3*(in.RhatGoal-1), 1.002)
	var x, y []float64
	for i, c := range in.Checks {
		x, y = append(x, c.Step), append(y, c.Rhat)
		if i >= len(in.Checks)/2 && finite(c.Rhat) { // the first values may be anything
			hi = max(hi, 1+1.1*(c.Rhat-1))
		}
	}
	p := &panel{r, axis{lo: 0, hi: steps, ticks: linearTicks(0, steps, 5), title: Plain("step")},
		axis{lo: 1 - 0.04*(hi-1), hi: hi, ticks: linearTicks(1, hi, 3), title: Markup("largest *~R*")}}
	in.goal(f, p, in.RhatGoal, "goal")
	f.curve(p, x, y, pen{ink: lineInk(0), width: 0.9})
	f.axes(p)
}

func (in *Convergence) ess(f *Figure, r rect, steps float64) {
	hi := in.ESSGoal
	var x, y []float64
	for _, c := range in.Checks {
		x, y = append(x, c.Step), append(y, c.ESS)
		if finite(c.ESS) {
			hi = max(hi, c.ESS)
		}
	}
	hi = max(hi*1.1, 10)
	p := &panel{r, axis{lo: 0, hi: steps, ticks: linearTicks(0, steps, 5), title: Plain("step")},
		axis{lo: 0, hi: hi, ticks: linearTicks(0, hi, 3), title: Plain("effective samples (least)")}}
	in.goal(f, p, in.ESSGoal, "goal")
	f.curve(p, x, y, pen{ink: lineInk(0), width: 0.9})
	f.axes(p)
}

// goal is a dashed line at what was asked for.
func (in *Convergence) goal(f *Figure, p *panel, v float64, name string) {
	if !(v > p.y.lo && v < p.y.hi) {
		return
	}
	f.curve(p, []float64{p.x.lo, p.x.hi}, []float64{v, v}, pen{ink: inkSoft, width: 0.6, dash: []float64{3, 2}})
	f.text(Plain(name), p.x0+3, p.at(p.x.lo, v).y+2.5, textStyle{size: noteSize, ink: inkSoft})
}
