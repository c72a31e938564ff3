package figure

import (
	"io"
	"math"
	"time"

	"codeberg.org/go-pdf/fpdf"
)

// The PDF is written with fpdf, the library below gonum/plot's vgpdf, and not with vgpdf itself: that encodes text
// in one byte per character, which has no Greek, and embeds whole fonts.

var families = [2]string{"upright", "italic"}

// writePDF writes one page of the figure's size, with the characters used of the fonts embedded.
func (f *Figure) writePDF(w io.Writer) error {
	d := fpdf.NewCustom(&fpdf.InitType{UnitStr: "pt", Size: fpdf.SizeType{Wd: f.w, Ht: f.h}})
	d.SetCreationDate(fixedDate)
	d.SetModificationDate(fixedDate)
	d.SetCatalogSort(true)
	d.SetProducer("omen", true)
	d.SetTitle(f.Title, true)
	d.SetMargins(0, 0, 0)
	d.SetAutoPageBreak(false, 0)
	for i, name := range families {
		d.AddUTF8FontFromBytes(name, "", faces()[i].raw)
	}
	d.AddPage()
	d.SetLineJoinStyle("round")
	for _, o := range f.ops {
		f.pdfOp(d, o)
	}
	return d.Output(w)
}

// fixedDate stands for the time of writing, so that the same figure is the same file.
var fixedDate = time.Date(2000, 1, 1, 0, 0, 0, 0, time.UTC)

func (f *Figure) pdfOp(d *fpdf.Fpdf, o op) {
	c := palette[o.ink][0]
	r, g, b := int(c.R), int(c.G), int(c.B)
	d.SetAlpha(o.alpha, "Normal")
	switch {
	case len(o.text) > 0:
		d.SetTextColor(r, g, b)
		f.pdfText(d, o)
	case len(o.dots) > 0:
		d.SetDrawColor(r, g, b)
		d.SetLineWidth(o.width)
		d.SetDashPattern(nil, 0)
		d.SetLineCapStyle("round") // lines of no length become discs, in one path, which do not darken each other
		for _, p := range o.dots {
			d.MoveTo(p.x, f.h-p.y)
			d.LineTo(p.x, f.h-p.y)
		}
		d.DrawPath("D")
		d.SetLineCapStyle("butt")
	case o.width > 0:
		d.SetDrawColor(r, g, b)
		d.SetLineWidth(o.width)
		d.SetDashPattern(o.dash, 0)
		f.pdfPath(d, o.path, "D")
	default:
		d.SetFillColor(r, g, b)
		f.pdfPath(d, o.path, "F")
	}
}

func (f *Figure) pdfPath(d *fpdf.Fpdf, path []line, style string) {
	for _, l := range path {
		for i, p := range l.pts {
			if i == 0 {
				d.MoveTo(p.x, f.h-p.y)
			} else {
				d.LineTo(p.x, f.h-p.y)
			}
		}
		if l.closed {
			d.ClosePath()
		}
	}
	d.DrawPath(style)
}

func (f *Figure) pdfText(d *fpdf.Fpdf, o op) {
	d.TransformBegin()
	d.TransformRotate(o.angle*180/math.Pi, o.at.x, f.h-o.at.y)
	for _, p := range o.text {
		d.SetFont(families[p.font], "", p.size)
		d.Text(o.at.x+p.dx, f.h-o.at.y-p.dy, p.text)
	}
	d.TransformEnd()
}
