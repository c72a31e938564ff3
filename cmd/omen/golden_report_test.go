package main

import (
	"bytes"
	"encoding/json"
	"os"
	"path/filepath"
	"strings"
	"testing"
	"unicode/utf8"

	"omen/cmd/omen/internal/compare"
	"omen/cmd/omen/internal/draft"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/page"
	"omen/cmd/omen/internal/result"
)

// keptRun is a committed run with a summary that was once made of it: its texts do
// not depend on what a processor makes of a chain.
func keptRun(t *testing.T, name, dir string) *gather.Run {
	t.Helper()
	text, err := os.ReadFile(filepath.Join("testdata", "report", name+".json"))
	if err != nil {
		t.Fatal(err)
	}
	var s result.Summary
	if err := json.Unmarshal(text, &s); err != nil {
		t.Fatal(err)
	}
	j, err := load(runsFile(name+".toml"), nil)
	if err != nil {
		t.Fatal(err)
	}
	best := make([]float64, j.Space.Dim())
	for i, p := range j.Space.Free() {
		best[i] = float64(s.Fit.Best[p.Name])
	}
	return &gather.Run{Run: &result.Run{Job: j, Best: best}, Summary: &s, Dir: dir, RunFile: []byte("# the run file\n")}
}

// Every text of a report, of runs with little and with much to tell.
func TestReportTexts(t *testing.T) {
	for _, name := range []string{"fate", "bao-flat", "bao-w0wa"} {
		r := keptRun(t, name, name)
		golden(t, "report/"+name+".constraints.tex", string(draft.Constraints(r)))
		golden(t, "report/"+name+".fates.tex", string(draft.Fates(r)))
		golden(t, "report/"+name+".nested.tex", string(draft.Nested(r)))
		golden(t, "report/"+name+".numbers.tex", string(draft.Numbers(r)))
		golden(t, "report/"+name+".methods.md", string(draft.Methods(r)))
		text, err := draft.CSV(r)
		if err != nil {
			t.Fatal(err)
		}
		golden(t, "report/"+name+".constraints.csv", string(text))
		var html bytes.Buffer
		if err := page.Report(&html, r, []*gather.Picture{gather.Absent("plane", "The plane", "there is none here")}); err != nil {
			t.Fatal(err)
		}
		golden(t, "report/"+name+".html", html.String())
	}
}

// Every text of a comparison.
func TestCompareTexts(t *testing.T) {
	c := compare.New([]*gather.Run{keptRun(t, "fate", "a/fate"), keptRun(t, "bao-flat", "a/flat"), keptRun(t, "fate", "b/fate")})
	c.Runs[2].Summary.Complete = false
	var text, html bytes.Buffer
	if err := c.Text(&text); err != nil {
		t.Fatal(err)
	}
	for i, line := range strings.Split(text.String(), "\n") {
		if utf8.RuneCountInString(line) > 80 {
			t.Errorf("line %d has more than 80 columns: %s", i+1, line)
		}
	}
	golden(t, "report/compare.txt", text.String())
	golden(t, "report/compare.tex", string(c.TeX()))
	for name, make := range map[string]func() ([]byte, error){"comparison": c.CSV, "shifts": c.ShiftsCSV} {
		text, err := make()
		if err != nil {
			t.Fatal(err)
		}
		golden(t, "report/compare."+name+".csv", string(text))
	}
	if err := page.Comparison(&html, c, nil, "0.1.0"); err != nil {
		t.Fatal(err)
	}
	golden(t, "report/compare.html", html.String())
}
