package figure

import (
	"bufio"
	"errors"
	"fmt"
	"html"
	"image/color"
	"io"
	"math"
	"regexp"
	"strconv"
	"strings"

	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
)

// The SVG is written here and not by gonum/plot's vgsvg because a page needs classes for its dark mode, prefixed
// ids and alternative text, and a file needs text as outlines.

// svg writes the list of a canvas. In a file colours are attributes and text is outlines; in a page they are
// classes and characters.
type svg struct {
	*bufio.Writer
	h      float64
	inline bool
}

func (f *Figure) writeSVG(w io.Writer) error {
	s := svg{bufio.NewWriter(w), f.h, false}
	fmt.Fprintf(s, `<?xml version="1.0" encoding="UTF-8"?>`+"\n")
	fmt.Fprintf(s, `<svg xmlns="http://www.w3.org/2000/svg" width="%smm" height="%smm" viewBox="0 0 %s %s" role="img">`+"\n",
		num(f.w/millimetre), num(f.h/millimetre), num(f.w), num(f.h))
	fmt.Fprintf(s, "<title>%s</title>\n", escape(f.Title))
	fmt.Fprintf(s, `<rect width="%s" height="%s" fill="#fff"/>`+"\n", num(f.w), num(f.h))
	for _, o := range f.ops {
		s.op(o)
	}
	s.WriteString("</svg>\n")
	return s.Flush()
}

var validPrefix = regexp.MustCompile(`^[A-Za-z][A-Za-z0-9-]*$`)

// WriteInlineSVG writes the figure for use inside an HTML page: no background, text as characters in a font of
// the metrics of Liberation Sans, colours that follow the reader's preference for dark or light, and the
// alternative text alt. Ids start with idPrefix, a letter followed by letters, digits and hyphens, which must
// be unique on the page.
func (f *Figure) WriteInlineSVG(w io.Writer, idPrefix, alt string) error {
	if !validPrefix.MatchString(idPrefix) {
		return errors.New("figure: the prefix of ids must be a letter followed by letters, digits and hyphens")
	}
	s := svg{bufio.NewWriter(w), f.h, true}
	fmt.Fprintf(s, `<svg xmlns="http://www.w3.org/2000/svg" id="%[1]s" viewBox="0 0 %[2]s %[3]s" width="%[2]spt" `+
		`style="max-width:100%%;height:auto" role="img" aria-labelledby="%[1]s-title %[1]s-desc">`+"\n",
		idPrefix, num(f.w), num(f.h))
	fmt.Fprintf(s, "<title id=\"%[1]s-title\">%[2]s</title>\n<desc id=\"%[1]s-desc\">%[3]s</desc>\n",
		idPrefix, escape(f.Title), escape(alt))
	s.style(idPrefix)
	for _, o := range f.ops {
		s.op(o)
	}
	s.WriteString("</svg>\n")
	return s.Flush()
}

// style gives every ink a class for fills and one for strokes, in two schemes. Text and axes take the colour of
// the page's text.
func (s svg) style(id string) {
	fmt.Fprintf(s, "<style>\n#%s text{font-family:'Liberation Sans',Arial,Helvetica,sans-serif;font-kerning:none;white-space:pre}\n", id)
	for scheme := range 2 {
		if scheme == 1 {
			s.WriteString("@media screen and (prefers-color-scheme:dark){\n")
		}
		for k := range inkCount {
			c := hex(palette[k][scheme])
			if k == inkText {
				c = "currentColor"
			}
			fmt.Fprintf(s, "#%[1]s .f%[2]d{fill:%[3]s}#%[1]s .s%[2]d{stroke:%[3]s;fill:none}\n", id, k, c)
		}
	}
	s.WriteString("}\n</style>\n")
}

// escape makes any string a text of XML and HTML; characters that XML cannot hold become blanks.
func escape(s string) string {
	return html.EscapeString(strings.Map(func(r rune) rune {
		if r < ' ' && r != '\n' && r != '\t' || r >= 0x7f && r < 0xa0 || r == 0xfffe || r == 0xffff {
			return ' '
		}
		return r
	}, s))
}

func hex(c color.NRGBA) string { return fmt.Sprintf("#%02x%02x%02x", c.R, c.G, c.B) }

// num is a coordinate with two decimals, a seventh of the finest line.
func num(v float64) string {
	v = math.Round(v*100) / 100
	if v == 0 {
		v = 0 // no negative zero
	}
	return strconv.FormatFloat(v, 'f', -1, 64)
}

