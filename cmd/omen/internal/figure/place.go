package figure

import "math"

// occupied is a raster of the page that remembers where something is drawn, so that labels keep clear of it.
type occupied struct {
	frame  rect
	nx, ny int
	cost   []float32
}

const rasterStep = 1.5 // points

func newOccupied(frame rect) *occupied {
	o := &occupied{frame: frame, nx: int(frame.w()/rasterStep) + 1, ny: int(frame.h()/rasterStep) + 1}
	o.cost = make([]float32, o.nx*o.ny)
	return o
}

func (o *occupied) add(p pt, cost float32) {
	i, j := int((p.x-o.frame.x0)/rasterStep), int((p.y-o.frame.y0)/rasterStep)
	if p.x >= o.frame.x0 && p.y >= o.frame.y0 && i < o.nx && j < o.ny {
		o.cost[j*o.nx+i] = max(o.cost[j*o.nx+i], cost)
	}
}

// lines marks the cells that lines pass through.
func (o *occupied) lines(path []line, cost float32) {
	for _, l := range clipStroke(path, o.frame) {
		for i := 1; i < len(l.pts); i++ {
			a, b := l.pts[i-1], l.pts[i]
			n := int(math.Hypot(b.x-a.x, b.y-a.y)/rasterStep*2) + 1
			for k := 0; k <= n; k++ {
				o.add(along(a, b, float64(k)/float64(n)), cost)
			}
		}
	}
}

// area marks the inside of polygons.
func (o *occupied) area(path []line, cost float32) {
	o.lines(hatch(path, 0, rasterStep), cost)
}

// price of putting a quadrilateral there: the cost of what it covers, and infinite if it leaves the frame.
func (o *occupied) price(box line) float64 {
	for _, p := range box.pts {
		if !o.frame.holds(p) {
			return math.Inf(1)
		}
	}
	sum := 0.0
	const n = 24
	for a := 0; a <= n; a++ {
		left, right := along(box.pts[0], box.pts[1], float64(a)/n), along(box.pts[3], box.pts[2], float64(a)/n)
		for b := 0; b <= 6; b++ {
			q := along(left, right, float64(b)/6)
			i, j := int((q.x-o.frame.x0)/rasterStep), int((q.y-o.frame.y0)/rasterStep)
			if i < o.nx && j < o.ny {
				sum += float64(o.cost[j*o.nx+i])
			}
		}
	}
	return sum / (7 * (n + 1))
}

// spot is a place for a label and what speaks against it beside what it would cover.
type spot struct {
	x, y    float64
	style   textStyle
	penalty float64
	leader  *pt // where a thin line to what is named starts; nil for none
}

// put draws the label at the cheapest of the spots, which have one size of text, and marks it as taken. Spots where it would leave the frame
// are out; false if none is left or all cost more than most.
func (c *canvas) put(o *occupied, l Label, spots []spot, most float64) bool {
	if len(l) == 0 || len(spots) == 0 {
		return false
	}
	best, price := -1, most
	w := l.measure(spots[0].style.size)
	for i, s := range spots {
		if v := o.price(labelBox(w, s)) + o.leaderPrice(s) + s.penalty; v < price {
			best, price = i, v
		}
	}
	if best < 0 {
		return false
	}
	s := spots[best]
	o.area([]line{labelBox(w, s)}, 3)
	o.lines([]line{labelBox(w, s).closedUp()}, 3)
	if s.leader != nil {
		o.lines([]line{{pts: []pt{*s.leader, {s.x, s.y}}}}, 3)
		d := math.Hypot(s.x-s.leader.x, s.y-s.leader.y)
		end := along(*s.leader, pt{s.x, s.y}, 1-2/d)
		c.segment(s.leader.x, s.leader.y, end.x, end.y, pen{ink: s.style.ink, width: 0.4})
	}
	c.text(l, s.x, s.y, s.style)
	return true
}

// leaderPrice keeps the line from a label to what it names from crossing others.
func (o *occupied) leaderPrice(s spot) float64 {
	if s.leader == nil {
		return 0
	}
	sum := 0.0
	const n = 30
	for k := 4; k <= n; k++ { // it starts on a line
		q := along(*s.leader, pt{s.x, s.y}, float64(k)/n)
		i, j := int((q.x-o.frame.x0)/rasterStep), int((q.y-o.frame.y0)/rasterStep)
		if o.frame.holds(q) && i < o.nx && j < o.ny && o.cost[j*o.nx+i] >= 3 {
			sum += 0.03
		}
	}
	return sum
}

// closedUp is a polygon as a line that returns to its start.
func (l line) closedUp() line {
	return line{pts: append(l.pts[:len(l.pts):len(l.pts)], l.pts[0])}
}

// labelBox outlines a label of width w.
func labelBox(w float64, s spot) line {
	sin, cos := math.Sincos(s.style.angle)
	dx, dy := -s.style.h*w, -s.style.v*capHeight*s.style.size
	return textBox(pt{s.x + dx*cos - dy*sin, s.y + dx*sin + dy*cos}, w, s.style)
}
