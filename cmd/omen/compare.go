package main

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"

	"omen/cmd/omen/internal/cache"
	"omen/cmd/omen/internal/compare"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/gather"
	"omen/cmd/omen/internal/page"

	"github.com/spf13/pflag"
)

const compareHelp = `omen compare sets runs side by side: constraints, and how far they are apart.

  omen compare flat curved
  omen compare all without-lya no-lowz -o cuts

The shift between two runs is the difference of their means in units of the
scatter it should have: √(σ1² + σ2²) for runs that share no input, by the
SHA-256 of the files; √|σ1² − σ2²| where one run has all the data of the other
and no wider a family of universes (Gratton & Challinor 2020). Other runs that
share data move together, and the shift is at least that of independent ones.
It says which was taken.

With -o, a new folder holds comparison.html, the figures plane and whiskers
(pdf, svg), comparison.tex, comparison.csv and shifts.csv.
`

func compareFlags(dir *string) *pflag.FlagSet {
	f := newFlags("compare", compareHelp)
	f.StringVarP(dir, "output", "o", "", "`folder` for the comparison; it must not exist")
	return f
}

func runCompare(ctx context.Context, args []string, stdout io.Writer) error {
	var dir string
	f := compareFlags(&dir)
	if done, err := parse(f, args, stdout, -1); done || err != nil {
		return err
	}
	if f.NArg() < 2 {
		return usagef("compare: expected two or more folders of runs, found %d; see omen compare --help", f.NArg())
	}
	if f.Changed("output") && dir == "" {
		return usagef("compare: -o names no folder; give it one, or leave it out")
	}
	if dir != "" && !vacant(dir) {
		return &explore.Refused{Dir: dir, Why: "the folder exists and is not empty; choose another with -o"}
	}
	var runs []*gather.Run
	for _, name := range f.Args() {
		dir, err := runFolder(name)
		if err != nil {
			return err
		}
		r, err := gather.Open(ctx, dir, explore.Options{Version: version(), Cache: cache.Default()})
		if err != nil {
			return err
		}
		runs = append(runs, r)
	}
	c := compare.New(runs)
	if err := c.Text(stdout); err != nil || dir == "" {
		return err
	}
	files, err := comparison(c)
	if err != nil {
		return err
	}
	if err := saveWhole(dir, files); err != nil {
		return err
	}
	_, err = io.WriteString(stdout, "\n"+told(dir, files))
	return err
}

// vacant reports whether a folder is not there or empty.
func vacant(dir string) bool {
	list, err := os.ReadDir(dir)
	return os.IsNotExist(err) || err == nil && len(list) == 0
}

// comparison makes all files of a comparison in memory.
func comparison(c *compare.Comparison) ([]file, error) {
	pictures := c.Pictures()
	var html bytes.Buffer
	if err := page.Comparison(&html, c, pictures, version()); err != nil {
		return nil, err
	}
	values, err := c.CSV()
	if err != nil {
		return nil, err
	}
	shifts, err := c.ShiftsCSV()
	if err != nil {
		return nil, err
	}
	files := []file{{"comparison.html", html.Bytes()}, {"comparison.tex", c.TeX()}, {"comparison.csv", values}, {"shifts.csv", shifts}}
	o := defaultReport()
	for _, p := range pictures {
		if p.Why != "" {
			continue
		}
		for _, format := range o.formats {
			text, err := o.draw(p, format)
			if err != nil {
				return nil, err
			}
			files = append(files, file{filepath.Join("figures", p.Name+"."+format), text})
		}
	}
	return files, nil
}

// saveWhole writes files into a new folder that appears when it is complete.
func saveWhole(dir string, files []file) error {
	dir = filepath.Clean(dir)
	if err := os.MkdirAll(filepath.Dir(dir), 0o755); err != nil {
		return fmt.Errorf("cannot make %s: %w", dir, underlying(err))
	}
	work, err := os.MkdirTemp(filepath.Dir(dir), ".omen-compare-*")
	if err != nil {
		return fmt.Errorf("cannot make %s: %w", dir, underlying(err))
	}
	defer os.RemoveAll(work)
	if err := save(work, files); err != nil {
		return err
	}
	if err := os.Chmod(work, 0o755); err != nil {
		return err
	}
	os.Remove(dir) // an empty one
	if err := os.Rename(work, dir); err != nil {
		return fmt.Errorf("cannot make %s: %w", dir, err)
	}
	return nil
}
