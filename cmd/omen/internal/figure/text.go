package figure

import (
	"bytes"
	"fmt"
	"math"
	"sync"

	"golang.org/x/image/font"
	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
	"gonum.org/v1/plot/font/liberation"
)

// Sizes of text in points. Nothing is smaller than smallest, subscripts included.
const (
	titleSize = 9 // axis titles, names in the plot
	tickSize  = 7.5
	noteSize  = 7
	smallest  = 7
)

// The two fonts: Liberation Sans upright and italic.
const (
	upright = iota
	italics
)

// face is a font with its outlines at hand.
type face struct {
	font *sfnt.Font
	raw  []byte
}

// faces are read once. Liberation is compiled into the program with gonum/plot.
var faces = sync.OnceValue(func() [2]face {
	var out [2]face
	for _, f := range liberation.Collection() {
		if f.Font.Variant != "Sans" || f.Font.Weight != font.WeightNormal {
			continue
		}
		i := upright
		if f.Font.Style == font.StyleItalic {
			i = italics
		}
		out[i] = readFace(f.Face)
	}
	if out[upright].font == nil || out[italics].font == nil {
		panic("figure: the Liberation Sans fonts are missing from gonum/plot")
	}
	return out
})

func readFace(f *sfnt.Font) face {
	var b bytes.Buffer
	if _, err := f.WriteSourceTo(nil, &b); err != nil {
		panic(fmt.Sprintf("figure: reading Liberation Sans: %v", err))
	}
	return face{f, b.Bytes()}
}

func hasGlyph(r rune) bool {
	var buf sfnt.Buffer
	g, err := faces()[upright].font.GlyphIndex(&buf, r)
	return err == nil && g != 0
}

// advance is the width of s in units of the font size, without kerning, which not every format applies.
func advance(f int, s string) float64 {
	var buf sfnt.Buffer
	sf := faces()[f].font
	units := fixed.Int26_6(sf.UnitsPerEm())
	sum := 0
	for _, r := range s {
		g, err := sf.GlyphIndex(&buf, r)
		if err != nil {
			continue
		}
		if a, err := sf.GlyphAdvance(&buf, g, units, font.HintingNone); err == nil {
			sum += int(a)
		}
	}
	return float64(sum) / float64(units)
}

// piece is a stretch of text in one font and size at an offset from the label's origin.
type piece struct {
	text  string
	font  int
	size  float64
	dx    float64
	dy    float64
	width float64
}

// layout sets a label at a size and returns its pieces and its width.
func (l Label) layout(size float64) ([]piece, float64) {
	var out []piece
	x := 0.0
	for _, r := range l {
		p := piece{text: r.text, size: size, dx: x}
		if r.italic {
			p.font = italics
		}
		if r.level != 0 {
			p.size = max(smallest, 0.76*size)
			p.dy = 0.36 * size
			if r.level < 0 {
				p.dy = -0.2 * size
			}
		}
		p.width = advance(p.font, p.text) * p.size
		out = append(out, p)
		if r.hat {
			w := advance(p.font, "ˆ") * p.size
			lean := 0.0
			if r.italic {
				lean = 0.1 * size
			}
			out = append(out, piece{text: "ˆ", font: p.font, size: p.size, dx: x + (p.width-w)/2 + lean, dy: p.dy + 0.2*size, width: w})
		}
		x += p.width
	}
	return out, x
}

// measure is the width of a label at a size.
func (l Label) measure(size float64) float64 {
	_, w := l.layout(size)
	return w
}

// capHeight is the height of capitals and figures of Liberation Sans in units of the size.
const capHeight = 0.69

// textStyle is how a label is placed: h and v say which point of its box is given (0 left or baseline, 0.5
// middle, 1 right or top of the capitals).
type textStyle struct {
	size  float64
	ink   ink
	h, v  float64
	angle float64
	halo  bool // clear the paper behind it
}

func (c *canvas) text(l Label, x, y float64, s textStyle) {
	if len(l) == 0 {
		return
	}
	pieces, w := l.layout(s.size)
	sin, cos := math.Sincos(s.angle)
	dx, dy := -s.h*w, -s.v*capHeight*s.size
	at := pt{x + dx*cos - dy*sin, y + dx*sin + dy*cos}
	if s.halo {
		c.fill([]line{textBox(at, w, s)}, inkPaper, 0.8)
	}
	c.ops = append(c.ops, op{text: pieces, at: at, angle: s.angle, ink: s.ink, alpha: 1})
}

// textBox outlines a label whose baseline starts at a place.
func textBox(at pt, w float64, s textStyle) line {
	sin, cos := math.Sincos(s.angle)
	up, down := capHeight*s.size+1.2, -0.25*s.size
	l := line{closed: true}
	for _, q := range [4]pt{{-1.2, down}, {w + 1.2, down}, {w + 1.2, up}, {-1.2, up}} {
		l.pts = append(l.pts, pt{at.x + q.x*cos - q.y*sin, at.y + q.x*sin + q.y*cos})
	}
	return l
}

// outline is the text of an op as polygons to fill, curves cut into short straight lines as fine as
// tolerance (points).
func (o *op) outline(visit func(p piece, seg sfnt.Segments, place func(fixed.Point26_6) pt)) {
	sin, cos := math.Sincos(o.angle)
	var buf sfnt.Buffer
	for _, p := range o.text {
		sf := faces()[p.font].font
		units := fixed.Int26_6(sf.UnitsPerEm())
		scale := p.size / float64(units)
		x := p.dx
		for _, r := range p.text {
			g, err := sf.GlyphIndex(&buf, r)
			if err != nil {
				continue
			}
			seg, err := sf.LoadGlyph(&buf, g, units, nil)
			if err == nil {
				left := x
				visit(p, seg, func(q fixed.Point26_6) pt { // the font's y points down
					u, v := left+float64(q.X)*scale, p.dy-float64(q.Y)*scale
					return pt{o.at.x + u*cos - v*sin, o.at.y + u*sin + v*cos}
				})
			}
			if a, err := sf.GlyphAdvance(&buf, g, units, font.HintingNone); err == nil {
				x += float64(a) * scale
			}
		}
	}
}
