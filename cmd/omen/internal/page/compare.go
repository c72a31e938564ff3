package page

import (
	_ "embed"
	"html/template"
	"io"
	"strings"

	"omen/cmd/omen/internal/compare"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
)

//go:embed compare.html.tmpl
var compareText string

var compareTemplate = template.Must(template.New("compare").Parse(compareText))

// sideBySide is what the template of a comparison shows.
type sideBySide struct {
	Title, Version string
	Amiss          []string
	Style          template.CSS
	Runs           []oneOf
	Quantities     []inRuns
	Figures        []drawing
	Missing        []string
	Pairs          []pair
}

type oneOf struct {
	Name, Title string
	Warnings    []string
}

type inRuns struct {
	Symbol template.HTML
	Unit   string
	Rows   []inRun
}

type inRun struct {
	Run                        string
	Instead, Value, In68, In95 template.HTML
}

type pair struct {
	Title, Formula, Why string
	Shifts              []shift
}

type shift struct {
	Symbol, Sigmas template.HTML
}

// Comparison writes comparison.html.
func Comparison(w io.Writer, c *compare.Comparison, pictures []*gather.Picture, version string) error {
	v := sideBySide{Version: version, Style: template.CSS(style)}
	var titles []string
	for _, r := range c.Runs {
		v.Runs = append(v.Runs, oneOf{r.Name, r.Summary.Title, r.Summary.Warnings})
		titles = append(titles, r.Name)
		for _, text := range r.Amiss() {
			v.Amiss = append(v.Amiss, r.Name+": "+text)
		}
	}
	v.Title = strings.Join(titles, ", ")
	for _, q := range c.Quantities {
		rows := inRuns{Symbol: symbol(q.Name), Unit: q.Unit}
		for i, u := range q.Values {
			switch {
			case u != nil:
				rows.Rows = append(rows.Rows, inRun{Run: c.Runs[i].Name, Value: text(report.MeanSD(*u)),
					In68: text(report.Interval(u.Interval68, u.MCSE68, *u)), In95: text(report.Interval(u.Interval95, u.MCSE95, *u))})
			case q.Instead[i] != "":
				rows.Rows = append(rows.Rows, inRun{Run: c.Runs[i].Name, Instead: text(q.Instead[i])})
			}
		}
		v.Quantities = append(v.Quantities, rows)
	}
	for _, p := range c.Pairs {
		q := pair{Title: c.Runs[p.A].Name + " to " + c.Runs[p.B].Name, Formula: p.Rule.Formula(), Why: p.Why()}
		for _, s := range p.Shifts {
			q.Shifts = append(q.Shifts, shift{symbol(s.Name), text(compare.Sigmas(s))})
		}
		v.Pairs = append(v.Pairs, q)
	}
	var err error
	if v.Figures, v.Missing, err = drawings(pictures); err != nil {
		return err
	}
	return compareTemplate.Execute(w, v)
}
