package main

import (
	"bytes"
	_ "embed"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"text/template"
	"unicode"

	"omen/cmd/omen/internal/example"
	"omen/cmd/omen/internal/report"
	"omen/data"

	"github.com/spf13/pflag"
)

const newHelp = `omen new makes a folder with a commented run file, ready to fit.

  omen new first-look
  omen new mine --supernovae my.csv --covariance my.cov
  omen new both --supernovae my.csv --bao ratios.csv

With tables, it names the columns that it recognised in them. Without, it writes
a working example: an invented survey of 152 supernovae whose truth is known.
`

//go:embed new.toml.tmpl
var newTemplate string

type newOptions struct{ supernovae, covariance, bao string }

func newFlagSet(o *newOptions) *pflag.FlagSet {
	f := newFlags("new", newHelp)
	f.StringVar(&o.supernovae, "supernovae", "", "a `table` of supernovae")
	f.StringVar(&o.covariance, "covariance", "", "the `covariance` of the supernovae, or of the BAO ratios without supernovae")
	f.StringVar(&o.bao, "bao", "", "a `table` of BAO distance ratios")
	return f
}

// newRun is what the template is filled with.
type newRun struct {
	File, Title string
	Shown       string // the file as it can be typed
	BAO         bool
	Tables      []newTable
}

type newTable struct {
	Kind, Path, Covariance string
	Columns                []newColumn
	Missing                []string
	Header, Keep           string
}

type newColumn struct{ Ours, File string }

func runNew(args []string, stdout io.Writer) error {
	var o newOptions
	f := newFlagSet(&o)
	if done, err := parse(f, args, stdout, 1); done || err != nil {
		return err
	}
	if f.Arg(0) == "" {
		return usagef("new: the folder has no name; give it one, for example omen new mine")
	}
	dir := filepath.Clean(f.Arg(0))
	if o.covariance != "" && o.supernovae == "" && o.bao == "" {
		return usagef("new: --covariance without a table; add --supernovae or --bao")
	}
	if _, err := os.Lstat(dir); !errors.Is(err, os.ErrNotExist) {
		return usagef("new: %s exists; choose another folder", dir)
	}
	if err := readable(o.covariance); err != nil {
		return err
	}
	run, survey, err := o.plan(dir)
	if err != nil {
		return err
	}
	return run.write(dir, survey, stdout)
}

// readable refuses a file that is named but cannot be read.
func readable(path string) error {
	if path == "" {
		return nil
	}
	f, err := os.Open(path)
	if err != nil {
		return usagef("new: cannot read %s: %v", path, err.(*os.PathError).Err)
	}
	defer f.Close()
	if info, err := f.Stat(); err != nil || info.IsDir() {
		return usagef("new: cannot read %s: it is not a file but a folder; name a file in it", path)
	}
	return nil
}

// plan reads the headers of the tables. survey is the example's table, nil where
// the user brought tables.
func (o *newOptions) plan(dir string) (run *newRun, survey []byte, err error) {
	name := filepath.Base(dir)
	run = &newRun{File: filepath.Join(dir, name+".toml"), Title: name, BAO: o.bao != ""}
	if o.supernovae == "" && o.bao == "" {
		run.Title = "An invented survey"
		run.Tables = []newTable{{Kind: "supernovae", Path: "survey.csv", Keep: "z > 0.01"}}
		return run, example.Table(example.Seed), nil
	}
	covariance := o.covariance
	for _, t := range []struct{ kind, path string }{{"supernovae", o.supernovae}, {"bao", o.bao}} {
		if t.path == "" {
			continue
		}
		table, err := recognise(t.kind, t.path, dir)
		if err != nil {
			return nil, nil, err
		}
		if covariance != "" {
			table.Covariance, covariance = relative(covariance, dir), ""
		}
		run.Tables = append(run.Tables, *table)
	}
	return run, nil, nil
}

// needed lists the columns that a kind cannot do without.
var needed = map[string][]string{"supernovae": {"z"}, "bao": {"z", "quantity", "value"}}

