package density

import "math"

// Point is a point of the plane.
type Point struct{ X, Y float64 }

// Loop is a closed outline; the last point joins the first. Higher density lies to its left, so that outer
// outlines run counterclockwise and those of holes clockwise, and filling all loops of a region by winding
// number leaves the holes open.
type Loop []Point

// Region returns the outline of the region of highest density that holds the given probability. Nil unless
// 0 < mass < 1.
func (s *Surface) Region(mass float64) []Loop {
	level := s.Level(mass)
	if math.IsNaN(level) {
		return nil
	}
	return s.Contour(level)
}

// Contour traces where the surface crosses level, by marching squares (Lorensen & Cline 1987, Comput. Graphics 21,
// 163, in two dimensions). Along the lines of the grid the surface is taken as cubic where four nodes allow it: on a
// straight line between two a narrow ridge across the grid has steps. A ring of cells of no width around the grid, below any level, closes
// the outlines along the edges of the domain.
func (s *Surface) Contour(level float64) []Loop {
	t := tracer{s: s, level: level, nx: len(s.X) + 2, ny: len(s.Y) + 2}
	t.next = make([]int32, 2*t.nx*t.ny)
	for i := range t.next {
		t.next[i] = -1
	}
	for j := range t.ny - 1 {
		for i := range t.nx - 1 {
			t.cell(i, j)
		}
	}
	return t.loops()
}

// tracer links the segments of cells. An edge of the grid of cells is numbered 2(j nx+i), for the one from
// node (i, j) to (i+1, j), or one more, for that to (i, j+1). Every crossed edge ends one segment and starts another.
type tracer struct {
	s      *Surface
	level  float64
	nx, ny int // with the ring
	next   []int32
}

// above tells whether node (i, j), counted with the ring, is inside the region.
func (t *tracer) above(i, j int) bool {
	if i == 0 || j == 0 || i == t.nx-1 || j == t.ny-1 {
		return false
	}
	return t.value(i, j) >= t.level
}

func (t *tracer) value(i, j int) float64 { return t.s.P[(j-1)*len(t.s.X)+i-1] }

func (t *tracer) cell(i, j int) {
	bottom, left := int32(2*(j*t.nx+i)), int32(2*(j*t.nx+i)+1)
	top, right := int32(2*((j+1)*t.nx+i)), int32(2*(j*t.nx+i+1)+1)
	code := 0
	for bit, in := range [4]bool{t.above(i, j), t.above(i+1, j), t.above(i+1, j+1), t.above(i, j+1)} {
		if in {
			code |= 1 << bit
		}
	}
	// Corners counterclockwise from bottom left are bits 0 to 3; the region stays on the left of from → to.
	switch code {
	case 1:
		t.next[bottom] = left
	case 2:
		t.next[right] = bottom
	case 3:
		t.next[right] = left
	case 4:
		t.next[top] = right
	case 6:
		t.next[top] = bottom
	case 7:
		t.next[top] = left
	case 8:
		t.next[left] = top
	case 9:
		t.next[bottom] = top
	case 11:
		t.next[right] = top
	case 12:
		t.next[left] = right
	case 13:
		t.next[bottom] = right
	case 14:
		t.next[left] = bottom
	case 5, 10:
		t.saddle(i, j, code == 5, bottom, left, top, right)
	}
}

// saddle separates or joins the two high corners as the middle of the cell decides.
func (t *tracer) saddle(i, j int, rising bool, bottom, left, top, right int32) {
	middle := (t.value(i, j) + t.value(i+1, j) + t.value(i, j+1) + t.value(i+1, j+1)) / 4
	joined := middle >= t.level
	switch {
	case rising && joined:
		t.next[bottom], t.next[top] = right, left
	case rising:
		t.next[bottom], t.next[top] = left, right
	case joined:
		t.next[left], t.next[right] = bottom, top
	default:
		t.next[left], t.next[right] = top, bottom
	}
}

func (t *tracer) loops() []Loop {
	var out []Loop
	for start := range t.next {
		if t.next[start] < 0 {
			continue
		}
		var loop Loop
		for e := int32(start); t.next[e] >= 0; {
			p := t.crossing(int(e))
			if len(loop) == 0 || loop[len(loop)-1] != p {
				loop = append(loop, p)
			}
			e, t.next[e] = t.next[e], -1
		}
		if len(loop) > 2 {
			out = append(out, loop)
		}
	}
	return out
}

// crossing is the point where the edge passes through the level; on an edge to the ring, its inner node.
func (t *tracer) crossing(e int) Point {
	i, j := e/2%t.nx, e/2/t.nx
	i1, j1 := i+1, j
	if e%2 == 1 {
		i1, j1 = i, j+1
	}
	a, b := t.node(i, j), t.node(i1, j1)
	if i == 0 || j == 0 {
		return b
	}
	if i1 == t.nx-1 || j1 == t.ny-1 {
		return a
	}
	f := t.fraction(i, j, i1-i, j1-j)
	return Point{a.X + f*(b.X-a.X), a.Y + f*(b.Y-a.Y)}
}

// fraction is how far along the edge from node (i, j) in direction (di, dj) the level is crossed.
func (t *tracer) fraction(i, j, di, dj int) float64 {
	va, vb := t.value(i, j)-t.level, t.value(i+di, j+dj)-t.level
	linear := va / (va - vb)
	if i-di < 1 || j-dj < 1 || i+2*di > t.nx-2 || j+2*dj > t.ny-2 {
		return linear
	}
	var at, v [4]float64 // along the edge, which runs from 0 to 1
	origin, end := t.node(i, j), t.node(i+di, j+dj)
	for k := range v {
		p := t.node(i+(k-1)*di, j+(k-1)*dj)
		at[k] = (p.X - origin.X + p.Y - origin.Y) / (end.X - origin.X + end.Y - origin.Y)
		v[k] = t.value(i+(k-1)*di, j+(k-1)*dj) - t.level
	}
	lo, hi := 0., 1.
	for range 30 {
		f := (lo + hi) / 2
		if (cubic(at, v, f) >= 0) == (va >= 0) {
			lo = f
		} else {
			hi = f
		}
	}
	return (lo + hi) / 2
}

// cubic is the value at x of the polynomial through four points (Lagrange).
func cubic(at, v [4]float64, x float64) float64 {
	sum := 0.0
	for k := range v {
		w := v[k]
		for m := range at {
			if m != k {
				w *= (x - at[m]) / (at[k] - at[m])
			}
		}
		sum += w
	}
	return sum
}

func (t *tracer) node(i, j int) Point {
	i = max(0, min(i-1, len(t.s.X)-1))
	j = max(0, min(j-1, len(t.s.Y)-1))
	return Point{t.s.X[i], t.s.Y[j]}
}
