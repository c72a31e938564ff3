package main

import (
	"bytes"
	"cmp"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"math"
	"os"
	"slices"
	"strings"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
	"omen/data"
	"omen/likelihood"
	"omen/model"
)

// sampleColumns are the columns that a published sample can have.
var sampleColumns = []data.Column{
	{Name: "Om", What: "the density parameter of matter", NotNegative: true},
	{Name: "OL", What: "the density parameter of dark energy", Optional: true},
	{Name: "Ok", What: "that of curvature", Optional: true},
	{Name: "Or", What: "that of radiation", Optional: true, NotNegative: true},
	{Name: "H0", What: "the Hubble constant in km/s/Mpc", Optional: true, NotNegative: true},
	{Name: "w0", What: "the equation of state today", Optional: true},
	{Name: "wa", What: "its change", Optional: true},
	{Name: "weight", What: "the weight of the row", Optional: true, NotNegative: true},
}

// runSamples writes constraints and fates of a posterior sample that was published.
func (o *fateOptions) runSamples(knowsH0 bool, stdout io.Writer) error {
	text, err := os.ReadFile(o.samples)
	if err != nil {
		return usagef("--samples: cannot read %s: %v", o.samples, err.(*os.PathError).Err)
	}
	columns, err := o.columnMap()
	if err != nil {
		return err
	}
	plain, err := data.Decompress(bytes.NewReader(text))
	if err != nil {
		return usagef("--samples: cannot read %s: %v", o.samples, err)
	}
	values, rows, err := data.ReadColumns(plain, o.samples, data.Options{Columns: columns, Mapping: asFlag}, sampleColumns...)
	if err != nil {
		return err
	}
	if err := checkSample(values, rows, columns); err != nil {
		return err
	}
	sum := sha256.Sum256(text)
	s := result.Sample{Title: "Posterior sample " + o.samples, Version: version(), Weights: values["weight"],
		KnowsH0: knowsH0 || values["H0"] != nil, Inputs: []result.InputFile{{Path: o.samples, SHA256: hex.EncodeToString(sum[:])}}}
	if err := o.universes(&s, values, rows); err != nil {
		return err
	}
	summary := result.OfSample(s)
	if o.asJSON {
		return report.JSON(stdout, summary)
	}
	return report.Text(stdout, summary)
}

// asFlag is how a column is mapped on the command line: in quotation marks for a shell, and
// for the comma between mappings, where it needs them.
func asFlag(name, column string) string {
	pair := name + "=" + column
	if strings.ContainsAny(pair, ",\"\r\n") {
		pair = `"` + strings.ReplaceAll(pair, `"`, `""`) + `"`
	}
	return "--columns " + shellWord(pair)
}

// shellWord is a word as it can be typed in a shell, in quotation marks where it needs them.
func shellWord(s string) string {
	if s != "" && !strings.ContainsAny(s, " \"'$`\\*?[](){}<>|&;!#~") && report.Printable(s) == s {
		return s
	}
	return "'" + strings.ReplaceAll(report.Printable(s), "'", `'\''`) + "'"
}

// columnMap reads --columns Om=omegam,OL=omegal.
func (o *fateOptions) columnMap() (map[string]string, error) {
	m := map[string]string{}
	for _, pair := range o.columns {
		name, column, ok := strings.Cut(pair, "=")
		if !ok || name == "" || column == "" {
			return nil, usagef("--columns: found %q, expected name=column pairs such as Om=omega_m,OL=omega_l", pair)
		}
		if before, twice := m[name]; twice {
			return nil, usagef("--columns: found %s twice, as %s and as %s; keep one", name, before, column)
		}
		m[name] = column
	}
	return m, noneTwice(m)
}

// noneTwice refuses a column that would be read as two. One without a mapping goes by its own name.
func noneTwice(columns map[string]string) error {
	reader := map[string]string{}
	for _, c := range sampleColumns {
		column, mapped := columns[c.Name]
		if !mapped {
			column = c.Name
		}
		if other, taken := reader[column]; taken {
			return usagef("--columns: the column %s would be both %s and %s; map each to a column of its own", column, other, c.Name)
		}
		reader[column] = c.Name
	}
	return nil
}

// fewestRows is what a sample needs for its correlation to be estimated at all (our choice).
const fewestRows = 10

