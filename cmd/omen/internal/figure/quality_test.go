package figure

import (
	"bytes"
	"errors"
	"image/color"
	"io"
	"math"
	"sync"
	"testing"
)

// What a referee measures: all text lies on the page and is large enough, no text covers another, the width is that
// of the journal.
func TestLegible(t *testing.T) {
	for _, d := range append(drawings[:len(drawings):len(drawings)], stress()...) {
		f, err := d.draw()
		if err != nil {
			t.Fatalf("%s: %v", d.name, err)
		}
		show(t, d.name, f)
		if f.w != Column.points() && f.w != Page.points() {
			t.Errorf("%s: width %g pt", d.name, f.w)
		}
		var boxes []rect
		for _, o := range f.ops {
			if len(o.text) == 0 {
				continue
			}
			for _, p := range o.text {
				if p.size < 7 {
					t.Errorf("%s: %q at %g pt", d.name, p.text, p.size)
				}
			}
			b := bounds(o)
			if b.x0 < 0 || b.y0 < 0 || b.x1 > f.w || b.y1 > f.h {
				t.Errorf("%s: %q reaches off the page: %.1f of %g × %g", d.name, o.text[0].text, b, f.w, f.h)
			}
			if o.angle != 0 && math.Abs(o.angle-math.Pi/2) > 1e-9 {
				continue // the box of a slanting text says little
			}
			for _, other := range boxes {
				if b.x0 < other.x1 && other.x0 < b.x1 && b.y0 < other.y1 && other.y0 < b.y1 {
					t.Errorf("%s: %q covers another text", d.name, o.text[0].text)
				}
			}
			boxes = append(boxes, b)
		}
	}
}

// bounds is the box of the ink of a text: from the baseline to the height of capitals, as descenders may reach
// into a line below without harm.
func bounds(o op) rect {
	b := rect{math.Inf(1), math.Inf(1), math.Inf(-1), math.Inf(-1)}
	sin, cos := math.Sincos(o.angle)
	for _, p := range o.text {
		for _, c := range [4]pt{{p.dx, p.dy}, {p.dx + p.width, p.dy}, {p.dx, p.dy + capHeight*p.size}, {p.dx + p.width, p.dy + capHeight*p.size}} {
			x, y := o.at.x+c.x*cos-c.y*sin, o.at.y+c.x*sin+c.y*cos
			b = rect{min(b.x0, x), min(b.y0, y), max(b.x1, x), max(b.y1, y)}
		}
	}
	return b
}

func TestSameBytes(t *testing.T) {
	for i, d := range drawings {
		for _, format := range Formats() {
			if format == "png" && i > 0 { // slow, and drawn by the same list
				continue
			}
			var b [2]bytes.Buffer
			for k := range b {
				f, err := d.draw()
				if err != nil {
					t.Fatal(err)
				}
				if err := f.Write(&b[k], format); err != nil {
					t.Fatal(err)
				}
			}
			if !bytes.Equal(b[0].Bytes(), b[1].Bytes()) {
				t.Errorf("%s.%s differs between two drawings of the same input", d.name, format)
			}
		}
	}
}

// Figures may be written side by side; the fonts are shared.
func TestConcurrentWrites(t *testing.T) {
	f, err := DrawFates(fatesBoth(), Column)
	if err != nil {
		t.Fatal(err)
	}
	var b [4]bytes.Buffer
	var errs [4]error
	var all sync.WaitGroup
	for i := range b {
		all.Go(func() { errs[i] = f.Write(&b[i], Formats()[i%2]) })
	}
	all.Wait()
	if err := errors.Join(errs[:]...); err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(b[0].Bytes(), b[2].Bytes()) || !bytes.Equal(b[1].Bytes(), b[3].Bytes()) {
		t.Error("writing side by side changes a file")
	}
}

// Unfinished runs say so on every figure.
func TestUnfinished(t *testing.T) {
	h, p, m, a, f, c, w := hubbleFew(), planeThree(), parameters(2, 500), historyForever(), fatesBoth(), convergence(), whiskers()
	for _, on := range []bool{false, true} {
		h.Unfinished, p.Unfinished, m.Unfinished, a.Unfinished = on, on, on, on
		f.Unfinished, c.Unfinished, w.Unfinished = on, on, on
		for i, draw := range []func() (*Figure, error){
			func() (*Figure, error) { return DrawHubble(h, Column) }, func() (*Figure, error) { return DrawPlane(p, Column) },
			func() (*Figure, error) { return DrawMarginals(m, Column) }, func() (*Figure, error) { return DrawHistory(a, Column) },
			func() (*Figure, error) { return DrawFates(f, Column) }, func() (*Figure, error) { return DrawConvergence(c, Column) },
			func() (*Figure, error) { return DrawWhiskers(w, Column) },
		} {
			g, err := draw()
			if err != nil {
				t.Fatal(err)
			}
			said := false
			for _, o := range g.ops {
				said = said || len(o.text) > 0 && o.text[0].text == "unfinished run"
			}
			if said != on {
				t.Errorf("figure %d: unfinished %v, and it says so: %v", i, on, said)
			}
		}
	}
}

