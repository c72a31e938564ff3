package model

import "math"

// ScaleFactor is a at the time t in Gyr since the big bang: through the turnaround to the crunch if there is
// one, up to the rip if there is one, 0 at the bang and the crunch; +Inf beyond 1e304. NaN outside that span, and
// for a universe without a big bang.
func (u Universe) ScaleFactor(t float64) float64 {
	var a [1]float64
	u.History([]float64{t}, a[:])
	return a[0]
}

// History writes ScaleFactor of each of the times into dst, which must have the same length. Times that ascend
// are cheap: each is found in the panel of the one before it, or the next. The relative accuracy of a is 1e-9,
// except within 1e-6 of the span's length from a rip or a crunch, where a follows t without bound.
func (u Universe) History(times, dst []float64) {
	if len(times) != len(dst) {
		panic("model: History needs one element per time")
	}
	h := u.newHistory()
	for i, t := range times {
		dst[i] = h.scaleFactor(t / u.HubbleTime())
	}
}

// history is the state of a walk through the life of one universe, in units of 1/H0.
type history struct {
	e     expansion
	end   float64 // time of the crunch or rip, +Inf without one, 0 without a big bang
	turn  float64 // time of turnaround, +Inf without one
	st    float64 // ln a at turnaround
	rise  clock   // time since the big bang against ln a
	crest clock   // time until turnaround against v = √(st - ln a), where 1/E is nearly singular
}

func (u Universe) newHistory() *history {
	h := &history{e: u.expansion(), turn: math.Inf(1), end: math.Inf(1)}
	if !u.HasBigBang() {
		h.end = 0
		return h
	}
	today := h.e.sinceBigBang(1)
	h.rise = newClock(h.e.timeRate, 0, today)
	switch u.Future() {
	case Recollapse:
		h.st = math.Log(h.e.futureZero())
		h.turn = today + h.e.untilTurnaround(0, h.st)
		h.end = 2 * h.turn
		h.rise.limit = h.st
		crest := h.e.crest(h.st)
		h.crest = newClock(crest.rate, 0, 0)
	case BigRip:
		h.end = today + u.Rip()/u.HubbleTime()
	}
	return h
}

func (h *history) scaleFactor(t float64) float64 {
	switch {
	case !(t >= 0 && t <= h.end && h.end > 0) || t == h.end && math.IsInf(h.turn, 1):
		return math.NaN()
	case t > h.turn:
		t = 2*h.turn - t // E² depends on a alone: the contraction mirrors the expansion
	}
	switch {
	case t == 0:
		return 0
	case t > h.turn/2 && !math.IsInf(h.turn, 1):
		v := h.crest.seek(h.turn - t)
		return math.Exp(h.st - v*v)
	}
	h.anchor(t)
	return math.Exp(h.rise.seek(t))
}

// anchor moves the clock back to the neighbourhood of a much earlier time along the power law that it follows
// there, and sets it afresh: winding it back would leave a small difference of large numbers.
func (h *history) anchor(t float64) {
	c := &h.rise
	for range 100 {
		if t > c.start/4 {
			return
		}
		pos := c.lo + max(-5, math.Log(t/c.start)*c.start/h.e.timeRateAt(c.lo))
		c.set(pos, h.e.sinceBigBang(math.Exp(pos)))
	}
}
