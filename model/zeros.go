package model

import "math"

// Zeros of E². Write a²E² = F(a) + OL D(a) with F = Or a⁻² + Om a⁻¹ + Ok and D = a^-q e^(b(a-1)),
// q = 1+3(w0+wa), b = 3wa. D is positive, so E² has the sign of F/D + OL, whose derivative vanishes where
// F' = (D'/D)F, with ' = d/dln a:
//
//	-b Ok a³ + (q Ok - b Om) a² + ((q-1)Om - b Or) a + (q-2)Or = 0
//
// Between the positive roots of this cubic F/D + OL is monotonic, so the signs of E² at the roots and at the
// two ends find every zero, for any signs of the parameters. A double zero (the loitering line) sits at a root
// itself, where the position enters E² only to second order.

// stationary returns, in ascending order, the roots of that cubic in the open interval (lo, hi).
func (e *expansion) stationary(lo, hi float64) ([3]float64, int) {
	q := e.p - 2
	return cubicRoots([4]float64{
		e.or * (q - 2),
		e.om*(q-1) - e.b*e.or,
		q*e.ok - e.b*e.om,
		-e.b * e.ok,
	}, lo, hi)
}

// early is the sign of E² as a → 0 and the exponent n of its leading term a^-n. A sign of zero means that E²
// vanishes identically or a parameter is NaN.
func (e *expansion) early() (sign, n float64) {
	ok, om, or, ol := e.merge(e.ol * math.Exp(-e.b))
	sign, n = 0, math.Inf(-1)
	for _, t := range [4][2]float64{{ok, 2}, {om, 3}, {or, 4}, {ol, e.p}} {
		if t[0] != 0 && t[1] > n {
			sign, n = t[0], t[1]
		}
	}
	return sign, n
}

// late is the sign of E² as a → ∞. Dark energy wins if wa > 0 and dies away if wa < 0.
func (e *expansion) late() float64 {
	if e.b > 0 && e.ol != 0 {
		return e.ol
	}
	ok, om, or, ol := e.ok, e.om, e.or, e.ol
	p := e.p
	if e.b < 0 {
		p = math.Inf(1)
	} else {
		ok, om, or, ol = e.merge(ol)
	}
	sign, n := 0.0, math.Inf(1)
	for _, t := range [4][2]float64{{ol, p}, {ok, 2}, {om, 3}, {or, 4}} {
		if t[0] != 0 && (t[1] < n || sign == 0) {
			sign, n = t[0], t[1]
		}
	}
	return sign
}

// merge adds dark energy of amplitude ol to the component that scales like it, if there is one.
func (e *expansion) merge(ol float64) (ok, om, or, rest float64) {
	switch e.p {
	case 2:
		return e.ok + ol, e.om, e.or, 0
	case 3:
		return e.ok, e.om + ol, e.or, 0
	case 4:
		return e.ok, e.om, e.or + ol, 0
	}
	return e.ok, e.om, e.or, ol
}

// pastZero is the largest a < 1 at which E² = 0, the bounce of a universe without a big bang; 0 if none.
func (e *expansion) pastZero() float64 {
	if e.positive() || e.lambda && e.or == 0 && e.om > 0 && !e.bounced() {
		return 0
	}
	roots, n := e.stationary(0, 1)
	hi := 1.0
	for i := n - 1; i >= 0; i-- {
		if e.sign(roots[i]) <= 0 {
			return e.zero(roots[i], hi)
		}
		hi = roots[i]
	}
	if sign, _ := e.early(); sign >= 0 {
		return 0
	}
	for lo := hi / 2; lo > 1e-300; lo *= lo {
		if e.sign(lo) <= 0 {
			return e.zero(lo, hi)
		}
	}
	return 0
}

// futureZero is the smallest a > 1 at which the expansion stops; +Inf if none. A double zero does not count:
// it is approached for ever and never reached.
func (e *expansion) futureZero() float64 {
	if e.positive() {
		return math.Inf(1)
	}
	roots, n := e.stationary(1, math.Inf(1))
	lo := 1.0
	for _, a := range roots[:n] {
		if e.sign(a) < 0 {
			return e.zero(lo, a)
		}
		lo = a
	}
	if e.late() >= 0 {
		return math.Inf(1)
	}
	for hi := 2 * lo; hi < 1e300; hi *= hi {
		if e.sign(hi) < 0 {
			return e.zero(lo, hi)
		}
	}
	return math.Inf(1)
}

// positive reports that no term of E² is negative and one is positive: there is nothing to look for.
func (e *expansion) positive() bool {
	return e.or >= 0 && e.om >= 0 && e.ok >= 0 && e.ol >= 0
}

