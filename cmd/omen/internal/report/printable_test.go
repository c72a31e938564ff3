package report

import (
	"strings"
	"testing"

	"omen/cmd/omen/internal/result"
)

// Nothing that a file says can steer the terminal.
func TestPrintable(t *testing.T) {
	const bad, good = "a\x1b[2J\nb\u0085é", "a�[2J�b�é"
	if got := Printable(bad); got != good {
		t.Errorf("got %q, want %q", got, good)
	}
	s := &result.Summary{Title: bad, Complete: true, Warnings: []string{bad}}
	s.Fit.Rows, s.Fit.Tables = 2, []result.TableFit{{Name: bad}, {Name: bad}}
	var b strings.Builder
	if err := Text(&b, s); err != nil {
		t.Fatal(err)
	}
	if n := strings.Count(b.String(), good); n != 4 || strings.Contains(b.String(), "\x1b") {
		t.Errorf("%d of 4 names are fit to print in %q", n, b.String())
	}
}
