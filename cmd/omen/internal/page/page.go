// Package page writes a result as one page to share: a single HTML file with its
// figures inside, that asks nothing of a network and runs no script. It can be
// read on a phone, in the dark, in print and by a screen reader.
//
// html/template escapes every name that comes from a file; a policy in the page
// forbids whatever would slip through.
package page

import (
	"bytes"
	_ "embed"
	"fmt"
	"html/template"
	"io"
	"math"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
)

//go:embed style.css
var style string

//go:embed report.html.tmpl
var reportText string

var reportTemplate = template.Must(template.New("report").Parse(reportText))

// view is what the template shows.
type view struct {
	Title, Kind, Version, Unfinished string
	Style                            template.CSS
	Warnings, Missing                []string
	Words                            []template.HTML
	Blocks                           [][]quantity
	Fates                            []shares
	Nested                           []universeRow
	Times                            []when
	SamePriors                       string
	Figures                          []drawing
	Chain                            template.HTML
	Tables                           []table
	Outliers                         []outlier
	Convergence                      []quantity
	Assumptions                      []string
	Inputs                           []result.InputFile
	RunFile                          string
}

// quantity is a row of constraints and of convergence.
type quantity struct {
	Symbol            template.HTML
	Unit              string
	Value, In68, In95 template.HTML
	Constrained       bool
	ESS, RHat, MCSE   string
}

// shares is a table of probabilities.
type shares struct {
	Name    template.HTML
	What    string
	Columns []string
	Rows    []share
}

type share struct {
	Name    template.HTML
	Percent string
	Cells   []shareCell
}

type shareCell struct {
	Column string
	Text   template.HTML
}

// universeRow is one of the nested universes.
type universeRow struct {
	Ruled, Chi2, AIC, BIC    string
	Own                      bool
	Free                     int
	Name, Bayes, Probability template.HTML
}

// when is a time with its intervals, or why it is not known.
type when struct {
	Name, Unit, Why    string
	Median, In68, In95 template.HTML
}

// drawing is a figure, with a narrow version where the other is for a page.
type drawing struct {
	Name, Title, Caption string
	SVG, Narrow          template.HTML
}

type table struct {
	Name, Kind string
	Rows       int
	Chi2       string
}

// outlier is a row of those that fit worst.
type outlier struct {
	Table, Name                 string
	Line                        int
	Z                           string
	Measured, Predicted, Sigmas template.HTML
}

const mostOutliers = 6

// Report writes report.html.
func Report(w io.Writer, r *gather.Run, pictures []*gather.Picture) error {
	s := r.Summary
	v := view{Title: s.Title, Kind: "Constraints on the universe and its fate", Version: s.Version, Style: template.CSS(style),
		Warnings: s.Warnings, Words: words(r), Chain: text(chain(s)), Assumptions: s.Assumptions, Inputs: s.Inputs, RunFile: string(r.RunFile)}
	if v.Title == "" {
		v.Title = "A run without a title"
	}
	if !s.Complete {
		v.Unfinished = "the run stopped before its goal"
	}
	for _, qs := range [][]result.Quantity{s.Parameters, s.Derived} {
		var rows []quantity
		for _, q := range qs {
			rows = append(rows, newQuantity(q))
		}
		if len(rows) > 0 {
			v.Blocks = append(v.Blocks, rows)
			if s.Sampling.Ensembles > 0 {
				v.Convergence = append(v.Convergence, rows...)
			}
		}
	}
	v.Fates, v.SamePriors = fateTables(s)
	v.Nested, v.Times = nested(s.Nested), times(s.Times)
	for _, o := range r.Outliers(mostOutliers) {
		v.Outliers = append(v.Outliers, outlier{o.Table, o.Name, o.Line, digits.Format(o.Z, -4), text(fmt.Sprintf("%.3f", o.Measured)),
			text(fmt.Sprintf("%.3f", o.Predicted)), text(fmt.Sprintf("%+.1f", o.Sigmas))})
	}
	for _, t := range s.Fit.Tables {
		v.Tables = append(v.Tables, table{t.Name, t.Kind, t.Rows, fmt.Sprintf("%.2f", float64(t.Chi2))})
	}
	var err error
	if v.Figures, v.Missing, err = drawings(pictures); err != nil {
		return err
	}
	return reportTemplate.Execute(w, v)
}

// drawings makes figures part of the page, and says which there are not.
func drawings(pictures []*gather.Picture) (figures []drawing, missing []string, err error) {
	for _, p := range pictures {
		if p.Why != "" {
			missing = append(missing, p.Title+" ("+p.Why+")")
			continue
		}
		d, err := draw(p)
		if err != nil {
			return nil, nil, err
		}
		figures = append(figures, *d)
	}
	return figures, missing, nil
}

// draw makes a figure part of the page.
func draw(p *gather.Picture) (*drawing, error) {
	d := &drawing{Name: p.Name, Title: p.Title, Caption: p.Caption}
	inline := func(width figure.Width, id string) (template.HTML, error) {
		f, err := p.Draw(width)
		if err != nil {
			return "", fmt.Errorf("figure %s: %w", p.Name, err)
		}
		var b bytes.Buffer
		err = f.WriteInlineSVG(&b, id, p.Alt)
		return template.HTML(b.String()), err // package figure escapes
	}
	var err error
	if !p.Wide {
		d.SVG, err = inline(figure.Column, "f-"+p.Name)
		return d, err
	}
	if d.SVG, err = inline(figure.Page, "f-"+p.Name); err == nil {
		d.Narrow, err = inline(figure.Column, "n-"+p.Name)
	}
	return d, err
}

func newQuantity(q result.Quantity) quantity {
	return quantity{Symbol: symbol(q.Name), Unit: q.Unit, Value: text(report.MeanSD(q)), In68: text(report.Interval(q.Interval68, q.MCSE68, q)),
		In95: text(report.Interval(q.Interval95, q.MCSE95, q)), Constrained: q.Constrained,
		ESS: digits.Format(math.Floor(float64(q.ESS)), 0), RHat: digits.Format(float64(q.RHat), -4), MCSE: digits.Error(float64(q.MCSE))}
}
