package figure

import (
	"math"
	"math/rand/v2"
	"strconv"

	"omen/cmd/omen/internal/density"
)

// Synthetic inputs, seeded. The numbers are plausible but mean nothing.

func random(stream uint64) *rand.Rand { return rand.New(rand.NewPCG(20, stream)) }

// hostile is a name that a data file might hold.
const hostile = `<script>alert(1)</script> & \input{x}`

func modulus(z, om, ol float64) float64 {
	ok := 1 - om - ol
	const n = 200
	sum := 0.0
	for i := range n {
		x := (float64(i) + 0.5) / n * z
		sum += z / n / math.Sqrt(om*math.Pow(1+x, 3)+ok*(1+x)*(1+x)+ol)
	}
	s := math.Sqrt(math.Abs(ok))
	switch {
	case ok > 1e-6:
		sum = math.Sinh(s*sum) / s
	case ok < -1e-6:
		sum = math.Sin(s*sum) / s
	}
	return 5*math.Log10((1+z)*sum*299792.458/70) + 25
}

// smoothBand is a band of relative width w(x) about f.
func smoothBand(x []float64, f, w func(float64) float64) Band {
	b := Band{X: x}
	for _, v := range x {
		m, d := f(v), w(v)
		b.Best = append(b.Best, m)
		b.Lo68, b.Hi68 = append(b.Lo68, m-d), append(b.Hi68, m+d)
		b.Lo95, b.Hi95 = append(b.Lo95, m-2*d), append(b.Hi95, m+2.1*d)
	}
	return b
}

func logSpace(lo, hi float64, n int) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = lo * math.Pow(hi/lo, float64(i)/float64(n-1))
	}
	return x
}

func supernovae(name string, n int, lo, hi float64, stream uint64) Points {
	r := random(stream)
	p := Points{Name: Plain(name)}
	for range n {
		z := lo * math.Pow(hi/lo, math.Sqrt(r.Float64()))
		e := 0.1 + 0.05*r.Float64()
		if z > 0.9 {
			e *= 2
		}
		p.Z, p.Err = append(p.Z, z), append(p.Err, e)
		p.Value = append(p.Value, modulus(z, 0.31, 0.68)+e*r.NormFloat64())
	}
	return p
}

func hubbleModel() Band {
	return smoothBand(logSpace(0.005, 2.6, 300), func(z float64) float64 { return modulus(z, 0.31, 0.68) },
		func(z float64) float64 { return 0.006 + 0.02*math.Abs(math.Log10(z/0.2)) })
}

func baoSample(name string, z []float64, f func(float64) float64, stream uint64) BAO {
	r := random(stream)
	b := BAO{Points: Points{Name: Markup(name), Z: z}}
	for _, v := range z {
		e := 0.02 * f(v)
		b.Err = append(b.Err, e)
		b.Value = append(b.Value, f(v)+e*r.NormFloat64())
	}
	b.Model = smoothBand(logSpace(0.1, 3, 100), f, func(x float64) float64 { return (0.003 + 0.0015*float64(stream-4)*x) * f(x) })
	return b
}

func hubbleFew() Hubble {
	return Hubble{
		Magnitude:  Markup("distance modulus *μ* (mag)"),
		Supernovae: []Points{supernovae("harbour survey", 40, 0.012, 0.1, 1), supernovae(hostile, 60, 0.1, 1.1, 2)},
		Model:      hubbleModel(),
	}
}

func hubbleMany() Hubble {
	dm := func(z float64) float64 { return 30 * z / (1 + 0.25*z) }
	dh := func(z float64) float64 { return 29 / math.Sqrt(0.31*math.Pow(1+z, 3)+0.69) }
	return Hubble{
		Magnitude:  Markup("magnitude *m* (mag)"),
		Supernovae: []Points{supernovae("1500 supernovae", 1500, 0.01, 2.2, 3)},
		Model:      hubbleModel(),
		BAO: []BAO{
			baoSample("*D*_M/*r*_d", []float64{0.51, 0.71, 0.93, 1.32, 1.49, 2.33}, dm, 4),
			baoSample("*D*_H/*r*_d", []float64{0.53, 0.73, 0.96, 1.36, 1.53, 2.4}, dh, 5),
			baoSample("*D*_V/*r*_d", []float64{0.295}, dm, 6),
		},
		Unfinished: true,
	}
}