// checkSample refuses what cannot be a posterior sample in our units.
func checkSample(values map[string][]float64, rows data.Selection, columns map[string]string) error {
	if n := len(rows.Kept); n < fewestRows {
		return &data.Error{File: rows.File, Message: fmt.Sprintf("found %s, expected a posterior sample of at least %d", digits.Count(n, "row"), fewestRows)}
	}
	if n := worth(values["weight"]); n < fewestRows {
		return usagef("--samples: the weights in %s are worth %.3g rows of equal weight (Kish), expected at least %d; is the column the right one? --columns weight=NAME",
			rows.File, n, fewestRows)
	}
	const other = "is the column the right one? map another: --columns "
	for _, c := range []struct {
		name     string
		from, to float64
		hint     string
	}{
		{"Om", 0, largestDensity, "is it in percent? divide it by 100, or map another column: --columns Om=NAME"},
		{"OL", -largestDensity, largestDensity, "is it in percent? divide it by 100, or map another column: --columns OL=NAME"},
		{"H0", leastH0, largestH0, "is it h = H0/100? multiply it by 100, or map another column: --columns H0=NAME"},
		{"Ok", -3 * largestDensity, 3 * largestDensity, other + "Ok=NAME"},
		{"Or", 0, largestDensity, other + "Or=NAME"},
		{"w0", -largestW, largestW, other + "w0=NAME"},
		{"wa", -largestW, largestW, other + "wa=NAME"},
	} {
		for i, x := range values[c.name] {
			if !(x >= c.from && x <= c.to) {
				return &data.Error{File: rows.File, Line: rows.Lines[i], Column: cmp.Or(columns[c.name], c.name),
					Message: fmt.Sprintf("found %g, expected %g to %g; %s", x, c.from, c.to, c.hint)}
			}
		}
	}
	return nil
}

// worth is how many rows of equal weight there are for the weights (Kish 1965, Survey
// Sampling, §11.7, from memory): (Σw)²/Σw². Without weights nothing is amiss.
func worth(weights []float64) float64 {
	if weights == nil {
		return math.Inf(1)
	}
	largest, sum, squares := slices.Max(weights), 0.0, 0.0
	if largest == 0 {
		return 0
	}
	for _, w := range weights {
		sum, squares = sum+w/largest, squares+w/largest*(w/largest)
	}
	return sum * sum / squares
}

// contradiction is by how much Om + OL + Or + Ok may miss 1: rounding in a published table.
const contradiction = 1e-3

// universes makes one of every row. Columns that the sample does not have are the flags'.
func (o *fateOptions) universes(s *result.Sample, values map[string][]float64, rows data.Selection) error {
	at := func(name string, i int, otherwise float64) float64 {
		if v := values[name]; v != nil {
			return v[i]
		}
		return otherwise
	}
	for i, om := range values["Om"] {
		u := model.Universe{Om: om, H0: at("H0", i, o.u.H0), W0: at("w0", i, o.u.W0), Wa: at("wa", i, o.u.Wa)}
		if u.Or = at("Or", i, o.u.Or); o.radiation == fromTemperature && values["Or"] == nil {
			u.Or = model.RadiationFromTemperature(u.H0)
		}
		u.OL = at("OL", i, 1-u.Om-u.Or-at("Ok", i, 0))
		if ok := at("Ok", i, u.Ok()); !(math.Abs(ok-u.Ok()) <= contradiction) {
			return &data.Error{File: rows.File, Line: rows.Lines[i], Message: fmt.Sprintf(
				"found Ok = %g, expected 1 - Om - OL - Or = %.6g; leave out OL or Ok, or correct --columns", ok, u.Ok())}
		}
		s.Universes = append(s.Universes, u)
	}
	return o.describe(s, values)
}

// describe tells what varies in a sample from what is the same in every row.
func (o *fateOptions) describe(s *result.Sample, values map[string][]float64) error {
	ok := values["Ok"]
	s.Curved = values["OL"] != nil || ok != nil && !(constant(ok) && ok[0] == 0)
	for _, name := range likelihood.Names() {
		v := values[name]
		switch {
		case v != nil && constant(v):
			s.Notes = append(s.Notes, fmt.Sprintf("%s = %g in every row", name, v[0]))
		case v != nil, name == "OL" && s.Curved:
			s.Names = append(s.Names, name)
		}
	}
	if u := s.Universes[0]; values["w0"] == nil && u.W0 != -1 {
		s.Notes = append(s.Notes, fmt.Sprintf("w0 = %g in every row (--w0)", u.W0))
	}
	if u := s.Universes[0]; values["wa"] == nil && u.Wa != 0 {
		s.Notes = append(s.Notes, fmt.Sprintf("wa = %g in every row (--wa)", u.Wa))
	}
	if len(s.Names) == 0 {
		return usagef("--samples: every row of %s is the same universe; give it as omen fate --Om", o.samples)
	}
	if slices.Min(values["Om"]) > 5 {
		s.Warnings = append(s.Warnings, "Om is above 5 in every row: is it in percent? then divide it by 100, or map another column: --columns Om=NAME")
	}
	s.Notes = append(s.Notes, fmt.Sprintf("radiation: %s", radiationOf(values, o.radiation)))
	return nil
}

// constant is whether a column has one value.
func constant(x []float64) bool { return slices.Min(x) == slices.Max(x) }

func radiationOf(values map[string][]float64, flag string) string {
	switch {
	case values["Or"] != nil:
		return "column Or"
	case flag == fromTemperature:
		return "from the CMB temperature"
	case flag == "0":
		return "none"
	}
	return "Or = " + flag
}
