package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"

	"omen/cmd/omen/internal/cache"
	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/draft"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/figure"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/page"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
	"omen/data"

	"github.com/spf13/pflag"
)

const reportHelp = `omen report draws the figures of a run and writes what a draft takes from it.

  omen report fate-1
  omen report fate-1 --only hubble,plane --format pdf,png
  omen report fate-1 --only draft
  omen report fate-1 --only plane --width page

omen fit and omen resume do this when they end. A run that has not reached its
goal, or is still under way, can be reported too; every figure then says so.

In the folder of the run:
  report.html       the whole result as one page to share: no network, no script
  figures/          hubble, plane, marginals, history, fates, convergence
  constraints.tex   a table for \input, with booktabs' rules; fates.tex and
                    nested.tex likewise
  numbers.tex       one macro for every number
  methods.md        two paragraphs on data, priors, likelihood, chain, to adapt
  constraints.csv   the constraints for a program

--only takes names of figures, and page or draft for the texts. A column is 86
mm wide, a page 178 mm; figures that a column cannot hold are a page wide by
themselves.
`

// reportOptions say what of a report to write.
type reportOptions struct {
	only, formats []string
	width         string
}

// The parts of a report that are no figures.
const (
	partPage  = "page"
	partDraft = "draft"
)

func defaultReport() reportOptions { return reportOptions{formats: []string{"pdf", "svg"}} }

func reportFlags(o *reportOptions) *pflag.FlagSet {
	f := newFlags("report", reportHelp)
	f.StringSliceVar(&o.only, "only", nil, "`parts` to write: "+strings.Join(append(gather.Names(), partPage, partDraft), ", "))
	f.StringSliceVar(&o.formats, "format", o.formats, "`formats` of the figures: "+strings.Join(figure.Formats(), ", "))
	f.StringVar(&o.width, "width", "", "`width` of the figures: column or page; as each needs unless given")
	return f
}

func runReport(ctx context.Context, args []string, stdout io.Writer) error {
	o := defaultReport()
	f := reportFlags(&o)
	if done, err := parse(f, args, stdout, 1); done || err != nil {
		return err
	}
	if err := o.check(); err != nil {
		return err
	}
	dir, err := runFolder(f.Arg(0))
	if err != nil {
		return err
	}
	r, err := gather.Open(ctx, dir, explore.Options{Version: version(), Cache: cache.Default()})
	if err != nil {
		return err
	}
	if r.Unfinished() {
		fmt.Fprintln(stdout, "Unfinished: every figure says so.")
	}
	text, err := writeReport(r, o)
	if err != nil {
		return err
	}
	_, err = io.WriteString(stdout, text)
	return err
}

// check refuses words that mean nothing, each with the nearest that does.
func (o reportOptions) check() error {
	for _, c := range []struct {
		flag         string
		given, known []string
	}{
		{"--only", o.only, append(gather.Names(), partPage, partDraft)},
		{"--format", o.formats, figure.Formats()},
		{"--width", nonempty(o.width), []string{"column", "page"}},
	} {
		for _, v := range c.given {
			if !slices.Contains(c.known, v) {
				return usagef("report: %s: found %q, expected %s; the nearest is %q", c.flag, v, strings.Join(c.known, ", "), data.Nearest(v, c.known))
			}
		}
	}
	if len(o.formats) == 0 {
		return usagef("report: --format: found nothing, expected one or more of %s", strings.Join(figure.Formats(), ", "))
	}
	return nil
}

func nonempty(s string) []string {
	if s == "" {
		return nil
	}
	return []string{s}
}

// wants reports whether a part is asked for.
func (o reportOptions) wants(part string) bool {
	return len(o.only) == 0 || slices.Contains(o.only, part)
}

// figures are the names of those to make; the page shows all of them.
func (o reportOptions) figures() []string {
	if o.wants(partPage) {
		return nil
	}
	return o.only
}

// writeReport writes the report of a run to its folder, and returns what to tell
// about it.
func writeReport(r *gather.Run, o reportOptions) (string, error) {
	pictures, err := r.Pictures(o.figures())
	if err != nil {
		return "", err
	}
	files, err := render(r, pictures, o)
	if err != nil {
		return "", err
	}
	if err := save(r.Dir, files); err != nil {
		return "", err
	}
	var b strings.Builder
	b.WriteString(told(r.Dir, files))
	for _, p := range pictures {
		if p.Why != "" && o.wants(p.Name) {
			report.Wrap(&b, "  ", "no figure "+p.Name+": "+p.Why)
		}
	}
	return b.String(), nil
}

