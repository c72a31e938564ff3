package main

import (
	"io"

	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/inspect"

	"github.com/spf13/pflag"
)

const inspectHelp = `omen inspect says what a run file reads, and what looks odd in it.

  omen inspect fate.toml
  omen inspect fate.toml --set data.1.keep='z > 0.05'
`

func inspectFlags(sets *[]string) *pflag.FlagSet {
	f := newFlags("inspect", inspectHelp)
	f.StringArrayVar(sets, "set", nil, "change a key of the run file, as `key=value`; may be repeated")
	return f
}

func runInspect(args []string, stdout io.Writer) error {
	var sets []string
	f := inspectFlags(&sets)
	if done, err := parse(f, args, stdout, 1); done || err != nil {
		return err
	}
	j, err := load(f.Arg(0), sets)
	if err != nil {
		return err
	}
	best, err := explore.Best(j)
	if err != nil {
		return err
	}
	return inspect.Write(stdout, j, best)
}
