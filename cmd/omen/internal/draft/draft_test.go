package draft

import (
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
	"unicode/utf8"

	"omen/cmd/omen/internal/result"
)

func quantity(mean, sd, down, up, mcse float64) result.Quantity {
	n := func(x float64) result.Number { return result.Number(x) }
	return result.Quantity{Name: "Om", Mean: n(mean), SD: n(sd), Median: n(mean), Interval68: [2]result.Number{n(mean - down), n(mean + up)},
		MCSE: n(mcse), MCSE68: [2]result.Number{n(mcse), n(mcse)}, MCSE95: [2]result.Number{n(mcse), n(mcse)}, Constrained: true}
}

// Rounding by the rule of the Particle Data Group (Review of Particle Physics,
// introduction, §5.3), never finer than the Monte Carlo error.
func TestEstimate(t *testing.T) {
	for _, c := range []struct {
		q    result.Quantity
		want string
	}{
		{quantity(0.82751, 0.1191, 0.119, 0.119, 1e-5), `0.83 \pm 0.12`}, // the Group's own examples
		{quantity(0.8272, 0.367, 0.367, 0.367, 1e-5), `0.8 \pm 0.4`},
		{quantity(14.674, 0.964, 0.964, 0.964, 1e-5), `14.7 \pm 1.0`},
		{quantity(0.29318, 0.01134, 0.0112, 0.0114, 0.00017), `0.293 \pm 0.011`},
		{quantity(0.29318, 0.01134, 0.0112, 0.0114, 0.004), `0.29 \pm 0.01`},
		{quantity(-0.431, 0.27, 0.32, 0.23, 0.004), `-0.43^{+0.23}_{-0.32}`},
		{quantity(-0.431, 0.27, 0.32, 0.23, 0.05), `-0.4 \pm 0.3`}, // lopsided within the noise
		{quantity(67.36, 0.541, 0.54, 0.54, 0.01), `67.4 \pm 0.5`},
		{quantity(1234, 212, 212, 212, 3), `1230 \pm 210`},
	} {
		if got := Estimate(c.q); got != c.want {
			t.Errorf("mean %g, sd %g, Monte Carlo error %g: %s, expected %s", c.q.Mean, c.q.SD, c.q.MCSE, got, c.want)
		}
	}
}

func TestEscape(t *testing.T) {
	for _, c := range [][2]string{
		{`<script>alert(1)</script> & \input{x}`, `\textless{}script\textgreater{}alert(1)\textless{}/script\textgreater{} \& \textbackslash{}input\{x\}`},
		{"a_b^c~d#e%f$g", `a\_b\textasciicircum{}c\textasciitilde{}d\#e\%f\$g`},
		{"SN 1997ff\n\\end{table}", `SN 1997ff \textbackslash{}end\{table\}`},
		{"Tautenburg Süd, Łódź – Λ", `Tautenburg Süd, Łódź -- \ensuremath{\Lambda}`},
		{"超新星\u202e", "????"},
	} {
		if got := Escape(c[0]); got != c[1] {
			t.Errorf("Escape(%q) = %q, expected %q", c[0], got, c[1])
		}
	}
}

// Whatever a name is, escaped it has no command but our own, and its braces pair.
func FuzzEscape(f *testing.F) {
	f.Add(`\input{x}`)
	f.Add("}%\n{")
	own := regexp.MustCompile(`\\(?:[{}$&#_%]|text[a-z]+\{\}|dots\{\}|ensuremath\{[^{}]*(?:\{[^{}]*\})?[^{}]*\})`)
	f.Fuzz(func(t *testing.T, s string) {
		got := Escape(s)
		if !utf8.ValidString(got) || strings.ContainsAny(own.ReplaceAllString(got, ""), "\\{}$&#_%~^\n\r\"`<>|") {
			t.Errorf("Escape(%q) = %q", s, got)
		}
	})
}

// Every letter that is let through, and all that is replaced, compiles.
func TestEscapedCompiles(t *testing.T) {
	if _, err := exec.LookPath("pdflatex"); err != nil {
		t.Skip("no pdflatex; apt-get install texlive-latex-extra")
	}
	text := accented
	for r := range plain {
		text += string(r) + " "
	}
	dir := t.TempDir()
	document := "\\documentclass{article}\\begin{document}" + Escape(text) + " \\texttt{" + Escape(text) + "}\\end{document}\n"
	if err := os.WriteFile(filepath.Join(dir, "a.tex"), []byte(document), 0o644); err != nil {
		t.Fatal(err)
	}
	cmd := exec.Command("pdflatex", "-interaction=nonstopmode", "-halt-on-error", "a.tex")
	cmd.Dir = dir
	if out, err := cmd.CombinedOutput(); err != nil {
		t.Errorf("pdflatex: %v\n%s", err, out)
	}
}

func TestMarkdown(t *testing.T) {
	for _, c := range [][2]string{
		{`<script>alert(1)</script> & \input{x}`, `&lt;script&gt;alert(1)&lt;/script&gt; &amp; \\input{x}`},
		{"[a](b) *c* _d_ `e`", "\\[a\\](b) \\*c\\* \\_d\\_ \\`e\\`"},
		{"line\n# two", `line \# two`},
	} {
		if got := markdown(c[0]); got != c[1] {
			t.Errorf("markdown(%q) = %q, expected %q", c[0], got, c[1])
		}
	}
	if got := code("z > 1 `x`"); got != "`` z > 1 `x` ``" {
		t.Errorf("code: %q", got)
	}
}

// The macros of all quantities have names of letters, each its own.
func TestLetters(t *testing.T) {
	seen := map[string]string{}
	for _, name := range []string{"Om", "OL", "Ok", "Or", "H0", "w0", "wa", "q0", "rd", "hrd", "ob", "M", "age", "H0t0",
		"recollapse", "expands forever, accelerating", "expands forever, decelerating", "critical", "coasting", "big rip", "no big bang in the past"} {
		l := letters(name)
		if !regexp.MustCompile(`^[A-Za-z]+$`).MatchString(l) || seen[l] != "" {
			t.Errorf("letters(%q) = %q, which is also that of %q", name, l, seen[l])
		}
		seen[l] = name
	}
}

func ExampleEscape() {
	fmt.Println(Escape(`my_survey (100% & more)`))
	// Output: my\_survey (100\% \& more)
}
