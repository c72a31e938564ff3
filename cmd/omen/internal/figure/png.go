package figure

import (
	"image/png"
	"io"
	"math"

	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/vgimg"
)

// writePNG draws on white at the resolution given, in dots per inch.
func (f *Figure) writePNG(w io.Writer, dpi int) error {
	c := vgimg.NewWith(vgimg.UseWH(vg.Length(f.w), vg.Length(f.h)), vgimg.UseDPI(dpi))
	for _, o := range f.ops {
		c.SetColor(o.ink.light(o.alpha))
		switch {
		case len(o.text) > 0:
			c.Fill(glyphPath(o))
		case len(o.dots) > 0:
			c.Fill(discs(o.dots, o.width))
		case o.width > 0:
			c.SetLineWidth(vg.Length(o.width))
			d := make([]vg.Length, len(o.dash))
			for i, v := range o.dash {
				d[i] = vg.Length(v)
			}
			c.SetLineDash(d, 0)
			c.Stroke(vgPath(o.path))
		default:
			c.Fill(vgPath(o.path))
		}
	}
	e := png.Encoder{CompressionLevel: png.BestSpeed} // most of the time goes here
	return e.Encode(w, c.Image())
}

func vgPoint(p pt) vg.Point { return vg.Point{X: vg.Length(p.x), Y: vg.Length(p.y)} }

func vgPath(path []line) vg.Path {
	var out vg.Path
	for _, l := range path {
		for i, p := range l.pts {
			if i == 0 {
				out.Move(vgPoint(p))
			} else {
				out.Line(vgPoint(p))
			}
		}
		if l.closed {
			out.Close()
		}
	}
	return out
}

func discs(at []pt, diameter float64) vg.Path {
	var out vg.Path
	for _, p := range at {
		c := vgPoint(p)
		out.Move(vg.Point{X: c.X + vg.Length(diameter/2), Y: c.Y})
		out.Arc(c, vg.Length(diameter/2), 0, 2*math.Pi)
		out.Close()
	}
	return out
}

func glyphPath(o op) vg.Path {
	var out vg.Path
	o.outline(func(_ piece, seg sfnt.Segments, place func(fixed.Point26_6) pt) {
		for i, g := range seg {
			at := func(k int) vg.Point { return vgPoint(place(g.Args[k])) }
			switch g.Op {
			case sfnt.SegmentOpMoveTo:
				if i > 0 {
					out.Close()
				}
				out.Move(at(0))
			case sfnt.SegmentOpLineTo:
				out.Line(at(0))
			case sfnt.SegmentOpQuadTo:
				out.QuadTo(at(0), at(1))
			case sfnt.SegmentOpCubeTo:
				out.CubeTo(at(0), at(1), at(2))
			}
		}
		if len(seg) > 0 {
			out.Close()
		}
	})
	return out
}
