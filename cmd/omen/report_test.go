package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"image"
	"image/color"
	"image/png"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"sync"
	"testing"

	"omen/cmd/omen/internal/compare"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/gather"
	"omen/model"
)

// hostile is a name that a data file might hold.
const hostile = `<script>alert(1)</script> & \input{x}`

// hostileRun is a run file whose every name is hostile.
const hostileRun = `title = '` + hostile + `'

[universe]
radiation = 0

[prior]
Om  = { flat = [0, 1.5] }
OL  = { flat = [-0.5, 1.8] }
hrd = { flat = [60, 140] }

[[data]]
name  = '` + hostile + `'
kind  = "supernovae"
table = "candles.csv"
keep  = 'z > 0.01 && survey != "<b>*_$"'

[[data]]
name  = 'rulers_of_#1 100% <img src=x onerror=alert(2)>'
kind  = "bao"
table = "rulers.csv"
`

// candles is an invented table of n supernovae with hostile names (seeded), one of
// them far off.
func candles(n int) string {
	rng := rand.New(rand.NewPCG(7, 11))
	u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
	var b strings.Builder
	b.WriteString("name,survey,z,mag,mag_err\n")
	for i := range n {
		z := 0.02 * math.Pow(75, float64(i)/float64(n))
		m := u.DistanceModulus(z, z) - 19.3 + 0.12*rng.NormFloat64()
		if i == n/2 {
			m += 0.7
		}
		fmt.Fprintf(&b, "%s %d,<i>s</i>,%.5f,%.4f,0.12\n", hostile, i, z, m)
	}
	return b.String()
}

const rulers = `z,quantity,value,error
0.3,DV_over_rd,7.95,0.08
0.7,DM_over_rd,17.35,0.18
0.7,DH_over_rd,19.45,0.33
1.3,DM_over_rd,27.60,0.32
1.3,DH_over_rd,14.18,0.22
`

// hostileFolder holds a finished run of hostile names, and what fit printed.
var hostileFolder = sync.OnceValues(func() (string, string) {
	base := filepath.Join(buildDir, "hostile")
	for name, text := range map[string]string{"run.toml": hostileRun, "candles.csv": candles(60), "rulers.csv": rulers} {
		os.MkdirAll(base, 0o755)
		os.WriteFile(filepath.Join(base, name), []byte(text), 0o644)
	}
	dir := filepath.Join(base, "out")
	program, err := build()
	if err != nil {
		return dir, err.Error()
	}
	said, err := exec.Command(program, append(chainAlone, "--effective-samples", "800", "-o", dir, filepath.Join(base, "run.toml"))...).CombinedOutput()
	if err != nil {
		return dir, err.Error()
	}
	return dir, string(said)
})

var reportFiles = []string{"report.html", "constraints.tex", "fates.tex", "numbers.tex", "methods.md", "constraints.csv",
	"figures/hubble.pdf", "figures/hubble.svg", "figures/plane.pdf", "figures/plane.svg", "figures/marginals.pdf", "figures/marginals.svg",
	"figures/history.pdf", "figures/history.svg", "figures/fates.pdf", "figures/fates.svg", "figures/convergence.pdf", "figures/convergence.svg"}

// What fit writes when it ends is what report writes from its folder, byte for
// byte.
func TestReportOfAFolderIsThatOfTheRun(t *testing.T) {
	dir, said := hostileFolder()
	before := map[string][]byte{}
	for _, name := range reportFiles {
		text, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
		if err != nil {
			t.Fatalf("%v; fit said:\n%s", err, said)
		}
		before[name] = text
	}
	out, _ := must(t, 0, "", "report", dir)
	for _, name := range reportFiles {
		text, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
		if err != nil {
			t.Fatal(err)
		}
		if !bytes.Equal(text, before[name]) {
			t.Errorf("%s differs from what fit wrote", name)
		}
	}
	if !strings.HasSuffix(said, out) {
		t.Errorf("report printed %q, fit ended with\n%s", out, said)
	}
	for _, want := range []string{"report.html, constraints.tex, fates.tex, numbers.tex, methods.md, constraints.csv", "hubble, plane, marginals, history, fates, convergence (pdf, svg)"} {
		if !strings.Contains(unwrapped(out), want) {
			t.Errorf("report printed %q, without %q", out, want)
		}
	}
}

