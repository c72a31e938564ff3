package figure

import "math"

// pt is a place on the page, in points.
type pt struct{ x, y float64 }

// line is a run of connected points; a closed one joins last and first.
type line struct {
	pts    []pt
	closed bool
}

// op is one entry of the list: a path to fill (width zero), a path to stroke, dots, or text.
type op struct {
	path  []line
	dots  []pt // discs of diameter width
	ink   ink
	alpha float64
	width float64
	dash  []float64
	text  []piece
	at    pt
	angle float64 // of the text, radians counterclockwise
}

// canvas collects what is drawn, first to last from back to front.
type canvas struct {
	w, h float64
	ops  []op
}

func (c *canvas) fill(path []line, k ink, alpha float64) {
	if len(path) > 0 {
		c.ops = append(c.ops, op{path: path, ink: k, alpha: alpha})
	}
}

// pen is how a line is drawn.
type pen struct {
	ink   ink
	width float64
	dash  []float64
	alpha float64 // zero means opaque
}

func (c *canvas) stroke(path []line, p pen) {
	if len(path) == 0 {
		return
	}
	if p.alpha == 0 {
		p.alpha = 1
	}
	c.ops = append(c.ops, op{path: path, ink: p.ink, alpha: p.alpha, width: p.width, dash: p.dash})
}

func (c *canvas) segment(x0, y0, x1, y1 float64, p pen) {
	c.stroke([]line{{pts: []pt{{x0, y0}, {x1, y1}}}}, p)
}

func (c *canvas) dots(at []pt, diameter float64, k ink, alpha float64) {
	if len(at) > 0 {
		c.ops = append(c.ops, op{dots: at, width: diameter, ink: k, alpha: alpha})
	}
}

// rect is a rectangle on the page.
type rect struct{ x0, y0, x1, y1 float64 }

func (r rect) outline() line {
	return line{pts: []pt{{r.x0, r.y0}, {r.x1, r.y0}, {r.x1, r.y1}, {r.x0, r.y1}}, closed: true}
}

func (r rect) w() float64 { return r.x1 - r.x0 }
func (r rect) h() float64 { return r.y1 - r.y0 }

func (r rect) grown(d float64) rect { return rect{r.x0 - d, r.y0 - d, r.x1 + d, r.y1 + d} }

func (r rect) holds(p pt) bool { return p.x >= r.x0 && p.x <= r.x1 && p.y >= r.y0 && p.y <= r.y1 }

// clipFill cuts polygons at the rectangle, side by side (Sutherland & Hodgman 1974, Comm. ACM 17, 32).
func clipFill(path []line, r rect) []line {
	var out []line
	for _, l := range path {
		p := l.pts
		p = clipSide(p, func(a pt) float64 { return a.x - r.x0 })
		p = clipSide(p, func(a pt) float64 { return r.x1 - a.x })
		p = clipSide(p, func(a pt) float64 { return a.y - r.y0 })
		p = clipSide(p, func(a pt) float64 { return r.y1 - a.y })
		if len(p) > 2 {
			out = append(out, line{pts: p, closed: true})
		}
	}
	return out
}

// clipSide keeps what has a positive distance to a straight side.
func clipSide(p []pt, inside func(pt) float64) []pt {
	var out []pt
	for i, b := range p {
		a := p[(i+len(p)-1)%len(p)]
		da, db := inside(a), inside(b)
		if (da >= 0) != (db >= 0) {
			out = append(out, along(a, b, da/(da-db)))
		}
		if db >= 0 {
			out = append(out, b)
		}
	}
	return out
}

func along(a, b pt, t float64) pt { return pt{a.x + t*(b.x-a.x), a.y + t*(b.y-a.y)} }

// clipStroke keeps the parts of lines that lie inside the rectangle (Liang & Barsky 1984, ACM Trans. Graph. 3,
// 1, on each segment). Points that are not finite interrupt a line.
func clipStroke(path []line, r rect) []line {
	var out []line
	for _, l := range path {
		pts := l.pts
		if l.closed && len(pts) > 0 {
			pts = append(pts[:len(pts):len(pts)], pts[0])
		}
		var run []pt
		for i := 1; i < len(pts); i++ {
			a, b, ok := clipSegment(pts[i-1], pts[i], r)
			if !ok {
				continue
			}
			if len(run) == 0 || run[len(run)-1] != a {
				out = appendRun(out, run)
				run = []pt{a}
			}
			run = append(run, b)
		}
		out = appendRun(out, run)
	}
	return out
}

func appendRun(out []line, run []pt) []line {
	if len(run) > 1 {
		return append(out, line{pts: run})
	}
	return out
}

