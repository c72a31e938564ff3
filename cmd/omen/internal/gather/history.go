package gather

import (
	"fmt"
	"math"

	"omen/cmd/omen/internal/figure"
	"omen/likelihood"
	"omen/model"
)

// historyNodes is at how many times the scale factor is tabulated.
const historyNodes = 240

// How far into the future the history reaches, in units of 1/H0, and how large a
// universe is shown.
const (
	future  = 1.6
	largest = 4
	torn    = 1e3 // stands for a universe after its rip
)

// history is the scale factor against time of the best fit with its bands.
func (r *Run) history() (*Picture, error) {
	h := &history{run: r, gyr: r.Job.Space.KnowsH0()}
	best, ok := h.universe(r.Best)
	if !ok {
		return absent("the best fit had no big bang, from which to count time"), nil
	}
	var sample []model.Universe
	oldest := best.AgeToday() / h.unit(best)
	for _, x := range r.scatter(bandDraws) {
		if u, ok := h.universe(x); ok {
			sample = append(sample, u)
			oldest = max(oldest, u.AgeToday()/h.unit(u))
		}
	}
	in := figure.History{Unfinished: r.Unfinished(), Unit: figure.Markup("1/*H*_0"), Coasting: 1}
	span := future
	if h.gyr {
		in.Unit = figure.Plain("Gyr")
		in.Coasting = 1 / best.HubbleTime()
		span *= best.HubbleTime()
	}
	b := band{x: grid(-1.06*oldest, span, historyNodes, false)}
	for _, u := range sample {
		b.curves = append(b.curves, h.curve(u, b.x, true))
	}
	at := h.curve(best, b.x, false)
	in.Scale = b.figure(at)
	in.Top = top(at, in.Scale.Hi68)
	in.Moments = h.moments(best)
	return &Picture{Caption: h.caption(), Alt: h.alt(best), draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawHistory(in, w) }}, nil
}

type history struct {
	run *Run
	gyr bool
}

// universe is the one at x; ok is false if it had no big bang.
func (h *history) universe(x []float64) (model.Universe, bool) {
	var p likelihood.Point
	h.run.Job.Space.Point(x, &p)
	return p.Universe, p.Universe.HasBigBang()
}

// unit is the unit of the time axis in Gyr.
func (h *history) unit(u model.Universe) float64 {
	if h.gyr {
		return 1
	}
	return u.HubbleTime()
}

// curve is the scale factor at times from today. A universe that has not begun or
// has ended counts as 0 in the bands, one that was torn apart as beyond all.
func (h *history) curve(u model.Universe, x []float64, inBand bool) []float64 {
	times, a := make([]float64, len(x)), make([]float64, len(x))
	age, unit := u.AgeToday(), h.unit(u)
	for i, t := range x {
		times[i] = age + t*unit
	}
	u.History(times, a)
	rip := age + u.Rip()
	for i := range a {
		switch {
		case !inBand || a[i] <= torn:
		case times[i] >= rip || a[i] > torn:
			a[i] = torn
		default:
			a[i] = 0
		}
	}
	return a
}

// top is the largest scale factor to show: that of the best fit and of the 68%
// band.
func top(curves ...[]float64) float64 {
	most := 1.2
	for _, c := range curves {
		for _, v := range c {
			if v > most && v < torn {
				most = v
			}
		}
	}
	return min(1.05*most, largest)
}

// moments are the big bang and what lies ahead of the best fit.
func (h *history) moments(u model.Universe) []figure.Moment {
	unit, age := h.unit(u), u.AgeToday()
	at := func(name string, t float64) figure.Moment {
		return figure.Moment{Name: figure.Plain(name), Time: t / unit, Lo68: math.NaN(), Hi68: math.NaN()}
	}
	begin := at("big bang", -age)
	name := "H0t0"
	if h.gyr {
		name = "age"
	}
	if q, ok := Find(h.run.Summary, name); ok {
		begin.Lo68, begin.Hi68 = -float64(q.Interval68[1]), -float64(q.Interval68[0])
	}
	out := []figure.Moment{begin}
	if z := u.AccelerationOnset(); z > 0 && !math.IsInf(z, 0) {
		out = append(out, at("acceleration begins", -u.Lookback(z)))
	}
	if t := u.Crunch(); !math.IsNaN(t) {
		out = append(out, at("big crunch", t-age))
	}
	if t := u.Rip(); !math.IsNaN(t) {
		out = append(out, at("big rip", t))
	}
	return out
}

func (h *history) caption() string {
	unit := "Time is in units of 1/H0, for these data do not know H0."
	if h.gyr {
		unit = "Time is in Gyr."
	}
	s := "The scale factor of the universe, 1 today, against time from today: the best fit and the bands that hold 68% and 95% of the posterior at each time. " +
		"Dashed: an empty universe, which coasts. " + unit
	if h.run.Job.Space.Family().DarkEnergy == likelihood.W0Wa {
		s += " The future extrapolates w0 + wa (1-a) beyond what was measured."
	}
	return s
}

func (h *history) alt(best model.Universe) string {
	s := "Scale factor against time, past and future."
	if h.gyr {
		s += " The age today: " + h.run.Values("age") + "."
	} else {
		s += " The age today in units of 1/H0: " + h.run.Values("H0t0") + "."
	}
	if z := best.AccelerationOnset(); z > 0 && !math.IsInf(z, 0) {
		s += fmt.Sprintf(" In the best fit the expansion began to accelerate at redshift %.2f.", z)
	}
	return s + fmt.Sprintf(" Its fate: %s.", best.Fate())
}
