package draft

import (
	"regexp"
	"strings"
	"unicode"
)

// plain is what LaTeX needs in place of a character of a text.
var plain = map[rune]string{
	'\\': `\textbackslash{}`, '{': `\{`, '}': `\}`, '$': `\$`, '&': `\&`, '#': `\#`, '_': `\_`, '%': `\%`,
	'~': `\textasciitilde{}`, '^': `\textasciicircum{}`, '<': `\textless{}`, '>': `\textgreater{}`, '|': `\textbar{}`,
	'"': "''", '`': "'",
	'–': "--", '—': "---", '’': "'", '‘': "`", '…': `\dots{}`, '±': `\ensuremath{\pm}`, '×': `\ensuremath{\times}`,
	'≠': `\ensuremath{\neq}`, '≤': `\ensuremath{\leq}`, '≥': `\ensuremath{\geq}`, '²': `\ensuremath{^2}`, '−': `\ensuremath{-}`,
	'α': `\ensuremath{\alpha}`, 'β': `\ensuremath{\beta}`, 'γ': `\ensuremath{\gamma}`, 'δ': `\ensuremath{\delta}`,
	'λ': `\ensuremath{\lambda}`, 'μ': `\ensuremath{\mu}`, 'σ': `\ensuremath{\sigma}`, 'ω': `\ensuremath{\omega}`,
	'Δ': `\ensuremath{\Delta}`, 'Λ': `\ensuremath{\Lambda}`, 'Ω': `\ensuremath{\Omega}`, 'χ': `\ensuremath{\chi}`,
}

// accented are the letters that LaTeX reads as they are with its default
// encodings, without a package.
const accented = "ÀÁÂÃÄÅÆÇÈÉÊËÌÍÎÏÑÒÓÔÕÖØÙÚÛÜÝßàáâãäåæçèéêëìíîïñòóôõöøùúûüýÿŁłŒœŠšŽžČčĆćŘřŇňĎďŤťĚěŮůŐőŰűŃńŚśŹźŻż"

// Escape makes any string a text of LaTeX, also in the argument of a command.
// What no plain document can print becomes a question mark.
func Escape(s string) string {
	var b strings.Builder
	for _, r := range s {
		t, ok := plain[r]
		switch {
		case ok:
			b.WriteString(t)
		case r >= ' ' && r < 0x7f, strings.ContainsRune(accented, r):
			b.WriteRune(r)
		case unicode.IsSpace(r), unicode.IsControl(r):
			b.WriteByte(' ')
		default:
			b.WriteByte('?')
		}
	}
	return b.String()
}

var quantities = regexp.MustCompile(`\b(Om|OL|Ok|w0|wa|q0)\b`)

// named is a text of our own, such as "critical (Om = 1)", with symbols for its quantities.
func named(s string) string {
	return quantities.ReplaceAllStringFunc(Escape(s), func(name string) string { return "$" + symbol(name) + "$" })
}

// comment is a text that stays on one line of a comment.
func comment(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) || r == '\u2028' || r == '\u2029' {
			return ' '
		}
		return r
	}, s)
}

// markdown makes any string a text of Markdown and of the HTML within it.
func markdown(s string) string {
	var b strings.Builder
	for _, r := range comment(s) {
		switch {
		case r == '<':
			b.WriteString("&lt;")
		case r == '>':
			b.WriteString("&gt;")
		case r == '&':
			b.WriteString("&amp;")
		case strings.ContainsRune("\\`*_[]#|~$", r):
			b.WriteByte('\\')
			b.WriteRune(r)
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

// symbol is a quantity in math mode.
func symbol(name string) string {
	s, ok := map[string]string{
		"Om": `\Omega_{\mathrm m}`, "OL": `\Omega_\Lambda`, "Ok": `\Omega_k`, "Or": `\Omega_{\mathrm r}`,
		"H0": "H_0", "w0": "w_0", "wa": "w_a", "q0": "q_0", "rd": `r_{\mathrm d}`, "hrd": `h\,r_{\mathrm d}`,
		"ob": `\Omega_{\mathrm b}h^2`, "M": "M", "age": "t_0", "H0t0": "H_0 t_0",
	}[name]
	if !ok {
		return `\mbox{` + Escape(name) + "}"
	}
	return s
}

// unit is a unit in math mode.
func unit(u string) string {
	switch u {
	case "":
		return ""
	case "km/s/Mpc":
		return `\mathrm{km\,s^{-1}\,Mpc^{-1}}`
	}
	return `\mbox{` + Escape(u) + "}"
}

// letters makes a name of a macro, which has letters only: words are capitalised,
// digits spelled.
func letters(s string) string {
	digits := [10]string{"Zero", "One", "Two", "Three", "Four", "Five", "Six", "Seven", "Eight", "Nine"}
	var b strings.Builder
	begin := true
	for _, r := range s {
		switch {
		case r >= '0' && r <= '9':
			b.WriteString(digits[r-'0'])
			begin = true
		case r < 0x80 && unicode.IsLetter(r):
			if begin {
				r = unicode.ToUpper(r)
			}
			b.WriteRune(r)
			begin = false
		default:
			begin = true
		}
	}
	return b.String()
}