func clipSegment(a, b pt, r rect) (pt, pt, bool) {
	t0, t1 := 0., 1.
	for _, s := range [4][2]float64{ // distance inside the side at a, and its change towards b
		{a.x - r.x0, b.x - a.x}, {r.x1 - a.x, a.x - b.x}, {a.y - r.y0, b.y - a.y}, {r.y1 - a.y, a.y - b.y},
	} {
		switch at := -s[0] / s[1]; {
		case math.IsNaN(s[0]) || math.IsNaN(s[1]) || math.IsInf(s[0], 0) || math.IsInf(s[1], 0):
			return a, b, false
		case s[1] == 0 && s[0] < 0:
			return a, b, false
		case s[1] > 0:
			t0 = max(t0, at)
		case s[1] < 0:
			t1 = min(t1, at)
		}
	}
	if t0 > t1 {
		return a, b, false
	}
	ca, cb := a, b
	if t0 > 0 {
		ca = along(a, b, t0)
	}
	if t1 < 1 {
		cb = along(a, b, t1)
	}
	return ca, cb, true
}

// thin drops points closer together than a print can show, corners excepted.
func thin(path []line) []line {
	const step = 0.35
	out := make([]line, 0, len(path))
	for _, l := range path {
		var p []pt
		for i, q := range l.pts {
			if len(p) == 0 || i == len(l.pts)-1 || corner(p[len(p)-1], q, l.pts[i+1]) ||
				math.Hypot(q.x-p[len(p)-1].x, q.y-p[len(p)-1].y) >= step {
				p = append(p, q)
			}
		}
		out = append(out, line{pts: p, closed: l.closed})
	}
	return out
}

// corner tells whether a path turns by more than about 17 degrees at b.
func corner(a, b, c pt) bool {
	u, v := pt{b.x - a.x, b.y - a.y}, pt{c.x - b.x, c.y - b.y}
	dot, cross := u.x*v.x+u.y*v.y, u.x*v.y-u.y*v.x
	return math.Abs(cross) > 0.3*dot
}

// hatch returns parallel lines across the polygons, at the angle (radians) and distance given.
func hatch(path []line, angle, distance float64) []line {
	sin, cos := math.Sincos(angle)
	turn := func(p pt) pt { return pt{p.x*cos + p.y*sin, p.y*cos - p.x*sin} }
	rows := map[int][]float64{}
	low, high := math.MaxInt32, math.MinInt32
	for _, l := range path {
		for i := range l.pts {
			a, b := turn(l.pts[i]), turn(l.pts[(i+1)%len(l.pts)])
			if a.y > b.y {
				a, b = b, a
			}
			for k := int(math.Ceil(a.y / distance)); float64(k)*distance < b.y; k++ {
				rows[k] = append(rows[k], a.x+(float64(k)*distance-a.y)/(b.y-a.y)*(b.x-a.x))
				low, high = min(low, k), max(high, k)
			}
		}
	}
	var out []line
	for k := low; k <= high; k++ {
		out = append(out, hatchRow(rows[k], float64(k)*distance, sin, cos)...)
	}
	return out
}

func hatchRow(xs []float64, y, sin, cos float64) []line {
	sortFloats(xs)
	var out []line
	for i := 0; i+1 < len(xs); i += 2 {
		back := func(x float64) pt { return pt{x*cos - y*sin, x*sin + y*cos} }
		out = append(out, line{pts: []pt{back(xs[i]), back(xs[i+1])}})
	}
	return out
}

// marker shapes, told apart without colour.
type marker uint8

const (
	disc marker = iota
	square
	diamond
	triangle
	cross
)

// marks draws markers of the given size at places.
func (c *canvas) marks(at []pt, m marker, size float64, k ink) {
	if m == disc {
		c.dots(at, size, k, 1)
		return
	}
	r := size / 2
	shapes := map[marker][]pt{
		square:   {{-0.88, -0.88}, {0.88, -0.88}, {0.88, 0.88}, {-0.88, 0.88}},
		diamond:  {{0, -1.2}, {1.2, 0}, {0, 1.2}, {-1.2, 0}},
		triangle: {{-1.1, -0.8}, {1.1, -0.8}, {0, 1.2}},
		cross: {{-1.2, -0.4}, {-0.4, -0.4}, {-0.4, -1.2}, {0.4, -1.2}, {0.4, -0.4}, {1.2, -0.4},
			{1.2, 0.4}, {0.4, 0.4}, {0.4, 1.2}, {-0.4, 1.2}, {-0.4, 0.4}, {-1.2, 0.4}},
	}
	var path []line
	for _, p := range at {
		l := line{closed: true}
		for _, q := range shapes[m] {
			l.pts = append(l.pts, pt{p.x + r*q.x, p.y + r*q.y})
		}
		path = append(path, l)
	}
	c.fill(path, k, 1)
}