// A name that is markup stays a name in every file.
func TestReportHostileNames(t *testing.T) {
	dir, _ := hostileFolder()
	for _, name := range reportFiles {
		text, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
		if err != nil {
			t.Fatal(err)
		}
		lower := strings.ToLower(string(text))
		switch filepath.Ext(name) {
		case ".html", ".svg", ".md":
			for _, bad := range []string{"<script", "<img", "<i>s</i>", "onerror=alert(2)>"} {
				if strings.Contains(lower, bad) {
					t.Errorf("%s holds %q", name, bad)
				}
			}
		case ".tex":
			for _, line := range strings.Split(lower, "\n") {
				if !strings.HasPrefix(line, "%") && strings.Contains(line, `\input`) {
					t.Errorf("%s holds %q", name, line)
				}
			}
		}
	}
	html, err := os.ReadFile(filepath.Join(dir, "report.html"))
	if err != nil {
		t.Fatal(err)
	}
	for _, want := range []string{`&lt;script&gt;alert(1)&lt;/script&gt; &amp; \input{x} 30`, "rulers_of_#1 100% &lt;img src=x onerror=alert(2)&gt;"} {
		if !strings.Contains(string(html), want) {
			t.Errorf("report.html does not name %q", want)
		}
	}
}

// The page asks for nothing: no address but the namespace of SVG.
func TestReportNamesNoAddress(t *testing.T) {
	dir, _ := hostileFolder()
	html, err := os.ReadFile(filepath.Join(dir, "report.html"))
	if err != nil {
		t.Fatal(err)
	}
	text := strings.ReplaceAll(string(html), `xmlns="http://www.w3.org/2000/svg"`, "")
	if m := regexp.MustCompile(`(?i)https?://|\bsrc\s*=\s*"|url\(|@import|href="[^d]`).FindAllString(text, -1); m != nil {
		t.Errorf("report.html refers to something: %q", m)
	}
	if n := strings.Count(text, "<svg"); n != 8 { // six, two of them at two widths
		t.Errorf("report.html has %d figures, expected 8", n)
	}
	if a, b := strings.Count(text, "<svg"), len(regexp.MustCompile(`<desc [^>]*>[^<]+</desc>`).FindAllString(text, -1)); a != b {
		t.Errorf("%d figures, %d alternative texts", a, b)
	}
}

func TestReportParts(t *testing.T) {
	from, _ := hostileFolder()
	for _, c := range []struct {
		args []string
		want []string
	}{
		{[]string{"--only", "plane", "--format", "png", "--width", "page"}, []string{"figures/plane.png"}},
		{[]string{"--only", "fates,draft", "--format", "svg"}, []string{"constraints.csv", "constraints.tex", "fates.tex", "figures/fates.svg", "methods.md", "numbers.tex"}},
		{[]string{"--only", "page"}, []string{"report.html"}},
	} {
		dir := filepath.Join(filepath.Dir(from), "parts") // beside it, for its paths
		os.RemoveAll(dir)
		copyFiles(t, from, dir, "run.toml", "run.json", "chain.csv", "chain.sums", "summary.json")
		output(t, append([]string{"report", dir}, c.args...)...)
		var got []string
		filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
			name, _ := filepath.Rel(dir, path)
			switch name = filepath.ToSlash(name); {
			case d.IsDir(), strings.HasPrefix(name, "run."), strings.HasPrefix(name, "chain."), name == "summary.json":
			default:
				got = append(got, name)
			}
			return nil
		})
		if fmt.Sprint(got) != fmt.Sprint(c.want) {
			t.Errorf("report %v wrote %v, expected %v", c.args, got, c.want)
		}
		if c.args[1] == "plane" {
			f, err := os.Open(filepath.Join(dir, "figures", "plane.png"))
			if err != nil {
				t.Fatal(err)
			}
			m, err := png.Decode(f)
			f.Close()
			if err != nil || math.Abs(float64(m.Bounds().Dx())-178/25.4*300) > 2 {
				t.Errorf("plane.png: %v, %v; expected 178 mm at 300 dots per inch", m.Bounds(), err)
			}
		}
	}
}