// cloud are correlated Gaussian draws, bent a little, inside the prior.
func cloud(name string, n int, x, y, sx, sy, rho float64, stream uint64) Set {
	r := random(stream)
	s := Set{Name: Plain(name), ESS: float64(n) / 3}
	for len(s.X) < n {
		a, b := r.NormFloat64(), r.NormFloat64()
		u, v := x+sx*a, y+sy*(rho*a+math.Sqrt(1-rho*rho)*b)
		if u > 0 && u < 1.5 && v > -0.5 && v < 1.8 {
			s.X, s.Y = append(s.X, u), append(s.Y, v)
		}
	}
	return s
}

func span(lo, hi float64, n int) []float64 {
	x := make([]float64, n)
	for i := range x {
		x[i] = lo + (hi-lo)*float64(i)/float64(n-1)
	}
	return x
}

func apply(x []float64, f func(float64) float64) []float64 {
	y := make([]float64, len(x))
	for i := range x {
		y[i] = f(x[i])
	}
	return y
}

// fateLines are the boundaries of Carroll, Press & Turner 1992, Annu. Rev. Astron. Astrophys. 30, 499, eqs. 12-13.
func fateLines() []Divider {
	om := span(0, 1.6, 200)
	return []Divider{
		{X: om, Y: apply(om, func(m float64) float64 { return 1 - m }), Left: Plain("closed"), Right: Plain("open")},
		{X: om, Y: apply(om, func(m float64) float64 { return m / 2 }), Left: Plain("accelerating today"), Right: Plain("decelerating today")},
		{X: om, Y: apply(om, recollapse), Left: Plain("expands forever"), Right: Plain("recollapses")},
		{X: om, Y: apply(om, loitering), Left: Plain("no big bang"), Exclude: true},
	}
}

func recollapse(m float64) float64 {
	if m <= 1 {
		return 0
	}
	return 4 * m * math.Pow(math.Cos(math.Acos((1-m)/m)/3+4*math.Pi/3), 3)
}

func loitering(m float64) float64 {
	switch {
	case m == 0:
		return 1
	case m < 0.5:
		return 4 * m * math.Pow(math.Cosh(math.Acosh((1-m)/m)/3), 3)
	}
	return 4 * m * math.Pow(math.Cos(math.Acos((1-m)/m)/3), 3)
}

func planeThree() Plane {
	best := [2]float64{0.31, 0.69}
	combined := cloud("combined", 8000, 0.305, 0.69, 0.012, 0.025, 0.3, 13)
	combined.Best = &best
	return Plane{
		X: WithUnit(Symbol("Om")), Y: WithUnit(Symbol("OL")),
		XEdges: density.Edges{Lo: 0, Hi: 1.5}, YEdges: density.Edges{Lo: -0.5, Hi: 1.8},
		Sets: []Set{
			cloud("supernovae", 8000, 0.33, 0.72, 0.07, 0.11, 0.85, 11),
			cloud("BAO", 8000, 0.30, 0.68, 0.025, 0.07, -0.5, 12),
			combined,
		},
		Dividers: fateLines(),
	}
}

func planeOne() Plane {
	p := planeThree()
	p.Sets = []Set{cloud("few supernovae", 6000, 0.25, 0.6, 0.22, 0.35, 0.8, 14)}
	p.Frame = &[4]float64{0, 1.2, -0.5, 1.8}
	p.Unfinished = true
	return p
}

// parameters draws k parameters of a correlated posterior.
func parameters(k, n int) Marginals {
	r := random(15)
	names := []string{"Om", "OL", "H0", "w0", "rd", "Ok"}
	mean := []float64{0.31, 0.69, 68.4, -0.92, 147.2, 0}
	sd := []float64{0.15, 0.1, 1.1, 0.09, 1.9, 0.02}
	draws := make([][]float64, k)
	for range n {
		a := r.NormFloat64()
		v := make([]float64, k)
		for i := range v {
			c := 0.8 - 0.25*float64(i)
			v[i] = mean[i] + sd[i]*(c*a+math.Sqrt(1-c*c)*r.NormFloat64())
		}
		if v[0] < 0 {
			continue
		}
		for i := range v {
			draws[i] = append(draws[i], v[i])
		}
	}
	m := Marginals{ESS: float64(n) / 4}
	for i := range k {
		s, u := Symbol(names[i])
		p := Parameter{Symbol: s, Unit: u, Draws: draws[i], Best: mean[i]}
		switch i {
		case 0:
			p.Edges = density.Edges{Lo: 0, Hi: 1.5}
			p.PriorX, p.PriorP = []float64{0, 1.5}, []float64{1 / 1.5, 1 / 1.5}
		case 1:
			p.PriorX = span(0, 1.5, 50)
			p.PriorP = apply(p.PriorX, func(x float64) float64 { return math.Exp(-(x-0.6)*(x-0.6)/0.08) / 0.5 })
		default:
			p.PriorX, p.PriorP = []float64{mean[i] - 20*sd[i], mean[i] + 20*sd[i]}, []float64{0.025 / sd[i], 0.025 / sd[i]}
		}
		m.Parameters = append(m.Parameters, p)
	}
	return m
}