func (s svg) op(o op) {
	switch {
	case len(o.text) > 0 && s.inline:
		s.characters(o)
	case len(o.text) > 0:
		fmt.Fprintf(s, `<path d="%s"%s/>`+"\n", s.glyphs(o), s.paint("fill", o))
	case len(o.dots) > 0:
		fmt.Fprintf(s, `<path d="%s" stroke-width="%s" stroke-linecap="round"%s/>`+"\n", s.points(o.dots), num(o.width), s.paint("stroke", o))
	case o.width > 0:
		dash := ""
		if len(o.dash) > 0 {
			var d []string
			for _, v := range o.dash {
				d = append(d, num(v))
			}
			dash = ` stroke-dasharray="` + strings.Join(d, " ") + `"`
		}
		fmt.Fprintf(s, `<path d="%s" stroke-width="%s" stroke-linejoin="round"%s%s/>`+"\n", s.data(o.path), num(o.width), dash, s.paint("stroke", o))
	default:
		fmt.Fprintf(s, `<path d="%s"%s/>`+"\n", s.data(o.path), s.paint("fill", o))
	}
}

// paint is the attributes for a colour, as class or value.
func (s svg) paint(what string, o op) string {
	a := ""
	if o.alpha < 1 {
		a = fmt.Sprintf(` %s-opacity="%s"`, what, num(o.alpha))
	}
	if s.inline {
		return fmt.Sprintf(` class="%c%d"%s`, what[0], o.ink, a)
	}
	a += fmt.Sprintf(` %s="%s"`, what, hex(palette[o.ink][0]))
	if what == "stroke" {
		a += ` fill="none"`
	}
	return a
}

func (s svg) xy(p pt) string { return num(p.x) + " " + num(s.h-p.y) }

func (s svg) data(path []line) string {
	var b strings.Builder
	for _, l := range path {
		for i, p := range l.pts {
			b.WriteByte("LM"[btoi(i == 0)])
			b.WriteString(s.xy(p))
		}
		if l.closed {
			b.WriteByte('Z')
		}
	}
	return b.String()
}

func btoi(b bool) int {
	if b {
		return 1
	}
	return 0
}

// points are lines of no length, which round ends turn into discs.
func (s svg) points(at []pt) string {
	var b strings.Builder
	for _, p := range at {
		b.WriteString("M" + s.xy(p) + "h0")
	}
	return b.String()
}

// glyphs is the text as path data.
func (s svg) glyphs(o op) string {
	var b strings.Builder
	o.outline(func(_ piece, seg sfnt.Segments, place func(fixed.Point26_6) pt) {
		for i, g := range seg {
			switch g.Op {
			case sfnt.SegmentOpMoveTo:
				if i > 0 {
					b.WriteByte('Z')
				}
				b.WriteString("M" + s.xy(place(g.Args[0])))
			case sfnt.SegmentOpLineTo:
				b.WriteString("L" + s.xy(place(g.Args[0])))
			case sfnt.SegmentOpQuadTo:
				b.WriteString("Q" + s.xy(place(g.Args[0])) + " " + s.xy(place(g.Args[1])))
			case sfnt.SegmentOpCubeTo:
				b.WriteString("C" + s.xy(place(g.Args[0])) + " " + s.xy(place(g.Args[1])) + " " + s.xy(place(g.Args[2])))
			}
		}
		if len(seg) > 0 {
			b.WriteByte('Z')
		}
	})
	return b.String()
}

// characters writes a text whose pieces keep their widths if the page's font differs.
func (s svg) characters(o op) {
	turn := ""
	if o.angle != 0 {
		turn = fmt.Sprintf(" rotate(%s)", num(-o.angle*180/math.Pi))
	}
	fmt.Fprintf(s, `<text transform="translate(%s)%s"%s>`, s.xy(o.at), turn, s.paint("fill", o))
	for _, p := range o.text {
		slant := ""
		if p.font == italics {
			slant = ` font-style="italic"`
		}
		fmt.Fprintf(s, `<tspan x="%s" y="%s" font-size="%s" textLength="%s" lengthAdjust="spacingAndGlyphs"%s>%s</tspan>`,
			num(p.dx), num(-p.dy), num(p.size), num(p.width), slant, escape(p.text))
	}
	s.WriteString("</text>\n")
}
