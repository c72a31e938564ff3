package main

import (
	"context"
	"io"

	"omen/cmd/omen/internal/explore"
)

const resumeHelp = `omen resume takes a run on from its last step, as if it had never stopped.

  omen resume fate-1
  omen resume fate-1 --effective-samples 20000
  omen resume fate-1 --max-time 8h --quiet

Without a flag it goes on to the goal and the limits that the run has; those
given here take their place. --max-time counts from now, --max-steps from the
run's first step. A run whose goal is met already writes its result again. A
run is not continued if one of its tables, its run.toml (but for the goals) or
the format of its chain has changed.
`

func runResume(ctx context.Context, args []string, stdout, stderr io.Writer) error {
	var l limits
	f := newFlags("resume", resumeHelp)
	l.add(f)
	if done, err := parse(f, args, stdout, 1); done || err != nil {
		return err
	}
	if err := l.check(); err != nil {
		return err
	}
	dir, err := runFolder(f.Arg(0))
	if err != nil {
		return err
	}
	l.explore.Version, l.explore.Cache = version(), l.cache()
	run, err := explore.Resume(ctx, dir, l.sets(f), l.explore, stderr)
	if err != nil {
		return err
	}
	return conclude(ctx, run, dir, l, stdout, stderr)
}