// sign has the sign of E² at a. It is a²E², which does not overflow where E² would.
func (e *expansion) sign(a float64) float64 {
	x := 1 / a
	rest := (e.or*x+e.om)*x + e.ok
	if e.ol == 0 {
		return rest
	}
	if e.lambda {
		return rest + e.ol*a*a
	}
	return rest + e.ol*math.Exp(e.b*(a-1)-(e.p-2)*math.Log(a))
}

// zero finds the a between lo and hi at which a²E² changes sign, by Newton steps in ln a kept inside a
// shrinking bracket.
func (e *expansion) zero(lo, hi float64) float64 {
	l, h := math.Log(lo), math.Log(hi)
	rising := e.sign(hi) > 0
	s := (l + h) / 2
	for range 200 {
		r, dr := e.reduced(s)
		if r == 0 {
			break
		}
		if (r > 0) == rising {
			h = s
		} else {
			l = s
		}
		next := s - r/dr
		if !(next > l && next < h) {
			next = (l + h) / 2
		}
		if math.Abs(next-s) <= 1e-16*max(1, math.Abs(s)) {
			s = next
			break
		}
		s = next
	}
	return math.Exp(s)
}

// cubicRoots returns in ascending order the roots in the open interval (lo, hi) of
// c[0] + c[1]x + c[2]x² + c[3]x³, at which it changes sign; lo ≥ 0, and hi may be infinite. The interval is
// cut at the extrema and each monotonic piece searched by itself, which stays accurate when leading
// coefficients are tiny, as they are for wa near zero; a formula by radicals does not.
func cubicRoots(c [4]float64, lo, hi float64) (roots [3]float64, n int) {
	if math.IsInf(hi, 1) {
		hi = max(rootBound(c), 2*lo)
	}
	cut := [4]float64{lo, hi, hi, hi}
	k := 1
	e1, e2 := quadraticRoots(3*c[3], 2*c[2], c[1])
	for _, x := range [2]float64{e1, e2} {
		if x > lo && x < hi {
			cut[k] = x
			k++
		}
	}
	fl := cubic(c, lo)
	for i := range k {
		l, h := cut[i], cut[i+1]
		fh := cubic(c, h)
		if fl < 0 && fh > 0 || fl > 0 && fh < 0 {
			roots[n] = cubicRoot(c, l, h, fh > 0)
			n++
		} else if fh == 0 && h < hi {
			roots[n] = h
			n++
		}
		fl = fh
	}
	return roots, n
}

func cubic(c [4]float64, x float64) float64 { return ((c[3]*x+c[2])*x+c[1])*x + c[0] }

// rootBound is Cauchy's bound on the modulus of the roots, 1 + max|c_i/c_n|, kept below what the cube of it
// would overflow.
func rootBound(c [4]float64) float64 {
	d := 3
	for d > 0 && c[d] == 0 {
		d--
	}
	m := 0.0
	for i := range d {
		m = max(m, math.Abs(c[i]/c[d]))
	}
	return min(1+m, 1e90)
}

// cubicRoot finds the root between l and h, where the cubic changes sign, to a relative 1e-12: far more than a
// stationary point needs.
func cubicRoot(c [4]float64, l, h float64, rising bool) float64 {
	x := middle(l, h)
	for range 400 {
		f := cubic(c, x)
		if f == 0 {
			return x
		}
		if (f > 0) == rising {
			h = x
		} else {
			l = x
		}
		next := x - f/((3*c[3]*x+2*c[2])*x+c[1])
		if !(next > l && next < h) {
			next = middle(l, h)
		}
		if math.Abs(next-x) <= 1e-12*x {
			return next
		}
		x = next
	}
	return x
}

// middle halves an interval of positive numbers: geometrically if it spans more than a factor of ten.
func middle(l, h float64) float64 {
	if l > 0 && h > 10*l {
		return math.Sqrt(l) * math.Sqrt(h)
	}
	return l + (h-l)/2
}

// quadraticRoots solves a x² + b x + c = 0 without cancellation, in ascending order; NaN for roots that do not
// exist.
func quadraticRoots(a, b, c float64) (x1, x2 float64) {
	d := b*b - 4*a*c
	if !(d >= 0) {
		return math.NaN(), math.NaN()
	}
	t := -(b + math.Copysign(math.Sqrt(d), b)) / 2
	x1, x2 = t/a, c/t
	if x1 > x2 {
		x1, x2 = x2, x1
	}
	return x1, x2
}