func copyFiles(t *testing.T, from, to string, names ...string) {
	t.Helper()
	if err := os.MkdirAll(to, 0o755); err != nil {
		t.Fatal(err)
	}
	for _, name := range names {
		text, err := os.ReadFile(filepath.Join(from, name))
		if err == nil {
			err = os.WriteFile(filepath.Join(to, name), text, 0o644)
		}
		if err != nil {
			t.Fatal(err)
		}
	}
}

// A run that has not reached its goal says so in every file and figure.
func TestReportUnfinished(t *testing.T) {
	from, _ := hostileFolder()
	dir := filepath.Join(filepath.Dir(from), "short")
	var stdout bytes.Buffer
	err := run(context.Background(), append(chainAlone, "--no-report", "--max-steps", "120", "-o", dir, filepath.Join(filepath.Dir(from), "run.toml")), &stdout, &stdout)
	if status(err) != 3 {
		t.Fatalf("fit: status %d, %v", status(err), err)
	}
	if err := os.Remove(filepath.Join(dir, "summary.json")); err != nil { // as if it had been killed
		t.Fatal(err)
	}
	if out := output(t, "report", dir); !strings.Contains(out, "Unfinished") {
		t.Errorf("report printed %q", out)
	}
	for _, name := range []string{"report.html", "numbers.tex", "constraints.tex", "methods.md"} {
		text, err := os.ReadFile(filepath.Join(dir, name))
		if err != nil {
			t.Fatal(err)
		}
		if !strings.Contains(strings.ToLower(string(text)), "unfinished") {
			t.Errorf("%s does not say that the run is unfinished", name)
		}
		if n := strings.Count(string(text), "unfinished run"); name == "report.html" && n != 8 {
			t.Errorf("%d of 8 figures say that the run is unfinished", n)
		}
	}
}

func TestReportMistakes(t *testing.T) {
	dir, _ := hostileFolder()
	empty := t.TempDir()
	moved := filepath.Join(filepath.Dir(dir), "elsewhere", "out")
	copyFiles(t, dir, moved, "run.toml", "run.json", "chain.csv", "chain.sums", "summary.json")
	changed := filepath.Join(filepath.Dir(dir), "changed")
	copyFiles(t, dir, filepath.Join(changed, "out"), "run.toml", "run.json", "chain.csv", "chain.sums", "summary.json")
	copyFiles(t, filepath.Dir(dir), changed, "candles.csv")
	if err := os.WriteFile(filepath.Join(changed, "rulers.csv"), []byte(strings.Replace(rulers, "7.95", "7.96", 1)), 0o644); err != nil {
		t.Fatal(err)
	}
	for _, c := range []struct {
		args []string
		want []string
	}{
		{[]string{"report"}, []string{"expected 1 argument", "omen report --help"}},
		{[]string{"report", empty}, []string{empty, "no run in this folder", "omen fit"}},
		{[]string{"report", dir, "--only", "huble"}, []string{"--only", `"huble"`, `nearest is "hubble"`}},
		{[]string{"report", dir, "--format", "jpg"}, []string{"--format", `"jpg"`, "pdf"}},
		{[]string{"report", dir, "--format", ""}, []string{"--format", "nothing", "pdf"}},
		{[]string{"report", dir, "--width", "wide"}, []string{"--width", `"wide"`, "column, page"}},
		{[]string{"report", moved}, []string{"run.toml:", "cannot read", "candles.csv", " is looked for from " + moved + ", the folder of the run file", "if that folder was moved, move it back"}},
		{[]string{"resume", moved}, []string{" is looked for from " + moved}},
		{[]string{"report", filepath.Join(changed, "out")}, []string{"no longer the run that was started", "rulers.csv", "put back"}},
		{[]string{"report", filepath.Join(dir, "chain.csv")}, []string{"chain.csv: found a file, expected the folder of a run"}},
		{[]string{"status", filepath.Join(dir, "chain.csv")}, []string{"chain.csv: found a file, expected the folder of a run"}},
		{[]string{"compare", dir, filepath.Join(dir, "chain.csv")}, []string{"chain.csv: found a file, expected the folder of a run"}},
		{[]string{"compare", dir}, []string{"two or more", "found 1"}},
		{[]string{"compare", dir, empty}, []string{empty, "no run in this folder"}},
		{[]string{"compare", dir, dir, "-o", dir}, []string{"not empty", "-o"}},
	} {
		err := run(context.Background(), c.args, &bytes.Buffer{}, &bytes.Buffer{})
		if status(err) != 2 {
			t.Errorf("omen %v: status %d, %v", c.args, status(err), err)
			continue
		}
		for _, want := range c.want {
			if !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "\n") {
				t.Errorf("omen %v: %q, without %q", c.args, err, want)
			}
		}
	}
}

