package quadrature

import (
	"math"
	"slices"
)

// points is the size of the 15-point Kronrod extension of the 7-point Gauss–Legendre rule.
const points = 15

// Nodes on [-1, 1], Kronrod weights, and the weights of the embedded Gauss rule (zero where it has no node).
// Source: Piessens, de Doncker-Kapenga, Überhuber & Kahaner, QUADPACK (Springer 1983), rule QK15, whose code
// is in the public domain. The tests recompute what defines them.
var (
	abscissa = mirror(-1, [8]float64{
		0.991455371120812639206854697526329, 0.949107912342758524526189684047851,
		0.864864423359769072789712788640926, 0.741531185599394439863864773280788,
		0.586087235467691130294144691258224, 0.405845151377397166906606412076961,
		0.207784955007898467600689403773245, 0})
	kronrod = mirror(1, [8]float64{
		0.022935322010529224963732008058970, 0.063092092629978553290700663189204,
		0.104790010322250183839876322541518, 0.140653259715525918745189590510238,
		0.169004726639267902826583426598550, 0.190350578064785409913256402421014,
		0.204432940075298892414161999234649, 0.209482141084727828012999174891714})
	gauss = mirror(1, [8]float64{
		0, 0.129484966168869693270611432679082, 0, 0.279705391489276667901467771423780,
		0, 0.381830050505118944950369775488975, 0, 0.417959183673469387755102040816327})
)

// mirror extends the half of a symmetric table (from the outside in) to the whole, ascending when sign = -1.
func mirror(sign float64, half [8]float64) (full [points]float64) {
	for i, v := range half {
		full[i] = sign * v
		full[points-1-i] = v
	}
	return full
}

// ruleError estimates the error of the Kronrod value k of an integral from the Gauss value g and from asc,
// the integral of |f − mean f|: asc·min(1, (200|k−g|/asc)^1.5), the estimate of QUADPACK. It is never below
// |k−g| unless |k−g|/asc < 1.25e-7: right beside a kink, and orders of magnitude too large for a smooth f.
func ruleError(k, g, asc float64) float64 {
	d := math.Abs(k - g)
	if asc == 0 || d == 0 {
		return d
	}
	r := 200 * d / asc
	return asc * math.Min(1, r*math.Sqrt(r))
}

// legendre[j] holds the weights that yield the Legendre coefficients of degree 6 + j, normalised, of a
// function sampled at the nodes; of higher degree they would be aliased by lower ones.
var legendre = func() (w [6][points]float64) {
	for i, x := range abscissa {
		before, p := 1.0, x
		for n := 2; n < 12; n++ {
			before, p = p, (float64(2*n-1)*x*p-float64(n-1)*before)/float64(n)
			if n >= 6 {
				w[n-6][i] = kronrod[i] * p * math.Sqrt(float64(2*n+1)/2)
			}
		}
	}
	return w
}()

// smoothError estimates the error from how fast the last Legendre coefficients decay, taken in pairs since
// either may vanish by symmetry; +Inf when they do not. The rule is exact to degree 23, six pairs beyond the
// last one seen; four are counted on. The idea is that of the null rules of Berntsen & Espelid 1991 (ACM
// Trans. Math. Softw. 17:233).
func smoothError(f *[points]float64) float64 {
	var e [3]float64
	for j := range e {
		var a, b float64
		for i, v := range f {
			a += legendre[2*j][i] * v
			b += legendre[2*j+1][i] * v
		}
		e[j] = math.Hypot(a, b)
	}
	const fast = 0.3
	r := math.Max(e[2]/e[1], e[1]/e[0])
	if !(r < fast) {
		return math.Inf(1)
	}
	return e[2] * r * r * r * r
}

// maxClasses bounds the number of classes, so that sums per class live in arrays on the stack.
const maxClasses = 15

// vec holds one number for the whole (slot 0) and one for each class (slot 1 + class). The slot after the
// last class is where points of no class would go; nothing is summed there.
type vec [2 + maxClasses]float64

