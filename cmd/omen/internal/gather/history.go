package gather

import (
	"fmt"
	"math"

	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/outlook"
	"omen/likelihood"
	"omen/model"
)

// How far into the future the history reaches, in units of 1/H0: further only to
// show an end that is not much further. And how large a universe is shown.
const (
	ahead    = 1.6
	furthest = 8
	largest  = 4
	torn     = 1e3 // stands for a universe after its rip
)

// history is the scale factor against time of the best fit with its bands.
func (r *Run) history() (*Picture, error) {
	best := r.universe(r.Best)
	var sample []model.Universe
	for _, x := range r.scatter(bandDraws) {
		sample = append(sample, r.universe(x))
	}
	gyr := r.Job.Space.KnowsH0()
	t := outlook.Traces(best, sample, gyr, reach(best))
	if t == nil {
		return absent("the best fit had no big bang, from which to count time"), nil
	}
	in := figure.History{Unfinished: r.Unfinished(), Unit: figure.Markup("1/*H*_0"), Coasting: 1}
	if t.Gyr {
		in.Unit, in.Coasting = figure.Plain("Gyr"), 1/best.HubbleTime()
	}
	in.Scale = figure.Band{X: t.Time, Best: t.Best, Lo68: bounded(t.Low68), Hi68: bounded(t.High68), Lo95: bounded(t.Low95), Hi95: bounded(t.High95)}
	in.Top = top(in.Scale.Best, in.Scale.Hi68)
	in.Moments = r.moments(best)
	return &Picture{Caption: r.historyCaption(gyr), Alt: r.historyAlt(best, gyr), draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawHistory(in, w) }}, nil
}

// universe is the one at x.
func (r *Run) universe(x []float64) model.Universe {
	var p likelihood.Point
	r.Job.Space.Point(x, &p)
	return p.Universe
}

// reach is how far ahead to look: to the end of the best fit, if that is near.
func reach(u model.Universe) float64 {
	end := u.Rip() / u.HubbleTime()
	if t := u.Crunch(); !math.IsNaN(t) {
		end = (t - u.AgeToday()) / u.HubbleTime()
	}
	if end < furthest {
		return 1.05 * end
	}
	return ahead
}

// bounded puts a finite number for a universe that was torn apart.
func bounded(a []float64) []float64 {
	out := make([]float64, len(a))
	for i, v := range a {
		out[i] = min(v, torn)
	}
	return out
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
func (r *Run) moments(u model.Universe) []figure.Moment {
	unit, age, name := u.HubbleTime(), u.AgeToday(), "H0t0"
	if r.Job.Space.KnowsH0() {
		unit, name = 1, "age"
	}
	at := func(name string, t float64) figure.Moment {
		return figure.Moment{Name: figure.Plain(name), Time: t / unit, Lo68: math.NaN(), Hi68: math.NaN()}
	}
	begin := at("big bang", -age)
	if q, ok := Find(r.Summary, name); ok {
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

func (r *Run) historyCaption(gyr bool) string {
	s := "The scale factor of the universe, 1 today, against time from today: the best fit and the bands that hold 68% and 95% of the posterior at each time. " +
		"Dashed: an empty universe, which coasts. "
	if gyr {
		s += "Time is in Gyr."
	} else {
		s += "Time is in units of 1/H0, for these data do not know H0."
	}
	return s + r.extrapolation()
}

// extrapolation says what is assumed of an equation of state that changes.
func (r *Run) extrapolation() string {
	if r.Job.Space.Family().DarkEnergy == likelihood.W0Wa {
		return " The future extrapolates w0 + wa (1-a) beyond what was measured."
	}
	return ""
}

func (r *Run) historyAlt(best model.Universe, gyr bool) string {
	s := "Scale factor against time, past and future. The age today"
	if gyr {
		s += ": " + r.Values("age") + "."
	} else {
		s += " in units of 1/H0: " + r.Values("H0t0") + "."
	}
	if z := best.AccelerationOnset(); z > 0 && !math.IsInf(z, 0) {
		s += fmt.Sprintf(" In the best fit the expansion began to accelerate at redshift %.2f.", z)
	}
	return s + fmt.Sprintf(" Its fate: %s.", best.Fate())
}
