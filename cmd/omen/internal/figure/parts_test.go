package figure

import (
	"math"
	"slices"
	"strings"
	"testing"

	"omen/cmd/omen/internal/density"
)

func TestMarkup(t *testing.T) {
	for s, want := range map[string]Label{
		"Ω_m":              {{text: "Ω"}, {text: "m", level: -1}},
		"*H*_{0} (km/s)":   {{text: "H", italic: true}, {text: "0", level: -1}, {text: " (km/s)"}},
		"10^{−3}":          {{text: "10"}, {text: "−3", level: 1}},
		"*~R*":             {{text: "R", italic: true, hat: true}},
		`a\_b \*c`:         {{text: "a_b *c"}},
		"open_{brace":      {{text: "open"}, {text: "brace", level: -1}},
		"ends in _":        {{text: "ends in "}, {level: -1}},
		`<b> & \\input{x}`: {{text: `<b> & \input{x}`}},
	} {
		if got := Markup(s); !slices.Equal(got, want) {
			t.Errorf("%q reads as %v, want %v", s, got, want)
		}
	}
	if got := Plain("a\x00_b\n^{c}☃中"); len(got) != 1 || !strings.HasPrefix(got[0].text, "a _b ^{c}") || strings.ContainsAny(got[0].text, "中\x00\n") {
		t.Errorf("a plain label became %v", got)
	}
}

// Every character of the symbols has a glyph in the fonts; a missing one would print as an empty box.
func TestSymbolsHaveGlyphs(t *testing.T) {
	for _, name := range []string{"Om", "OL", "Ok", "Or", "H0", "w0", "wa", "w", "q0", "rd", "hrd", "ob", "M", "mu", "mag", "z", "a", "age"} {
		s, u := Symbol(name)
		for _, r := range append(append(Label{}, s...), u...) {
			for _, c := range r.text {
				if !hasGlyph(c) {
					t.Errorf("%s: no glyph for %q", name, c)
				}
			}
		}
	}
	for _, c := range "±×−–…≤<ˆτχσμλ□" {
		if !hasGlyph(c) {
			t.Errorf("no glyph for %q", c)
		}
	}
	if s, u := Symbol("H_0{x}"); s.String() != "H_0{x}" || u != nil {
		t.Errorf("an unknown name became %q", s)
	}
}

func TestShorten(t *testing.T) {
	l := Plain("a name that is too long")
	for _, w := range []float64{10, 30, 60} {
		s := l.shorten(w, 8)
		if s.measure(8) > w || !strings.HasSuffix(s.String(), "…") {
			t.Errorf("%q is %.1f wide, at most %g allowed", s, s.measure(8), w)
		}
	}
	if s := l.shorten(1000, 8); s.String() != l.String() {
		t.Errorf("%q was cut though it fits", s)
	}
	if two := l.wrap(60, 8); len(two) != 2 || two[0].String() != "a name that" || two[1].String() != "is too long" {
		t.Errorf("wrapped into %q", two)
	}
}

func labels(ticks []tick) string {
	var s []string
	for _, t := range ticks {
		if t.label != nil {
			s = append(s, t.label.String())
		}
	}
	return strings.Join(s, " ")
}

