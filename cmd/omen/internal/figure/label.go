package figure

import "strings"

// Label is a text with sub- and superscripts and italics. The zero value is empty.
type Label []run

// run is a stretch of text in one style.
type run struct {
	text   string
	italic bool
	level  int  // -1 subscript, 0, +1 superscript
	hat    bool // with a circumflex on top
}

// Plain is a label that shows s as it is; use it for every name that comes from a file. Control characters
// become blanks, and what the font lacks a box.
func Plain(s string) Label {
	return Label{{text: printable(s)}}
}

func printable(s string) string {
	return strings.Map(func(r rune) rune {
		switch {
		case r < ' ' || r == 0x7f:
			return ' '
		case r > 0xffff || !hasGlyph(r):
			return '□'
		}
		return r
	}, s)
}

// Markup reads a label in a small notation: *x* is italic, _x or _{xy} a subscript, ^x or ^{xy} a superscript,
// ~x carries a circumflex, and a backslash takes the next character as it is.
func Markup(s string) Label {
	var l Label
	r := []rune(s)
	italic := false
	for i := 0; i < len(r); i++ {
		switch c := r[i]; c {
		case '*':
			italic = !italic
		case '_', '^':
			text, n := group(r[i+1:])
			level := 1
			if c == '_' {
				level = -1
			}
			l = append(l, run{text: text, level: level})
			i += n
		case '~':
			text, n := group(r[i+1:])
			l = append(l, run{text: text, italic: italic, hat: true})
			i += n
		default:
			if c == '\\' && i+1 < len(r) {
				i++
				c = r[i]
			}
			if n := len(l); n > 0 && l[n-1].level == 0 && !l[n-1].hat && l[n-1].italic == italic {
				l[n-1].text += string(c)
			} else {
				l = append(l, run{text: string(c), italic: italic})
			}
		}
	}
	return l
}

// group is the next character or the content of the next braces, and how many runes that took.
func group(r []rune) (string, int) {
	if len(r) == 0 {
		return "", 0
	}
	if r[0] != '{' {
		return string(r[0]), 1
	}
	for i, c := range r {
		if c == '}' {
			return string(r[1:i]), i + 1
		}
	}
	return string(r[1:]), len(r)
}

// Symbol is the mathematical symbol of a quantity by its name in run files and tables, and its unit, empty for
// pure numbers. A name without a symbol is shown as it is.
func Symbol(name string) (symbol, unit Label) {
	s, ok := map[string][2]string{
		"Om": {"Ω_m"}, "OL": {"Ω_Λ"}, "Ok": {"Ω_k"}, "Or": {"Ω_r"},
		"H0": {"*H*_0", "km/s/Mpc"},
		"w0": {"*w*_0"}, "wa": {"*w*_a"}, "w": {"*w*"}, "q0": {"*q*_0"},
		"rd": {"*r*_d", "Mpc"}, "hrd": {"*h r*_d", "Mpc"}, "ob": {"Ω_b *h*^2"},
		"M": {"*M*", "mag"}, "mu": {"*μ*", "mag"}, "mag": {"*m*", "mag"},
		"z": {"*z*"}, "a": {"*a*"}, "age": {"*t*_0", "Gyr"},
	}[name]
	if !ok {
		return Plain(name), nil
	}
	if s[1] == "" {
		return Markup(s[0]), nil
	}
	return Markup(s[0]), Markup(s[1])
}

// WithUnit joins a symbol and its unit as on an axis: symbol (unit).
func WithUnit(symbol, unit Label) Label {
	if len(unit) == 0 {
		return symbol
	}
	l := append(Label{}, symbol...)
	l = append(l, run{text: " ("})
	l = append(l, unit...)
	return append(l, run{text: ")"})
}

// shorten cuts a label at the end until it is at most w wide, and says so by an ellipsis.
func (l Label) shorten(w, size float64) Label {
	if l.measure(size) <= w {
		return l
	}
	out := append(Label{}, l...)
	for len(out) > 0 {
		last := &out[len(out)-1]
		if r := []rune(last.text); len(r) > 1 {
			last.text = strings.TrimRight(string(r[:len(r)-1]), " ")
		} else {
			out = out[:len(out)-1]
		}
		if cut := append(out[:len(out):len(out)], run{text: "…"}); cut.measure(size) <= w {
			return cut
		}
	}
	return Label{{text: "…"}}
}

// wrap breaks a plain label wider than w into two lines at the blank nearest to its middle, and shortens what is
// still too wide.
func (l Label) wrap(w, size float64) []Label {
	if len(l) != 1 || l.measure(size) <= w {
		return []Label{l.shorten(w, size)}
	}
	words := strings.Fields(l[0].text)
	best, at := w*10, 0
	for i := 1; i < len(words); i++ {
		a, b := Plain(strings.Join(words[:i], " ")), Plain(strings.Join(words[i:], " "))
		if v := max(a.measure(size), b.measure(size)); v < best {
			best, at = v, i
		}
	}
	if at == 0 {
		return []Label{l.shorten(w, size)}
	}
	first, second := Plain(strings.Join(words[:at], " ")), Plain(strings.Join(words[at:], " "))
	return []Label{first.shorten(w, size), second.shorten(w, size)}
}

// String is the label in plain characters, for alternative texts.
func (l Label) String() string {
	var b strings.Builder
	for _, r := range l {
		if r.level > 0 {
			b.WriteByte('^')
		}
		b.WriteString(r.text)
		if r.hat {
			b.WriteRune('\u0302')
		}
	}
	return b.String()
}