// core is a piece [a, b] of one level: its integral and the error of the rule, per slot. At an end marked as
// an edge the integrand may begin like a square root.
type core struct {
	a, b         float64
	edgeA, edgeB bool // not both
	val, err     vec
}

// node returns the k-th node and the factor that goes with its weight. From an edge on, the nodes are spaced
// evenly, as it were, in u = sqrt(distance from the edge): the integrand becomes smooth in u.
func (c *core) node(k int) (t, scale float64) {
	u := (1 + abscissa[k]) / 2
	switch w := c.b - c.a; {
	case c.edgeA:
		return c.a + w*u*u, w * u
	case c.edgeB:
		return c.b - w*(1-u)*(1-u), w * (1 - u)
	default:
		return c.a + w*u, w / 2
	}
}

// sumRule applies the rule to the first slots of f, given at the nodes.
func (c *core) sumRule(f *[points]vec, slots int) {
	var scale [points]float64
	for i := range scale {
		_, scale[i] = c.node(i)
	}
	for s := range slots {
		var k, g, asc float64
		var y [points]float64
		for i := range points {
			y[i] = scale[i] * f[i][s]
			k += kronrod[i] * y[i]
			g += gauss[i] * y[i]
		}
		for i := range points {
			asc += kronrod[i] * math.Abs(y[i]-k/2)
		}
		c.val[s], c.err[s] = k, math.Min(ruleError(k, g, asc), smoothError(&y))
	}
}

// profile is what is known of ln p along a piece: at its ends (-Inf where it is not known) and at the nodes.
type profile struct{ t, y [points + 2]float64 }

// foreseen looks for a peak hidden between the nodes by what ln p does beside it: ln p, unlike p, can be seen
// from a long way off. It returns the largest of the values and the highest point where the secants of the
// values to the left and to the right meet within one interval: an upper bound where ln p is concave. A bound
// above the largest value says that two positions, the second of them at, are too far apart.
func (p *profile) foreseen() (largest, bound float64, at int) {
	t, y := &p.t, &p.y
	largest = slices.Max(y[:])
	bound = largest
	offer := func(v float64, i int) {
		if v > bound && v > math.Max(y[i], y[i-1])+hidden && !math.IsInf(v, 0) {
			bound, at = v, i
		}
	}
	last := len(t) - 1
	for i := 2; i < last; i++ {
		sl, sr := (y[i-1]-y[i-2])/(t[i-1]-t[i-2]), (y[i+1]-y[i])/(t[i+1]-t[i])
		if sl > 0 && sr < 0 && !math.IsInf(sl, 0) && !math.IsInf(sr, 0) {
			x := (y[i] - y[i-1] + sl*t[i-1] - sr*t[i]) / (sl - sr)
			offer(y[i-1]+sl*(min(max(x, t[i-1]), t[i])-t[i-1]), i)
		}
	}
	offer(y[1]+(y[1]-y[2])/(t[2]-t[1])*(t[1]-t[0]), 1)
	offer(y[last-1]+(y[last-1]-y[last-2])/(t[last-1]-t[last-2])*(t[last]-t[last-1]), last)
	return largest, bound, at
}

// hidden is by how much ln p must be foreseen to rise above the nodes before a hidden peak is suspected.
const hidden = 0.7

// worst returns the piece with the largest error relative to the tolerances, or -1 when every sum of errors
// is within its tolerance. A piece too narrow to be bisected is passed over.
func worst(pieces []core, tol *vec, slots int, narrow float64) int {
	var sum vec
	for i := range pieces {
		for s := range slots {
			sum[s] += pieces[i].err[s]
		}
	}
	open := [len(vec{})]bool{}
	for s := range slots {
		open[s] = sum[s] > tol[s]
	}
	at, ratio := -1, 0.0
	for i := range pieces {
		if pieces[i].b-pieces[i].a <= narrow {
			continue
		}
		for s := range slots {
			if r := pieces[i].err[s] / tol[s]; open[s] && r > ratio {
				at, ratio = i, r
			}
		}
	}
	return at
}
