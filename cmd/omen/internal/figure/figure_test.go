package figure

import (
	"bytes"
	"flag"
	"image"
	"image/png"
	"math"
	"os"
	"path/filepath"
	"testing"
)

var (
	update = flag.Bool("update", false, "write the goldens anew")
	look   = flag.String("look", "", "write every figure in every format to this folder")
)

type drawing struct {
	name string
	draw func() (*Figure, error)
}

// drawings are all figures, by the name of their golden.
var drawings = []drawing{
	{"hubble-few-column", func() (*Figure, error) { return DrawHubble(hubbleFew(), Column) }},
	{"hubble-many-column", func() (*Figure, error) { return DrawHubble(hubbleMany(), Column) }},
	{"hubble-many-page", func() (*Figure, error) { return DrawHubble(hubbleMany(), Page) }},
	{"plane-three-column", func() (*Figure, error) { return DrawPlane(planeThree(), Column) }},
	{"plane-three-page", func() (*Figure, error) { return DrawPlane(planeThree(), Page) }},
	{"plane-one-column", func() (*Figure, error) { return DrawPlane(planeOne(), Column) }},
	{"marginals-2-column", func() (*Figure, error) { return DrawMarginals(parameters(2, 6000), Column) }},
	{"marginals-4-column", func() (*Figure, error) { return DrawMarginals(parameters(4, 6000), Column) }},
	{"marginals-6-page", func() (*Figure, error) { return DrawMarginals(parameters(6, 6000), Page) }},
	{"history-forever-column", func() (*Figure, error) { return DrawHistory(historyForever(), Column) }},
	{"history-crunch-page", func() (*Figure, error) { return DrawHistory(historyCrunch(), Page) }},
	{"fates-both-column", func() (*Figure, error) { return DrawFates(fatesBoth(), Column) }},
	{"fates-one-page", func() (*Figure, error) { return DrawFates(fatesOne(), Page) }},
	{"convergence-column", func() (*Figure, error) { return DrawConvergence(convergence(), Column) }},
	{"convergence-page", func() (*Figure, error) { return DrawConvergence(convergence(), Page) }},
	{"whiskers-column", func() (*Figure, error) { return DrawWhiskers(whiskers(), Column) }},
	{"whiskers-page", func() (*Figure, error) { return DrawWhiskers(whiskers(), Page) }},
}

const goldenDPI = 72

func TestGoldens(t *testing.T) {
	for _, d := range drawings {
		t.Run(d.name, func(t *testing.T) {
			f, err := d.draw()
			if err != nil {
				t.Fatal(err)
			}
			var got bytes.Buffer
			if err := f.writePNG(&got, goldenDPI); err != nil {
				t.Fatal(err)
			}
			show(t, d.name, f)
			path := filepath.Join("testdata", d.name+".png")
			if *update {
				if err := os.WriteFile(path, got.Bytes(), 0o644); err != nil {
					t.Fatal(err)
				}
			}
			want, err := os.ReadFile(path)
			if err != nil {
				t.Fatal(err)
			}
			compare(t, got.Bytes(), want)
		})
	}
}

// show writes a figure for someone to look at.
func show(t *testing.T, name string, f *Figure) {
	if *look == "" {
		return
	}
	for _, format := range Formats() {
		var b bytes.Buffer
		if err := f.Write(&b, format); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(*look, name+"."+format), b.Bytes(), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// compare allows for rounding in the rasteriser: a mean square difference of 1 in 255, and a tenth of a per cent of
// pixels that differ visibly.
func compare(t *testing.T, got, want []byte) {
	t.Helper()
	a, b := decode(t, got), decode(t, want)
	if a.Bounds() != b.Bounds() {
		t.Fatalf("size %v, golden %v", a.Bounds(), b.Bounds())
	}
	sum, off, n := 0.0, 0, 0
	for y := range a.Bounds().Dy() {
		for x := range a.Bounds().Dx() {
			r0, g0, b0, _ := a.At(x, y).RGBA()
			r1, g1, b1, _ := b.At(x, y).RGBA()
			d := 0.0
			for _, c := range [3][2]uint32{{r0, r1}, {g0, g1}, {b0, b1}} {
				d += math.Pow((float64(c[0])-float64(c[1]))/257, 2) / 3
			}
			sum += d
			n++
			if d > 20*20 {
				off++
			}
		}
	}
	if rms := math.Sqrt(sum / float64(n)); rms > 1 || off > n/1000 {
		t.Errorf("differs from the golden by %.2f rms, visibly in %d of %d pixels", rms, off, n)
	}
}

func decode(t *testing.T, b []byte) image.Image {
	t.Helper()
	m, err := png.Decode(bytes.NewReader(b))
	if err != nil {
		t.Fatal(err)
	}
	return m
}
