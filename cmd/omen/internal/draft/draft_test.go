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

	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

func quantity(mean, sd, down, up, mcse float64) result.Quantity {
	n := func(x float64) result.Number { return result.Number(x) }
	return result.Quantity{Name: "Om", Mean: n(mean), SD: n(sd), Median: n(mean), Interval68: [2]result.Number{n(mean - down), n(mean + up)},
		MCSE: n(mcse), MCSE68: [2]result.Number{n(mcse), n(mcse)}, MCSE95: [2]result.Number{n(mcse), n(mcse)}, Constrained: true}
}

// A value in print has the digits that it has on the terminal.
func TestEstimate(t *testing.T) {
	cut := quantity(0.354, 0.0342, 0.0342, 0.0342, 1e-4)
	cut.CutByPrior = true
	for _, c := range []struct {
		q    result.Quantity
		want string
	}{
		{quantity(0.82751, 0.1191, 0.119, 0.119, 1e-5), `$0.83 \pm 0.12$`},
		{quantity(0.33, 0.351, 0.351, 0.351, 1e-3), `$0.33 \pm 0.35$`},
		{quantity(100.551, 0.742, 0.742, 0.742, 0.008), `$100.55 \pm 0.74$`},
		{quantity(0.0491, 0.0362, 0.0362, 0.0362, 0.0006), `$0.049 \pm 0.036$`},
		{quantity(0.29318, 0.01134, 0.0112, 0.0114, 0.004), `$0.29 \pm 0.01$`},
		{quantity(-0.4951, 0.032, 0.032, 0.032, 0.011), `$-0.5 \pm 0.03$`},
		{quantity(-0.431, 0.27, 0.32, 0.23, 0.004), `$-0.43^{+0.23}_{-0.32}$`},
		{quantity(-0.431, 0.27, 0.32, 0.23, 0.05), `$-0.4 \pm 0.3$`}, // lopsided within the noise
		{quantity(1234, 212, 212, 212, 3), `$1230 \pm 210$`},
		{cut, `$0.354 \pm 0.034{}^{*}$`},
	} {
		if text := strings.NewReplacer("$", "", `\pm`, "±", "{}^{*}", "").Replace(c.want); !strings.Contains(c.want, "_") && report.MeanSD(c.q) != text {
			t.Errorf("on the terminal %s, expected %s", report.MeanSD(c.q), text)
		}
		if got := Estimate(c.q); got != c.want {
			t.Errorf("mean %g, sd %g, Monte Carlo error %g: %s, expected %s", c.q.Mean, c.q.SD, c.q.MCSE, got, c.want)
		}
	}
}

// A time is a median, with one error where those on the two sides are alike.
func TestWhen(t *testing.T) {
	for _, c := range []struct {
		median, lo, hi, mcse result.Number
		want                 string
	}{
		{0.95571, 0.94802, 0.96331, 1e-5, `0.9557 \pm 0.0076`},
		{0.741, 0.666, 0.79, 1e-4, `0.741^{+0.049}_{-0.075}`},
		{11.2, 5.1, 45.3, 0.4, `11^{+34}_{-6}`},
	} {
		if got := when(result.Time{Median: c.median, Interval68: [2]result.Number{c.lo, c.hi}, MCSE: c.mcse}); got != c.want {
			t.Errorf("%g in [%g, %g]: %s, expected %s", c.median, c.lo, c.hi, got, c.want)
		}
	}
}

// A table says which of its values are medians, and what its mark means, if it has such.
func TestNotes(t *testing.T) {
	even, uneven := quantity(0.3, 0.011, 0.011, 0.011, 1e-4), quantity(-0.431, 0.27, 0.32, 0.23, 0.004)
	open, cut := uneven, even
	open.Constrained, cut.CutByPrior = false, true
	for _, c := range []struct {
		qs           []result.Quantity
		title, notes string
	}{
		{[]result.Quantity{even, open}, `Mean $\pm$ sd`, ""},
		{[]result.Quantity{even, uneven}, "Value", `\multicolumn{3}{l}{\footnotesize Mean $\pm$ sd; with two errors, median and central 68\%}\\` + "\n"},
		{[]result.Quantity{cut}, `Mean $\pm$ sd`, `\multicolumn{3}{l}{\footnotesize $^{*}$ cut by its prior}\\` + "\n"},
	} {
		if title, notes := column(c.qs), Notes(c.qs, 3); title != c.title || notes != c.notes {
			t.Errorf("column %q with notes %q, expected %q with %q", title, notes, c.title, c.notes)
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

// A quantity in the name of a universe has its symbol.
func TestNamed(t *testing.T) {
	for in, want := range map[string]string{"critical (Om = 1)": `critical ($\Omega_{\mathrm m}$ = 1)`, "flat, w0-wa": "flat, $w_0$-$w_a$", "Omega": "Omega"} {
		if got := named(in); got != want {
			t.Errorf("named(%q) = %q, expected %q", in, got, want)
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
