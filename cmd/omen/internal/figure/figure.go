package figure

import (
	"fmt"
	"io"
)

// Width is the width of a figure on the page.
type Width uint8

const (
	Column Width = iota // 86 mm, one column
	Page                // 178 mm, both columns
)

const millimetre = 72 / 25.4 // in points

func (w Width) points() float64 {
	if w == Page {
		return 178 * millimetre
	}
	return 86 * millimetre
}

// Figure is a drawing of known size, in points with the origin at the bottom left.
type Figure struct {
	Title string // what the figure is, in a few words
	canvas
}

func newFigure(title string, width Width, height float64) *Figure {
	return &Figure{Title: title, canvas: canvas{w: width.points(), h: height}}
}

// Formats are those that Write knows.
func Formats() []string { return []string{"pdf", "svg", "png"} }

// Write writes the figure as "pdf", "svg" or "png" (300 dots per inch). In the SVG file text is drawn as
// outlines, so that it looks the same wherever it is opened; the PDF holds text and the fonts for it.
func (f *Figure) Write(w io.Writer, format string) error {
	switch format {
	case "pdf":
		return f.writePDF(w)
	case "svg":
		return f.writeSVG(w)
	case "png":
		return f.writePNG(w, 300)
	}
	return fmt.Errorf("figure: format %q is unknown; it is one of pdf, svg, png", format)
}

// stampUnfinished notes in the top right corner that the run has not ended.
func (f *Figure) stampUnfinished(unfinished bool) {
	if unfinished {
		f.text(Plain("unfinished run"), f.w-2, f.h-1.5, textStyle{size: noteSize, ink: inkWarn, h: 1, v: 1})
	}
}