// concludeReport writes the report of a run that has just ended, and returns what is to
// be said of it.
func concludeReport(run *result.Run, s *result.Summary, dir string, none bool) (string, error) {
	if none {
		return "", nil
	}
	r, err := gather.Of(run, s, dir)
	if err != nil {
		return "", err
	}
	text, err := writeReport(r, defaultReport())
	if err != nil {
		return "", fmt.Errorf("%w; the result is safe, omen report %s writes the rest again", err, dir)
	}
	return text, nil
}

// file is a file of a report, by its path in the folder of the run.
type file struct {
	path    string
	content []byte
}

// told lists the files in a folder, a line for each folder in it.
func told(dir string, files []file) string {
	var texts, figures, formats []string
	for _, f := range files {
		if filepath.Dir(f.path) == "." {
			texts = append(texts, f.path)
			continue
		}
		ext := filepath.Ext(f.path)
		if name := strings.TrimSuffix(filepath.Base(f.path), ext); !slices.Contains(figures, name) {
			figures = append(figures, name)
		}
		if !slices.Contains(formats, ext[1:]) {
			formats = append(formats, ext[1:])
		}
	}
	var b strings.Builder
	if len(texts) > 0 {
		wrap(&b, "In "+dir+":", strings.Join(texts, ", "))
	}
	if len(figures) > 0 {
		wrap(&b, "In "+filepath.Join(dir, "figures")+":", strings.Join(figures, ", ")+" ("+strings.Join(formats, ", ")+")")
	}
	return b.String()
}

// render makes all files in memory, several at a time.
func render(r *gather.Run, pictures []*gather.Picture, o reportOptions) ([]file, error) {
	var files []file
	var makers []func() ([]byte, error)
	add := func(path string, make func() ([]byte, error)) {
		files, makers = append(files, file{path: path}), append(makers, make)
	}
	if o.wants(partPage) {
		add("report.html", func() ([]byte, error) {
			var b bytes.Buffer
			err := page.Report(&b, r, pictures)
			return b.Bytes(), err
		})
	}
	for _, p := range pictures {
		if p.Why == "" && o.wants(p.Name) {
			for _, format := range o.formats {
				add(filepath.Join("figures", p.Name+"."+format), func() ([]byte, error) { return o.draw(p, format) })
			}
		}
	}
	if o.wants(partDraft) {
		add("constraints.tex", func() ([]byte, error) { return draft.Constraints(r), nil })
		add("fates.tex", func() ([]byte, error) { return draft.Fates(r), nil })
		if text := draft.Nested(r); text != nil {
			add("nested.tex", func() ([]byte, error) { return text, nil })
		}
		add("numbers.tex", func() ([]byte, error) { return draft.Numbers(r), nil })
		add("methods.md", func() ([]byte, error) { return draft.Methods(r), nil })
		add("constraints.csv", func() ([]byte, error) { return draft.CSV(r) })
	}
	errs := make([]error, len(files))
	var wait sync.WaitGroup
	for i := range files {
		wait.Go(func() { files[i].content, errs[i] = makers[i]() })
	}
	wait.Wait()
	return files, errors.Join(errs...)
}

// draw makes one figure in one format.
func (o reportOptions) draw(p *gather.Picture, format string) ([]byte, error) {
	width := figure.Column
	if o.width == "page" || o.width == "" && p.Wide {
		width = figure.Page
	}
	f, err := p.Draw(width)
	if err != nil {
		return nil, fmt.Errorf("figure %s: %w", p.Name, err)
	}
	var b bytes.Buffer
	err = f.Write(&b, format)
	return b.Bytes(), err
}

// save writes files into a folder, each whole or not at all.
func save(dir string, files []file) error {
	for _, f := range files {
		path := filepath.Join(dir, f.path)
		err := os.MkdirAll(filepath.Dir(path), 0o755)
		if err == nil {
			err = chainfile.Replace(path, f.content)
		}
		if err != nil {
			return fmt.Errorf("cannot write %s: %w", path, underlying(err))
		}
	}
	return nil
}

func underlying(err error) error {
	var path *os.PathError
	if errors.As(err, &path) {
		return path.Err
	}
	return err
}