func TestTicks(t *testing.T) {
	for _, c := range []struct {
		lo, hi float64
		n      int
		want   string
	}{
		{0, 1, 5, "0.0 0.2 0.4 0.6 0.8 1.0"},
		{-0.31, 0.31, 3, "0.0"},
		{-0.5, 1.8, 5, "−0.5 0.0 0.5 1.0 1.5"},
		{66.2, 71, 4, "68 70"},
		{0, 9000, 5, "0 2000 4000 6000 8000"},
		{0.3, 0.30004, 3, "0.30000 0.30002 0.30004"},
	} {
		if got := labels(linearTicks(c.lo, c.hi, c.n)); got != c.want {
			t.Errorf("ticks of [%g, %g]: %s, want %s", c.lo, c.hi, got, c.want)
		}
	}
	if got := labels(someTicks(-0.31, 0.31, 3, 3)); got != "−0.2 0.0 0.2" {
		t.Errorf("at least three ticks: %s", got)
	}
	for _, c := range []struct {
		lo, hi, w float64
		want      string
	}{
		{0.01, 2.4, 200, "0.01 0.1 1"},
		{0.25, 2.9, 200, "0.5 1 2"},
		{1e-9, 1, 90, "10^−9 10^−6 0.001 1"},
		{2e-5, 1, 400, "10^−4 0.001 0.01 0.1 1"},
	} {
		if got := labels(logTicks(c.lo, c.hi, c.w)); got != c.want {
			t.Errorf("log ticks of [%g, %g]: %s, want %s", c.lo, c.hi, got, c.want)
		}
	}
}

func TestProbabilityInPrint(t *testing.T) {
	for want, v := range map[string]Probability{
		"0.9921 ± 0.0013":     {P: 0.9921, Err: 0.0013},
		"0.962 ± 0.004":       {P: 0.962, Err: 0.0041},
		"0.210 ± 0.010":       {P: 0.2104, Err: 0.0097},
		"(3.20 ± 0.10)×10^−8": {P: 3.2e-8, Err: 1e-9},
		"< 8×10^−4":           {P: 7.5e-4, Limit: true},
		"< 0.03":              {P: 0.03, Limit: true},
		"1.0×10^−8":           {P: 1e-8},
		"0.99988":             {P: 0.99988},
		"1":                   {P: 1},
		"0":                   {P: 0},
		"–":                   {P: math.NaN()},
		"as given":            {P: 0.5, Text: Plain("as given")},
	} {
		if got := v.label().String(); got != want {
			t.Errorf("%g ± %g prints as %q, want %q", v.P, v.Err, got, want)
		}
	}
}

// An axis has decades where there are rare fates to show, and none for limits alone; what it has no room for is an
// arrow with its number and no bar.
func TestFatesAxis(t *testing.T) {
	exact := Probability{P: 7.6e-11}
	bound := Probability{P: 1e-12, Limit: true}
	count := Probability{P: 2.1e-4, Limit: true}
	for _, c := range []struct {
		values       []Probability
		log          bool
		lo           float64
		bars, arrows int // of probabilities other than none
		limits       int
		key          string
	}{
		{[]Probability{{P: 0.934}, {P: 0.066}}, false, 0, 2, 0, 0, ""},
		{[]Probability{{P: 0.934}, {P: 0.066}, count}, false, 0, 2, 1, 0, "too small for a bar; <: upper limit"},
		{[]Probability{{P: 0.934}, {P: 0.03, Limit: true}}, false, 0, 1, 0, 1, ""},
		{[]Probability{{P: 1}, exact}, false, 0, 1, 1, 0, "too small for a bar"},
		{[]Probability{{P: 1}, bound}, false, 0, 1, 1, 0, "too small for a bar; <: upper limit"},
		{[]Probability{{P: 0.998}, {P: 0.002}, exact, count}, true, 1e-4, 2, 1, 1, "too small for a bar"},
		{[]Probability{{P: 0.998}, {P: 0.002}, bound, {P: math.NaN()}, {P: 0}}, true, 1e-3, 2, 1, 0, "too small for a bar; <: upper limit"},
		{[]Probability{{P: 1}, {P: 2e-6}}, true, 1e-6, 2, 0, 0, ""},
	} {
		in := Fates{Rows: make([]Label, len(c.values)), Series: []FateSeries{{Values: c.values}}}
		x := in.axis(200)
		bars, arrows, limits := 0, 0, 0
		for _, v := range c.values {
			switch {
			case v.below(x):
				arrows++
			case v.limits(x):
				limits++
			case v.P > 0:
				bars++
			}
		}
		key := ""
		if arrows > 0 {
			key = in.tooSmall(x).String()
		}
		if x.log != c.log || math.Abs(x.lo-c.lo) > 1e-9 || bars != c.bars || arrows != c.arrows || limits != c.limits || key != c.key {
			t.Errorf("%v: log %v from %g, %d bars, %d arrows, %d limits, %q; expected %v from %g, %d, %d, %d, %q",
				c.values, x.log, x.lo, bars, arrows, limits, key, c.log, c.lo, c.bars, c.arrows, c.limits, c.key)
		}
	}
}