// useful lists all columns that a kind may have.
var useful = map[string][]string{
	"supernovae": {"name", "survey", "z", "z_hel", "mu", "mu_err", "mag", "mag_err"},
	"bao":        {"z", "quantity", "value", "error"},
}

// recognise reads the header of a table and proposes its columns.
func recognise(kind, path, dir string) (*newTable, error) {
	if err := readable(path); err != nil {
		return nil, err
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, usagef("new: cannot read %s: %v", path, err.(*os.PathError).Err)
	}
	defer f.Close()
	header, err := data.Header(f, path)
	if err != nil {
		return nil, err
	}
	found := data.Recognise(header)
	t := &newTable{Kind: kind, Path: relative(path, dir), Header: strings.Join(header, " ")}
	for _, ours := range useful[kind] {
		if found[ours] != "" && found[ours] != ours {
			t.Columns = append(t.Columns, newColumn{ours, found[ours]})
		}
	}
	for _, ours := range needed[kind] {
		if found[ours] == "" {
			t.Missing = append(t.Missing, ours)
		}
	}
	if kind == "supernovae" && found["mu"] == "" && found["mag"] == "" {
		t.Missing = append(t.Missing, "mu (or mag)")
	}
	if kind == "supernovae" && found["z"] != "" {
		t.Keep = found["z"] + " > 0.01"
	}
	return t, nil
}

// relative makes a path as seen from dir.
func relative(path, dir string) string {
	from, err1 := filepath.Abs(dir)
	to, err2 := filepath.Abs(path)
	if err1 != nil || err2 != nil {
		return path
	}
	rel, err := filepath.Rel(from, to)
	if err != nil {
		return to
	}
	return filepath.ToSlash(rel)
}

// quoted escapes what goes between quotation marks in the template.
func (t newTable) quoted() newTable {
	t.Path, t.Covariance, t.Keep = escaped(t.Path), escaped(t.Covariance), escaped(t.Keep)
	t.Header = report.Printable(t.Header)
	t.Columns = slices.Clone(t.Columns)
	for i := range t.Columns {
		t.Columns[i].File = escaped(t.Columns[i].File)
	}
	return t
}

// escaped is a text as it stands between the quotation marks of a basic string (TOML 1.0.0).
func escaped(s string) string {
	var b strings.Builder
	for _, r := range s {
		switch {
		case r == '"' || r == '\\':
			b.WriteRune('\\')
			b.WriteRune(r)
		case unicode.IsControl(r):
			fmt.Fprintf(&b, "\\u%04X", r)
		default:
			b.WriteRune(r)
		}
	}
	return b.String()
}

func (run *newRun) write(dir string, survey []byte, stdout io.Writer) error {
	for i := range run.Tables {
		run.Tables[i] = run.Tables[i].quoted()
	}
	run.Title, run.Shown = escaped(run.Title), shellWord(run.File)
	var text bytes.Buffer
	if err := template.Must(template.New("run").Parse(newTemplate)).Execute(&text, run); err != nil {
		return err
	}
	if err := os.MkdirAll(dir, 0o755); err != nil {
		return err
	}
	if survey != nil {
		if err := os.WriteFile(filepath.Join(dir, "survey.csv"), survey, 0o644); err != nil {
			return err
		}
	}
	if err := os.WriteFile(run.File, text.Bytes(), 0o644); err != nil {
		return err
	}
	var said strings.Builder
	is := "ready"
	if slices.ContainsFunc(run.Tables, func(t newTable) bool { return t.Missing != nil }) {
		is = "written, but not complete"
	}
	fmt.Fprintf(&said, "%s is %s.\n", report.Printable(run.File), is)
	for _, t := range run.Tables {
		for _, m := range t.Missing {
			fmt.Fprintf(&said, "No column of %s was recognised as %s: fill it in first (it has %s).\n", t.Path, m, t.Header)
		}
	}
	fmt.Fprintf(&said, "\n  omen inspect %s    what it reads\n  omen fit %s        constraints and fates\n", run.Shown, run.Shown)
	_, err := io.WriteString(stdout, said.String())
	return err
}