// chainAlone is a fit that integrates nothing beside its chain.
var chainAlone = []string{"fit", "--quiet", "--set", "sampling.engine=chain", "--set", "fates.nested=false"}

// With 1590 supernovae the page can still be sent by mail.
func TestReportSize(t *testing.T) {
	base := t.TempDir()
	for name, text := range map[string]string{"run.toml": strings.Split(hostileRun, "\n[[data]]\nname  = 'rulers")[0], "candles.csv": candles(1590)} {
		text = strings.Replace(text, "hrd = { flat = [60, 140] }\n", "", 1)
		if err := os.WriteFile(filepath.Join(base, name), []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	dir := filepath.Join(base, "out")
	must(t, 0, "", append(chainAlone, "--effective-samples", "4000", "-o", dir, filepath.Join(base, "run.toml"))...)
	info, err := os.Stat(filepath.Join(dir, "report.html"))
	if err != nil {
		t.Fatal(err)
	}
	if info.Size() > 3<<20 {
		t.Errorf("report.html has %d bytes, more than 3 MB", info.Size())
	}
	t.Logf("report.html: %d bytes", info.Size())
}

// The figures of a run from end to end: its folder, draws, densities, ink.
func TestReportFigures(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "fate")
	must(t, 0, "", append(chainAlone, "--no-report", "--effective-samples", "1500", "-o", dir, runsFile("fate.toml"))...)
	must(t, 0, "", "report", dir, "--format", "png", "--only", "hubble,plane,marginals,history,fates,convergence")
	for _, name := range []string{"hubble", "plane", "marginals", "history", "fates", "convergence"} {
		compareToGolden(t, name, filepath.Join(dir, "figures", name+".png"))
	}
}

// The figures of a comparison, likewise.
func TestCompareFigures(t *testing.T) {
	var runs []*gather.Run
	for _, name := range []string{"bao.toml", "supernovae.toml"} {
		dir := filepath.Join(t.TempDir(), strings.TrimSuffix(name, ".toml"))
		must(t, 0, "", append(chainAlone, "--no-report", "--effective-samples", "1500", "-o", dir, runsFile(name))...)
		r, err := gather.Open(context.Background(), dir, explore.Options{Version: version()})
		if err != nil {
			t.Fatal(err)
		}
		runs = append(runs, r)
	}
	for _, p := range compare.New(runs).Pictures() {
		text, err := reportOptions{}.draw(p, "png")
		path := filepath.Join(t.TempDir(), p.Name+".png")
		if err = errors.Join(err, os.WriteFile(path, text, 0o644)); err != nil {
			t.Fatal(err)
		}
		compareToGolden(t, "compare-"+p.Name, path)
	}
}

// scale is how much smaller than 300 dots per inch the goldens are.
const scale = 4

// compareToGolden allows for what another processor makes of the chain: a root
// mean square difference of 3 in 255 at 75 dots per inch.
func compareToGolden(t *testing.T, name, path string) {
	t.Helper()
	got := shrink(t, decode(t, path))
	golden := filepath.Join("testdata", "figures", name+".png")
	if *update {
		var b bytes.Buffer
		err := errors.Join(png.Encode(&b, got), os.MkdirAll(filepath.Dir(golden), 0o755), os.WriteFile(golden, b.Bytes(), 0o644))
		if err != nil {
			t.Fatal(err)
		}
	}
	want := decode(t, golden)
	if got.Bounds() != want.Bounds() {
		t.Fatalf("%s: size %v, golden %v", name, got.Bounds(), want.Bounds())
	}
	sum, n := 0.0, 0
	for y := range got.Bounds().Dy() {
		for x := range got.Bounds().Dx() {
			d := float64(got.GrayAt(x, y).Y) - float64(color.GrayModel.Convert(want.At(x, y)).(color.Gray).Y)
			sum, n = sum+d*d, n+1
		}
	}
	if rms := math.Sqrt(sum / float64(n)); rms > 3 {
		t.Errorf("%s differs from its golden by %.2f rms", name, rms)
	}
}

func decode(t *testing.T, path string) image.Image {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	m, err := png.Decode(f)
	if err != nil {
		t.Fatal(err)
	}
	return m
}

// shrink averages squares of pixels.
func shrink(t *testing.T, m image.Image) *image.Gray {
	t.Helper()
	b := m.Bounds()
	out := image.NewGray(image.Rect(0, 0, b.Dx()/scale, b.Dy()/scale))
	for y := range out.Bounds().Dy() {
		for x := range out.Bounds().Dx() {
			sum := 0
			for i := range scale * scale {
				sum += int(color.GrayModel.Convert(m.At(x*scale+i%scale, y*scale+i/scale)).(color.Gray).Y)
			}
			out.SetGray(x, y, color.Gray{uint8(sum / scale / scale)})
		}
	}
	return out
}

// A run by quadrature alone has all figures but that of the chain, and the same
// files from its folder.
func TestReportWithoutChain(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	must(t, 0, "", "fit", "--quiet", "--set", "sampling.engine=quadrature", "--set", "fates.nested=false", "-o", dir, runsFile("bao-flat.toml"))
	before := map[string][]byte{}
	for _, name := range reportFiles {
		if text, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name))); err == nil {
			before[name] = text
		}
	}
	out, _ := must(t, 0, "", "report", dir)
	for _, want := range []string{"hubble, marginals, history, fates (pdf, svg)", "no figure convergence: the posterior was integrated"} {
		if !strings.Contains(unwrapped(out), want) {
			t.Errorf("report printed %q, without %q", out, want)
		}
	}
	if len(before) != len(reportFiles)-4 { // nor is there a plane of a flat universe
		t.Errorf("%d files", len(before))
	}
	for name, text := range before {
		now, err := os.ReadFile(filepath.Join(dir, filepath.FromSlash(name)))
		if err != nil || !bytes.Equal(now, text) {
			t.Errorf("%s differs from what fit wrote, %v", name, err)
		}
	}
}