// Draws on a line become its stretches of highest density: of a Gaussian, one and two standard deviations.
func TestSetOnLine(t *testing.T) {
	r := random(40)
	s := Set{Name: Plain("flat"), Line: true}
	for range 20000 {
		x := 0.3 + 0.01*r.NormFloat64()
		s.X, s.Y = append(s.X, x), append(s.Y, 0.99-x)
	}
	o, err := s.outlines(density.NoEdges(), density.NoEdges())
	if err != nil || len(o.s68) != 1 || len(o.s95) != 1 || o.r68 != nil {
		t.Fatalf("%+v, %v", o, err)
	}
	for _, c := range []struct {
		got  stretchOf
		half float64
	}{{o.s68[0], 0.00994}, {o.s95[0], 0.0196}} {
		for k, sign := range []float64{-1, 1} {
			if x, y := c.got.x[k], c.got.y[k]; math.Abs(x-0.3-sign*c.half) > 8e-4 || math.Abs(x+y-0.99) > 1e-12 {
				t.Errorf("an end at (%g, %g), expected x = %g on x + y = 0.99", x, y, 0.3+sign*c.half)
			}
		}
	}
	s.Y = s.Y[1:]
	if _, err := s.outlines(density.NoEdges(), density.NoEdges()); err == nil {
		t.Error("draws of x and y that are not as many: no error")
	}
}

// The symbol of a trace stands left of it, where no trace runs.
func TestTraceSymbols(t *testing.T) {
	for _, w := range []Width{Column, Page} {
		in := convergence()
		in.Traces[0].Ensembles[0][5] = 1234.56 // a wide label on its axis
		f, err := DrawConvergence(in, w)
		if err != nil {
			t.Fatal(err)
		}
		first := math.Inf(1) // of the points of all curves
		for _, o := range f.ops {
			if len(o.text) > 0 || len(o.path) == 0 {
				continue
			}
			for _, l := range o.path {
				if len(l.pts) > 20 {
					for _, p := range l.pts {
						first = min(first, p.x)
					}
				}
			}
		}
		n := 0
		for _, o := range f.ops {
			if len(o.text) == 0 || o.text[0].size != titleSize || o.text[0].text != "Ω" && o.text[0].text != "H" {
				continue
			}
			if b := bounds(o); b.x1 > first || b.x0 < 0 {
				t.Errorf("%s from %.1f to %.1f, traces begin at %.1f", o.text[0].text, b.x0, b.x1, first)
			}
			n++
		}
		if n != len(in.Traces) {
			t.Errorf("%d symbols for %d traces", n, len(in.Traces))
		}
	}
}

// The name of the coasting line keeps clear of today, wherever that is.
func TestCoastingCrossesNothing(t *testing.T) {
	for _, end := range []float64{8, 14.2, 22} {
		x := span(-14.2, end, 100)
		in := History{Scale: Band{X: x, Best: apply(x, func(float64) float64 { return 2.2 })}, Unit: Plain("Gyr"), Coasting: 1 / 14.2}
		f, err := DrawHistory(in, Column)
		if err != nil {
			t.Fatal(err)
		}
		p, err := in.panel(f)
		if err != nil {
			t.Fatal(err)
		}
		at := p.at(0, 1).x
		for _, o := range f.ops {
			if len(o.text) > 0 && o.text[0].text == "coasting" {
				if b := bounds(o); b.x0 < at && at < b.x1 {
					t.Errorf("up to %g: the name runs from %.1f to %.1f across today at %.1f", end, b.x0, b.x1, at)
				}
			}
		}
	}
}