// The palette in numbers: areas of the first four series on paper, lines of all six, and how they look to those
// who lack one kind of cone.
func TestPalette(t *testing.T) {
	for scheme := range 2 {
		paper := palette[inkPaper][scheme]
		for i := range series {
			if c := contrast(palette[lineInk(i)][scheme], paper); c < 4.5 {
				t.Errorf("line %d in scheme %d: contrast %.2f", i, scheme, c)
			}
			for j := range i {
				for sight, m := range sights {
					a, b := lab(m, palette[fillInk(i)][scheme]), lab(m, palette[fillInk(j)][scheme])
					if d := math.Sqrt(sq(a[0]-b[0]) + sq(a[1]-b[1]) + sq(a[2]-b[2])); d < 12 {
						t.Errorf("areas %d and %d in scheme %d: ΔE %.1f to %s sight", j, i, scheme, d, sight)
					}
				}
				if scheme == 0 && i < 4 {
					a, b := lab(sights["normal"], palette[fillInk(i)][0]), lab(sights["normal"], palette[fillInk(j)][0])
					if d := math.Abs(a[0] - b[0]); d < 13 {
						t.Errorf("areas %d and %d: lightness differs by %.1f", j, i, d)
					}
				}
			}
		}
		for _, k := range []ink{inkText, inkSoft, inkWarn} {
			if c := contrast(palette[k][scheme], paper); c < 4.5 {
				t.Errorf("text %d in scheme %d: contrast %.2f", k, scheme, c)
			}
		}
	}
}

func sq(x float64) float64 { return x * x }

// sights are linear-light matrices of complete colour blindness (Machado, Oliveira & Fernandes 2009, IEEE Trans.
// Vis. Comput. Graph. 15, 1291, severity 1.0; values from memory, rows sum to one).
var sights = map[string][9]float64{
	"normal": {1, 0, 0, 0, 1, 0, 0, 0, 1},
	"protan": {0.152286, 1.052583, -0.204868, 0.114503, 0.786281, 0.099216, -0.003882, -0.048116, 1.051998},
	"deutan": {0.367322, 0.860646, -0.227968, 0.280085, 0.672501, 0.047413, -0.011820, 0.042940, 0.968881},
}

// linear undoes the transfer curve of sRGB (IEC 61966-2-1).
func linear(c color.NRGBA) [3]float64 {
	var out [3]float64
	for i, v := range [3]uint8{c.R, c.G, c.B} {
		u := float64(v) / 255
		if u <= 0.04045 {
			out[i] = u / 12.92
		} else {
			out[i] = math.Pow((u+0.055)/1.055, 2.4)
		}
	}
	return out
}

// contrast is that of WCAG 2.1.
func contrast(a, b color.NRGBA) float64 {
	la, lb := luminance(linear(a)), luminance(linear(b))
	return (max(la, lb) + 0.05) / (min(la, lb) + 0.05)
}

func luminance(l [3]float64) float64 { return 0.2126*l[0] + 0.7152*l[1] + 0.0722*l[2] }

// lab is CIE L*a*b* for white D65.
func lab(m [9]float64, c color.NRGBA) [3]float64 {
	l := linear(c)
	var r [3]float64
	for i := range r {
		r[i] = min(max(m[3*i]*l[0]+m[3*i+1]*l[1]+m[3*i+2]*l[2], 0), 1)
	}
	f := func(t float64) float64 {
		if t > 0.008856 {
			return math.Cbrt(t)
		}
		return 7.787*t + 16./116
	}
	x := f((0.4124*r[0] + 0.3576*r[1] + 0.1805*r[2]) / 0.9505)
	y := f(luminance(r))
	z := f((0.0193*r[0] + 0.1192*r[1] + 0.9505*r[2]) / 1.089)
	return [3]float64{116*y - 16, 500 * (x - y), 200 * (y - z)}
}

// BenchmarkAllFigures draws the figures that a run draws.
func BenchmarkAllFigures(b *testing.B) {
	h, p, m, a, f, c := hubbleMany(), planeThree(), parameters(6, 20000), historyForever(), fatesBoth(), convergence()
	all := []func() (*Figure, error){
		func() (*Figure, error) { return DrawHubble(h, Page) }, func() (*Figure, error) { return DrawPlane(p, Column) },
		func() (*Figure, error) { return DrawMarginals(m, Page) }, func() (*Figure, error) { return DrawHistory(a, Column) },
		func() (*Figure, error) { return DrawFates(f, Column) }, func() (*Figure, error) { return DrawConvergence(c, Page) },
	}
	for _, format := range append([]string{"none"}, Formats()...) {
		b.Run(format, func(b *testing.B) {
			for b.Loop() {
				for _, draw := range all {
					g, err := draw()
					if err != nil {
						b.Fatal(err)
					}
					if format == "none" {
						continue
					}
					if err := g.Write(io.Discard, format); err != nil {
						b.Fatal(err)
					}
				}
			}
		})
	}
}