// The texts for a draft compile with a plain LaTeX and booktabs (Debian:
// texlive-latex-extra); two runs stand in one document.
func TestReportCompiles(t *testing.T) {
	if _, err := exec.LookPath("pdflatex"); err != nil {
		t.Skip("no pdflatex; apt-get install texlive-latex-extra")
	}
	dir, _ := hostileFolder()
	side := filepath.Join(t.TempDir(), `si_de & <x> %`)
	output(t, "compare", dir, dir, "-o", side)
	work := t.TempDir()
	copyFiles(t, dir, work, "numbers.tex", "constraints.tex", "fates.tex")
	copyFiles(t, filepath.Join("testdata", "report"), work, "bao-w0wa.constraints.tex", "bao-w0wa.numbers.tex", "fate.fates.tex", "fate.nested.tex")
	copyFiles(t, side, work, "comparison.tex")
	const document = `\documentclass{article}
\usepackage{booktabs}
\input{numbers}
\def\omenprefix{other}\input{numbers}
\def\omenprefix{third}\input{bao-w0wa.numbers}
\begin{document}
\begin{table}\centering\input{constraints}\caption{One.}\end{table}
\begin{table}\centering\input{fates}\input{fate.fates}\input{fate.nested}\input{bao-w0wa.constraints}\caption{Between.}\end{table}
\begin{table}\centering\input{comparison}\caption{Two.}\end{table}
\omenOm\ and $\Omega_\Lambda = \otherOL$; $P = \omenPRecollapse$; \omenHrdLowNinetyFive; omen \omenVersion; \thirdWa, \thirdLnBayesFlatW, \thirdPBigRipHeldW.
\end{document}
`
	if err := os.WriteFile(filepath.Join(work, "document.tex"), []byte(document), 0o644); err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command("pdflatex", "-interaction=nonstopmode", "-halt-on-error", "document.tex")
	cmd.Dir = work
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Fatalf("pdflatex: %v\n%s", err, out)
	}
}

// unwrapped is text without its line breaks.
func unwrapped(text string) string { return strings.Join(strings.Fields(text), " ") }
