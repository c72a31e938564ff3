package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"syscall"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/outlook"
	"omen/cmd/omen/internal/progress"
	"omen/cmd/omen/internal/report"
	"omen/cmd/omen/internal/result"
	"omen/cmd/omen/internal/runfile"

	"github.com/spf13/pflag"
)

const fitHelp = `omen fit explores the posterior of a run file and reports constraints and
fates.

  omen fit fate.toml
  omen fit fate.toml -o curved --seed 7
  omen fit fate.toml --set universe.geometry=flat --set prior.OL=none
  omen fit fate.toml --effective-samples 20000 --max-time 8h --quiet

The result goes to standard output, the chain and everything else to a folder:
-o, or the run file's name with a number. --set changes a key of the run file;
data.1 is the first [[data]] table, and the value none removes a key.

The run ends when the goal is met and the chain is 400 autocorrelation times
long, without which its errors cannot be trusted. Interrupt it (Ctrl-C) and it
finishes the step under way, writes the result so far, marked as unfinished, and
ends with status 3; so it does at --max-time or --max-steps. Interrupt it twice
and it ends at once. Whatever ends it, omen resume DIR goes on; omen status DIR
looks at it meanwhile.
`

type fitOptions struct {
	limits
	dir  string
	seed uint64
	list []string
}

func fitFlags(o *fitOptions) *pflag.FlagSet {
	f := newFlags("fit", fitHelp)
	f.StringVarP(&o.dir, "output", "o", "", "`folder` for the result; it must not exist")
	f.Uint64Var(&o.seed, "seed", 0, "`seed` of the random numbers, in place of the run file's")
	f.StringArrayVar(&o.list, "set", nil, "change a key of the run file, as `key=value`; may be repeated")
	o.add(f)
	return f
}

func runFit(ctx context.Context, args []string, stdout, stderr io.Writer) error {
	var o fitOptions
	f := fitFlags(&o)
	if done, err := parse(f, args, stdout, 1); done || err != nil {
		return err
	}
	if err := o.check(); err != nil {
		return err
	}
	if f.Changed("output") && o.dir == "" {
		return usagef("fit: -o names no folder; give it one, or leave it out")
	}
	sets := append(o.list, o.sets(f)...)
	if f.Changed("seed") {
		sets = append(sets, "sampling.seed="+strconv.FormatUint(o.seed, 10))
	}
	o.explore.Cache = o.cache()
	run, err := parseRun(f.Arg(0), sets)
	if err != nil {
		return err
	}
	end := o.tasks(stderr).Begin("reading and factorising the tables")
	j, err := job.LoadToFit(run, o.explore.Cache)
	end()
	if err != nil {
		return err
	}
	dir := filepath.Clean(o.dir)
	if o.dir == "" {
		dir = freeFolder(f.Arg(0))
	}
	o.explore.Version = version()
	done, err := begin(ctx, j, dir, o.explore, stderr)
	if err != nil {
		return err
	}
	return conclude(ctx, done, dir, o.limits, stdout, stderr)
}

// begin explores the posterior by a chain, unless the run asks for quadrature alone.
func begin(ctx context.Context, j *job.Job, dir string, o explore.Options, stderr io.Writer) (*result.Run, error) {
	if j.Run.Sampling.Engine != "quadrature" {
		return explore.Start(ctx, j, dir, o, stderr)
	}
	if err := explore.Prepare(j, dir); err != nil {
		return nil, err
	}
	return &result.Run{Job: j, Threads: o.Threads, Version: o.Version}, nil
}

// load reads a run file and everything that it names.
func load(file string, sets []string) (*job.Job, error) {
	run, err := parseRun(file, sets)
	if err != nil {
		return nil, err
	}
	return job.Load(run)
}

// parseRun reads a run file and nothing that it names.
func parseRun(file string, sets []string) (*runfile.Run, error) {
	text, err := os.ReadFile(file)
	if errors.Is(err, syscall.EISDIR) {
		return nil, folderFor(file)
	}
	if err != nil {
		return nil, usagef("cannot read %s: %v; omen new makes a run file", file, err.(*os.PathError).Err)
	}
	return runfile.Parse(file, text, sets)
}

// folderFor says what to do with a folder in place of a run file.
func folderFor(dir string) error {
	kept := filepath.Join(dir, explore.RunFileName)
	if _, err := os.Stat(kept); err == nil {
		return usagef("%s is the folder of a run; omen resume %s goes on with it, omen fit %s fits the same anew", dir, dir, kept)
	}
	if files, err := filepath.Glob(filepath.Join(dir, "*.toml")); err == nil && len(files) > 0 {
		return usagef("%s is a folder; name the run file in it, such as %s", dir, files[0])
	}
	return usagef("%s is a folder without a run file; omen new makes one", dir)
}

// freeFolder is the run file's name with the first number that is not taken.
func freeFolder(file string) string {
	base := strings.TrimSuffix(filepath.Base(file), filepath.Ext(file))
	for i := 1; ; i++ {
		dir := base + "-" + strconv.Itoa(i)
		if _, err := os.Lstat(dir); errors.Is(err, os.ErrNotExist) {
			return dir
		}
	}
}

// conclude writes the result of a run to its folder and to stdout.
func conclude(ctx context.Context, run *result.Run, dir string, l limits, stdout, stderr io.Writer) error {
	tasks := l.tasks(stderr)
	if err := run.Investigate(ctx, tasks.Begin); err != nil {
		return err
	}
	if run.Chain == nil && run.Exact == nil {
		return explore.ErrTooEarly
	}
	s, trace := summarise(run, tasks)
	if err := keepResult(dir, s, trace); err != nil {
		return err
	}
	if err := report.Text(stdout, s); err != nil {
		return err
	}
	chain := "chain.csv, "
	if run.Chain == nil {
		chain = ""
	}
	fmt.Fprintf(stdout, "\nIn %s: %ssummary.json, history.csv, run.toml\n", dir, chain)
	end := tasks.Begin("drawing figures and writing the report")
	said, err := concludeReport(run, s, dir, l.noReport)
	end() // before anything else comes to the terminal
	if err != nil {
		return err
	}
	if _, err := io.WriteString(stdout, said); err != nil {
		return err
	}
	if why := run.Ended(); why != "" {
		return &unfinished{why, run.Chain.Steps(), dir}
	}
	return nil
}

// summarise makes the summary of a run and follows its history, side by side.
func summarise(run *result.Run, tasks *progress.Tasks) (*result.Summary, *outlook.Trace) {
	defer tasks.Begin("summarising")()
	trace := make(chan *outlook.Trace, 1)
	go func() { trace <- run.Trace() }()
	return result.Build(*run), <-trace
}

// keepResult writes a summary and a history to the folder of a run.
func keepResult(dir string, s *result.Summary, trace *outlook.Trace) error {
	var text bytes.Buffer
	if err := report.JSON(&text, s); err != nil {
		return err
	}
	if err := chainfile.Replace(filepath.Join(dir, "summary.json"), text.Bytes()); err != nil {
		return fmt.Errorf("%w; the chain is safe, omen resume %s writes the result again", err, dir)
	}
	if trace == nil {
		return nil
	}
	return chainfile.Replace(filepath.Join(dir, "history.csv"), report.History(trace))
}