func historyForever() History {
	f := func(t float64) float64 { // flat matter and Λ, t in Gyr from today
		const ol, h0 = 0.69, 1 / 14.2
		t0 := 2 / (3 * h0 * math.Sqrt(ol)) * math.Asinh(math.Sqrt(ol/(1-ol)))
		if t+t0 < 0 {
			return math.NaN()
		}
		return math.Pow((1-ol)/ol, 1./3) * math.Pow(math.Sinh(1.5*math.Sqrt(ol)*h0*(t+t0)), 2./3)
	}
	b := smoothBand(span(-15, 22, 300), f, func(t float64) float64 { return 0.0022 * t * t / (1 + math.Abs(t)/40) * max(0.2, t/12) })
	for i, v := range b.Lo95 {
		b.Lo95[i] = max(0, v)
	}
	return History{
		Scale: b, Unit: Plain("Gyr"), Coasting: 1 / 14.2, Top: 4.5,
		Moments: []Moment{
			{Name: Plain("big bang"), Time: -13.6, Lo68: -13.8, Hi68: -13.3},
			{Name: Plain("acceleration begins"), Time: -6.1, Lo68: -6.5, Hi68: -5.6},
		},
	}
}

func historyCrunch() History {
	var b Band
	nan := math.NaN()
	for _, t := range span(-1, 4.6, 500) {
		at := func(w float64) float64 { // a cycloid-like arch of length 4.4+w
			u := (t + 0.72) / (4.4 + w)
			if u < 0 || u > 1 {
				return nan
			}
			return 1.75 * (1 + w) * math.Pow(math.Sin(math.Pi*u), 0.75)
		}
		b.X = append(b.X, t)
		b.Best = append(b.Best, at(0))
		life := func(w float64) float64 {
			if v := at(w); v > 0 {
				return v
			}
			return 0
		}
		b.Lo68, b.Hi68 = append(b.Lo68, life(-0.03*(1+t))), append(b.Hi68, life(0.03*(1+t)))
		b.Lo95, b.Hi95 = append(b.Lo95, life(-0.06*(1+t))), append(b.Hi95, life(0.08*(1+t)))
	}
	return History{Scale: b, Unit: Markup("1/*H*_0"), Coasting: 1, Top: 2.6, Unfinished: true,
		Moments: []Moment{{Name: Plain("big crunch"), Time: 3.68, Lo68: 3.5, Hi68: 3.9}, {Name: Plain("big bang"), Time: -0.72, Lo68: nan, Hi68: nan}}}
}

func fatesBoth() Fates {
	return Fates{
		Rows: []Label{Plain("recollapse (big crunch)"), Plain("expands forever, accelerating"), Plain("expands forever, decelerating"),
			Plain("critical"), Plain("coasting"), Plain("big rip"), Plain("no big bang in the past")},
		Series: []FateSeries{
			{Plain("within the fitted family"), []Probability{{P: 3.2e-8, Err: 2e-10}, {P: 0.9921, Err: 0.0013}, {P: 7.9e-3, Err: 1.3e-3},
				{P: math.NaN()}, {P: math.NaN()}, {P: math.NaN()}, {P: 7.5e-4, Limit: true}}},
			{Plain("averaged over the nested universes"), []Probability{{P: 2.1e-8, Err: 2e-10}, {P: 0.962, Err: 0.004}, {P: 5.1e-3, Err: 9e-4},
				{P: 4e-9, Err: 1e-10}, {P: 1.3e-5, Err: 1e-6}, {P: 0.033, Err: 0.004}, {P: 7.5e-4, Limit: true}}},
		},
		LimitLevel: Plain("95% upper limit"),
	}
}

func fatesOne() Fates {
	return Fates{
		Rows: []Label{Plain("recollapse (big crunch)"), Plain("expands forever, accelerating"), Plain("expands forever, decelerating")},
		Series: []FateSeries{{Plain("fitted family"), []Probability{{P: 0.21, Err: 0.012}, {P: 0.64, Err: 0.015},
			{P: 0.15, Err: 0.011}}}},
		Unfinished: true,
	}
}