func TestClip(t *testing.T) {
	r := rect{0, 0, 10, 10}
	big := []line{{pts: []pt{{-5, -5}, {20, -5}, {20, 20}, {-5, 20}}, closed: true}}
	if got := clipFill(big, r); len(got) != 1 || polygonArea(got[0]) != 100 {
		t.Errorf("a square around the frame is cut to %v", got)
	}
	if got := clipFill([]line{{pts: []pt{{20, 20}, {30, 20}, {30, 30}}, closed: true}}, r); got != nil {
		t.Errorf("outside the frame: %v", got)
	}
	nan := math.NaN()
	got := clipStroke([]line{{pts: []pt{{-5, 5}, {5, 5}, {nan, nan}, {5, 2}, {5, -8}, {7, -8}, {7, 30}}}}, r)
	want := []line{{pts: []pt{{0, 5}, {5, 5}}}, {pts: []pt{{5, 2}, {5, 0}}}, {pts: []pt{{7, 0}, {7, 10}}}}
	if len(got) != len(want) {
		t.Fatalf("a line across the frame is cut to %v, want %v", got, want)
	}
	for i := range want {
		if !slices.Equal(got[i].pts, want[i].pts) {
			t.Errorf("part %d is %v, want %v", i, got[i].pts, want[i].pts)
		}
	}
	total := 0.0
	for _, l := range hatch([]line{r.outline()}, 0.3, 0.01) {
		total += math.Hypot(l.pts[1].x-l.pts[0].x, l.pts[1].y-l.pts[0].y)
	}
	if math.Abs(total*0.01-100) > 0.1 {
		t.Errorf("hatching covers an area of %g, want 100", total*0.01)
	}
}

func polygonArea(l line) float64 {
	a := 0.0
	for i, p := range l.pts {
		q := l.pts[(i+1)%len(l.pts)]
		a += (p.x*q.y - q.x*p.y) / 2
	}
	return a
}

// Bins keep the weighted mean and the total weight.
func TestBinned(t *testing.T) {
	s := supernovae("", 800, 0.01, 2, 40)
	b := s.binned()
	mean := func(p Points) (m, w float64) {
		for i, v := range p.Value {
			g := 1 / (p.Err[i] * p.Err[i])
			m, w = m+g*v, w+g
		}
		return m / w, w
	}
	m0, w0 := mean(s)
	m1, w1 := mean(b)
	if math.Abs(m0-m1) > 1e-9 || math.Abs(w1/w0-1) > 1e-9 || len(b.Z) < 10 || !slices.IsSorted(b.Z) {
		t.Errorf("%d bins of mean %g and weight %g, the points have %g and %g", len(b.Z), m1, w1, m0, w0)
	}
}

