package report

import (
	"strings"
	"unicode"
)

// Printable is a name or a title from a file, fit for a terminal: a control
// character, which could move the cursor or break a line, is shown as �.
func Printable(s string) string {
	return strings.Map(func(r rune) rune {
		if unicode.IsControl(r) {
			return unicode.ReplacementChar
		}
		return r
	}, s)
}