func convergence() Convergence {
	r := random(16)
	c := Convergence{Every: 10, BurnIn: 1400, RhatGoal: 1.01, ESSGoal: 4000}
	for i, name := range []string{"Om", "OL", "H0"} {
		s, _ := Symbol(name)
		t := Trace{Symbol: s, Time: 5.5 + float64(i)}
		scale := []float64{0.02, 0.05, 1.2}[i]
		centre := []float64{0.31, 0.69, 69}[i]
		for e := range 4 {
			v := scale * float64(8-4*e)
			tr := make([]float64, 900)
			for k := range tr {
				v = 0.95*v + 0.2*scale*r.NormFloat64()
				tr[k] = centre + v
			}
			t.Ensembles = append(t.Ensembles, tr)
		}
		for k := range 120 {
			t.Autocorrelation = append(t.Autocorrelation, math.Exp(-float64(k)/t.Time)+0.01*r.NormFloat64())
		}
		c.Traces = append(c.Traces, t)
	}
	for k := 1; k <= 30; k++ {
		s := float64(k) * 300
		c.Checks = append(c.Checks, Check{s, 1 + 0.4*math.Exp(-s/1200) + 0.004, 0.52 * s})
	}
	return c
}

func whiskers() Whiskers {
	w := Whiskers{Runs: []Label{Plain("all supernovae"), Plain("z > 0.02"), Plain("BAO"), Plain("BAO + supernovae")}}
	r := random(17)
	for i, name := range []string{"Om", "OL", "H0"} {
		s, u := Symbol(name)
		q := Quantity{Symbol: s, Unit: u}
		for k := range w.Runs {
			m := []float64{0.31, 0.69, 68}[i]
			d := m * (0.04 + 0.05*r.Float64())
			m += d * r.NormFloat64()
			c := Constraint{Median: m, Lo68: m - d, Hi68: m + 1.1*d, Lo95: m - 2*d, Hi95: m + 2.3*d}
			if name == "H0" && k < 2 {
				c.Median = math.NaN()
			}
			q.Runs = append(q.Runs, c)
		}
		w.Quantities = append(w.Quantities, q)
	}
	return w
}

// stress are inputs at the limits of what fits.
func stress() []drawing {
	long := "a run with a rather long name, cut at z > 0.023 and without the survey"
	wide := whiskers()
	wide.Runs[1] = Plain(long)
	wide.Quantities[2].Runs[0].Note, wide.Quantities[2].Runs[1].Note = Plain("−1, fixed"), Plain("–")
	for i := range 3 {
		wide.Quantities = append(wide.Quantities, wide.Quantities[i])
	}
	six := planeThree()
	six.Sets[1].Name = Plain(long)
	for i := range 3 {
		six.Sets = append(six.Sets, cloud("run "+strconv.Itoa(i), 2000, 0.3+0.1*float64(i), 0.7, 0.05, 0.1, 0.5, uint64(30+i)))
	}
	bao := hubbleMany()
	bao.Supernovae = nil
	crowd := hubbleFew()
	crowd.Supernovae[0].Name = Plain(long + " " + long)
	fates := fatesBoth()
	fates.Rows[0] = Plain(long)
	fates.Series[0].Values[1] = Probability{P: 1}
	fates.Series[0].Values[2] = Probability{P: 0}
	fates.Series[1].Name = Plain(long)
	line := planeOne()
	flat := Set{Name: Plain("flat"), Line: true}
	for _, x := range cloud("", 4000, 0.3, 0.7, 0.02, 0.1, 0.5, 41).X {
		flat.X, flat.Y = append(flat.X, x), append(flat.Y, 1-x)
	}
	line.Sets = append(line.Sets, flat)
	out := []drawing{
		{"plane-line", func() (*Figure, error) { return DrawPlane(line, Column) }},
		{"whiskers-wide", func() (*Figure, error) { return DrawWhiskers(wide, Column) }},
		{"plane-six", func() (*Figure, error) { return DrawPlane(six, Column) }},
		{"hubble-bao", func() (*Figure, error) { return DrawHubble(bao, Column) }},
		{"hubble-long", func() (*Figure, error) { return DrawHubble(crowd, Column) }},
		{"fates-long", func() (*Figure, error) { return DrawFates(fates, Column) }},
	}
	for k := 1; k <= mostParameters; k++ {
		for _, w := range []Width{Column, Page} {
			out = append(out, drawing{"marginals-stress-" + strconv.Itoa(k) + "-" + strconv.Itoa(int(w)),
				func() (*Figure, error) { return DrawMarginals(parameters(k, 1000), w) }})
		}
	}
	return out
}