// What a caller can get wrong is an error, never a panic or an empty figure.
func TestInputErrors(t *testing.T) {
	hubble, bao := hubbleFew(), hubbleMany()
	hubble.Supernovae[0].Z[3] = -1
	bao.BAO[0].Model.X = bao.BAO[0].Model.X[:5]
	plane, marginals, history := planeThree(), parameters(2, 500), historyForever()
	plane.Sets[1].X = plane.Sets[1].X[:10]
	marginals.Parameters[1].PriorP = nil
	history.Scale.Hi68 = history.Scale.Hi68[1:]
	fates, bad, whisk := fatesBoth(), fatesOne(), whiskers()
	fates.Rows = fates.Rows[1:]
	bad.Series[0].Values[0].P = 1.2
	whisk.Runs = whisk.Runs[1:]
	conv := convergence()
	conv.Traces[0].Ensembles[1] = []float64{1}
	outside := planeThree()
	outside.XEdges = density.Edges{Lo: 0.3, Hi: 1}
	for name, draw := range map[string]func() (*Figure, error){
		"hubble empty":      func() (*Figure, error) { return DrawHubble(Hubble{}, Column) },
		"hubble redshift":   func() (*Figure, error) { return DrawHubble(hubble, Column) },
		"bao model":         func() (*Figure, error) { return DrawHubble(bao, Column) },
		"plane empty":       func() (*Figure, error) { return DrawPlane(Plane{}, Column) },
		"plane lengths":     func() (*Figure, error) { return DrawPlane(plane, Column) },
		"plane edges":       func() (*Figure, error) { return DrawPlane(outside, Column) },
		"marginals none":    func() (*Figure, error) { return DrawMarginals(Marginals{}, Column) },
		"marginals many":    func() (*Figure, error) { return DrawMarginals(Marginals{Parameters: make([]Parameter, 7)}, Column) },
		"marginals prior":   func() (*Figure, error) { return DrawMarginals(marginals, Column) },
		"history band":      func() (*Figure, error) { return DrawHistory(history, Column) },
		"history empty":     func() (*Figure, error) { return DrawHistory(History{}, Column) },
		"fates empty":       func() (*Figure, error) { return DrawFates(Fates{}, Column) },
		"fates lengths":     func() (*Figure, error) { return DrawFates(fates, Column) },
		"fates above one":   func() (*Figure, error) { return DrawFates(bad, Column) },
		"convergence none":  func() (*Figure, error) { return DrawConvergence(Convergence{}, Column) },
		"convergence short": func() (*Figure, error) { return DrawConvergence(conv, Column) },
		"whiskers empty":    func() (*Figure, error) { return DrawWhiskers(Whiskers{}, Column) },
		"whiskers lengths":  func() (*Figure, error) { return DrawWhiskers(whisk, Column) },
	} {
		if f, err := draw(); err == nil || f != nil {
			t.Errorf("%s: no error", name)
		}
	}
	f, _ := drawings[0].draw()
	if err := f.Write(nil, "bmp"); err == nil || !strings.Contains(err.Error(), "pdf, svg, png") {
		t.Errorf("an unknown format: %v", err)
	}
}

// Missing numbers leave gaps, not panics.
func TestGaps(t *testing.T) {
	nan := math.NaN()
	c := convergence()
	c.Traces[0].Time, c.Traces[1].Autocorrelation, c.Checks = nan, nil, []Check{{100, nan, nan}, {200, 1.2, 50}}
	w := whiskers()
	for i := range w.Quantities[0].Runs {
		w.Quantities[0].Runs[i].Median = nan
	}
	h := historyCrunch()
	h.Scale.Lo68, h.Scale.Hi68, h.Coasting = nil, nil, 0
	m := parameters(3, 500)
	m.Parameters[0].Best, m.Parameters[1].PriorX, m.Parameters[1].PriorP = nan, nil, nil
	b := hubbleFew()
	b.Model.Lo68, b.Model.Hi68, b.Model.Lo95, b.Model.Hi95 = nil, nil, nil, nil
	for _, draw := range []func() (*Figure, error){
		func() (*Figure, error) { return DrawConvergence(c, Column) }, func() (*Figure, error) { return DrawWhiskers(w, Column) },
		func() (*Figure, error) { return DrawHistory(h, Column) }, func() (*Figure, error) { return DrawMarginals(m, Column) },
		func() (*Figure, error) { return DrawHubble(b, Column) },
	} {
		f, err := draw()
		if err != nil {
			t.Fatal(err)
		}
		for _, o := range f.ops {
			for _, l := range o.path {
				for _, p := range l.pts {
					if !finite(p.x) || !finite(p.y) {
						t.Fatalf("%s: a point at %v", f.Title, p)
					}
				}
			}
		}
	}
}
