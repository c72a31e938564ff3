package model

import "math"

// clock is a monotonic relation between a position and a time. It is known on one panel at a time, on which the
// time is a polynomial in the position, and moves from panel to panel. A panel is kept as narrow as that takes.
type clock struct {
	rate       integrand      // dt/dpos > 0
	limit      float64        // positions lie below this
	lo, hi     float64        // the panel, in position,
	start, end float64        // and in time
	width      float64        // of the next panel
	c          [order]float64 // (rate at x) = Σ c_m xᵐ, with x from -1 to 1
	first      float64        // what makes the time since start 0 at x = -1, in units of the half-width
	x          float64        // where the last time was found
}

// Widths of the panels, in ln a or v: of the first that is tried, and below which a clock stops.
const (
	clockWidth     = 0.5
	leastClockStep = 1e-12
)

// newClock is a clock that shows time t at a position.
func newClock(rate integrand, pos, t float64) clock {
	c := clock{rate: rate, limit: math.Inf(1)}
	c.set(pos, t)
	return c
}

// set makes the clock show time t at a position, with a panel of no width.
func (c *clock) set(pos, t float64) {
	c.lo, c.hi, c.start, c.end, c.width = pos, pos, t, t, clockWidth
}

// logLargest is the logarithm of a number near the largest: what is beyond is +Inf.
const logLargest = 700

// seek is the position at time t: that of the last panel, if the clock does not reach so far.
func (c *clock) seek(t float64) float64 {
	for range panelBudget {
		switch {
		case c.hi > logLargest && t > c.end:
			return math.Inf(1)
		case t > c.end:
			if !c.move(1) {
				return c.hi
			}
		case t < c.start:
			if !c.move(-1) {
				return c.lo
			}
		default:
			return c.find(t)
		}
	}
	return math.NaN()
}

// move goes to the next panel up (direction 1) or down (-1), and reports whether time went on.
func (c *clock) move(direction float64) bool {
	from := c.hi
	if direction < 0 {
		from = c.lo
	}
	for {
		half := c.width / 2
		if direction > 0 {
			half = min(half, (c.limit-from)/4)
		}
		v, noise := c.rate(panel.between(from+direction*half, half), order)
		mean, omitted := panel.mean(v[:order]), panel.omitted(v[:order])
		if omitted <= denseTail*mean+noise {
			return c.take(&v, from, direction, half, mean, omitted)
		}
		c.width = half
		if !(half > leastClockStep) {
			return false
		}
	}
}

// take makes a panel that has converged the panel of the clock.
func (c *clock) take(v *points, from, direction, half, mean, omitted float64) bool {
	passed := 2 * half * mean
	if direction > 0 {
		c.start, c.end, c.x = c.end, c.end+passed, -1
	} else {
		c.start, c.end, c.x = c.start-passed, c.start, 1
	}
	c.lo, c.hi = min(from, from+2*half*direction), max(from, from+2*half*direction)
	panel.powers((*[order]float64)(v[:order]), &c.c)
	c.first = 0
	for m := order - 1; m >= 0; m-- {
		c.first = c.c[m]/float64(m+1) - c.first
	}
	c.width = 2 * half
	if omitted*(1<<order) <= denseTail*mean { // a coefficient grows as this power of the width
		c.width *= 2
	}
	return c.start < c.end
}

// find inverts the polynomial of the panel by the first two terms of the inverse series, from where the last time was
// found and kept inside a shrinking bracket. Their error is of the third order.
func (c *clock) find(t float64) float64 {
	mid, half := c.lo+(c.hi-c.lo)/2, (c.hi-c.lo)/2
	if half == 0 {
		return c.lo
	}
	t = (t - c.start) / half
	lo, hi, x := -1.0, 1.0, c.x
	for range 100 {
		passed, rate, slope := c.at(x)
		if passed < t {
			lo = x
		} else {
			hi = x
		}
		step := (t - passed) / rate
		if bend := step * slope / (2 * rate); math.Abs(bend) < 0.5 {
			step -= step * bend
		}
		next := x + step
		if !(next >= lo && next <= hi) {
			next = lo + (hi-lo)/2
		}
		moved := next - x
		x = next
		if math.Abs(moved) < 1e-4 {
			break
		}
	}
	c.x = x
	return mid + half*x
}

// at is the time since the start of the panel in units of its half-width, and its first two derivatives.
func (c *clock) at(x float64) (passed, rate, slope float64) {
	for m := order - 1; m >= 0; m-- {
		slope = slope*x + rate
		rate = rate*x + c.c[m]
		passed = passed*x + c.c[m]*reciprocal[m]
	}
	return passed*x + c.first, rate, slope
}

// reciprocal holds 1/(m+1).
var reciprocal = func() (r [order]float64) {
	for m := range r {
		r[m] = 1 / float64(m+1)
	}
	return r
}()
