package figure

import "image/color"

// ink is a colour by its role. Each has a value for light paper and one for a dark page.
type ink uint8

const (
	inkText  ink = iota // text and axes
	inkSoft             // secondary text, dividing lines
	inkRule             // grid lines, priors
	inkPaper            // the page, behind labels
	inkWarn             // the note on an unfinished run
	inkFill0            // areas of the first series; five more follow
	inkLine0 = inkFill0 + series
	inkCount = inkLine0 + series
)

// series is the number of series that are told apart.
const series = 6

// fillInk and lineInk are the colours of a series; dashes and markers repeat the distinction without colour.
func fillInk(i int) ink { return inkFill0 + ink(i%series) }
func lineInk(i int) ink { return inkLine0 + ink(i%series) }

// dash patterns of the series, in points; the first is solid.
func dashes(i int) []float64 {
	return [series][]float64{nil, {4, 1.6}, {1.2, 1.4}, {6, 1.5, 1.2, 1.5}, {2.5, 1.2}, {7, 2.2}}[i%series]
}

func markers(i int) marker { return marker(i % 5) }

// palette is our own. The areas of the first four series differ in CIE lightness by at least 13, so that they
// survive grey printing, and all six by at least 12 in CIE ΔE as seen with normal, protan and deutan sight; lines
// keep a contrast of at least 4.5 to the paper, light and dark (see TestPalette).
var palette = [inkCount][2]color.NRGBA{
	inkText:      {rgb(0x1c2126), rgb(0xe6e8ea)},
	inkSoft:      {rgb(0x5a626b), rgb(0xa3abb4)},
	inkRule:      {rgb(0xb4bac1), rgb(0x555d66)},
	inkPaper:     {rgb(0xffffff), rgb(0x15181c)},
	inkWarn:      {rgb(0x8f2d16), rgb(0xf29b80)},
	inkFill0:     {rgb(0x3d3f8f), rgb(0x8486e6)},
	inkFill0 + 1: {rgb(0xc9573a), rgb(0xe8795b)},
	inkFill0 + 2: {rgb(0x46ad97), rgb(0x57c7af)},
	inkFill0 + 3: {rgb(0xe9bd4f), rgb(0xf0cc70)},
	inkFill0 + 4: {rgb(0x7d2b5c), rgb(0xc878a8)},
	inkFill0 + 5: {rgb(0x8fb6dc), rgb(0xa9cbea)},
	inkLine0:     {rgb(0x2b2d75), rgb(0xa4a6f5)},
	inkLine0 + 1: {rgb(0xa33d23), rgb(0xf0957b)},
	inkLine0 + 2: {rgb(0x1b7563), rgb(0x70d6c0)},
	inkLine0 + 3: {rgb(0x7d5c08), rgb(0xf3d27f)},
	inkLine0 + 4: {rgb(0x651d48), rgb(0xdc97c0)},
	inkLine0 + 5: {rgb(0x34669a), rgb(0xb5d4f0)},
}

func rgb(v uint32) color.NRGBA {
	return color.NRGBA{R: uint8(v >> 16), G: uint8(v >> 8), B: uint8(v), A: 255}
}

// light is the colour on paper, with the opacity given.
func (k ink) light(alpha float64) color.NRGBA {
	c := palette[k][0]
	c.A = uint8(alpha*255 + 0.5)
	return c
}
