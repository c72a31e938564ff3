// Omen turns measured distances into constraints on Ωm, ΩΛ and H0 and into the
// probability of each fate of the universe.
//
//	omen new DIR                    begin: a commented run file that works
//	omen fit RUN.toml               constraints and fates from a run file
//	omen resume DIR                 go on with a run that stopped
//	omen status DIR                 how far a run is
//	omen report DIR                 figures, a page to share, text for a draft
//	omen compare DIR DIR...         runs side by side, and how far apart
//	omen inspect RUN.toml           what was read, and what looks odd in it
//	omen fate --Om 0.3 --OL 0.7     what one universe does
//
// Every command explains itself and gives an example with --help.
//
// Exit status: 0 done; 1 it failed while running; 2 a mistake in the command
// line, a run file, a table or the choice of a folder; 3 a run stopped before
// its goal, because it was interrupted or reached its limit of time or steps:
// its result is marked as unfinished, and omen resume goes on.
package main

import (
	"context"
	"errors"
	"fmt"
	"io"
	"os"
	"os/signal"
	"strings"
	"syscall"

	"omen/cmd/omen/internal/digits"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/runfile"
	"omen/data"

	"github.com/spf13/pflag"
)

const help = `omen: from measured distances to constraints on the universe and its fate.

  omen new DIR                    begin: a commented run file that works
  omen fit RUN.toml               constraints and fates from a run file
  omen resume DIR                 go on with a run that stopped
  omen status DIR                 how far a run is
  omen report DIR                 figures, a page to share, text for a draft
  omen compare DIR DIR...         runs side by side, and how far apart
  omen inspect RUN.toml           what was read, and what looks odd in it
  omen fate --Om 0.3 --OL 0.7     what one universe does

Every command explains itself with --help.
`

func main() {
	ctx, stop := signal.NotifyContext(context.Background(), os.Interrupt, syscall.SIGTERM)
	context.AfterFunc(ctx, stop) // the second signal is the system's to deal with
	if len(os.Args) > 1 && (os.Args[1] == "fit" || os.Args[1] == "resume") {
		signal.Ignore(syscall.SIGPIPE) // a reader that goes away does not end a run
	}
	err := run(ctx, os.Args[1:], os.Stdout, os.Stderr)
	if err != nil && err.Error() != "" {
		fmt.Fprintln(os.Stderr, "omen:", err)
	}
	os.Exit(status(err))
}

// run is the whole program but for the process around it.
func run(ctx context.Context, args []string, stdout, stderr io.Writer) error {
	if len(args) == 0 {
		fmt.Fprint(stderr, help)
		return usagef("name a command, for example: omen fit RUN.toml")
	}
	switch rest := args[1:]; args[0] {
	case "fit":
		return runFit(ctx, rest, stdout, stderr)
	case "resume":
		return runResume(ctx, rest, stdout, stderr)
	case "status":
		return runStatus(rest, stdout)
	case "report":
		return runReport(ctx, rest, stdout)
	case "compare":
		return runCompare(ctx, rest, stdout)
	case "fate":
		return runFate(rest, stdout)
	case "inspect":
		return runInspect(rest, stdout)
	case "new":
		return runNew(rest, stdout)
	case "help", "--help", "-h":
		return runHelp(ctx, rest, stdout, stderr)
	case "version", "--version":
		_, err := fmt.Fprintln(stdout, "omen", version())
		return err
	}
	commands := []string{"fit", "resume", "status", "report", "compare", "fate", "inspect", "new", "help", "version"}
	return usagef("unknown command %q; the nearest is %q (known: %s)", args[0], data.Nearest(args[0], commands), strings.Join(commands, ", "))
}

func runHelp(ctx context.Context, args []string, stdout, stderr io.Writer) error {
	if len(args) == 0 || args[0] == "help" {
		_, err := io.WriteString(stdout, help)
		return err
	}
	return run(ctx, []string{args[0], "--help"}, stdout, stderr)
}

// usageError is a mistake in the command line.
type usageError struct{ msg string }

func (e *usageError) Error() string { return e.msg }

func usagef(format string, args ...any) error {
	return &usageError{fmt.Sprintf(format, args...)}
}

// unfinished is the end of a run before its goal. Its result has been written.
type unfinished struct {
	why   string
	steps int
	dir   string
}

func (u *unfinished) Error() string {
	return fmt.Sprintf("unfinished (%s) after %s; omen resume %s goes on", u.why, digits.Count(u.steps, "step"), u.dir)
}

// status is the exit status of an error; see the package comment.
func status(err error) int {
	var usage *usageError
	var table *data.Error
	var file *runfile.Error
	var folder *explore.Refused
	var early *unfinished
	switch {
	case err == nil:
		return 0
	case errors.As(err, &usage), errors.As(err, &table), errors.As(err, &file), errors.As(err, &folder):
		return 2
	case errors.As(err, &early), errors.Is(err, explore.ErrTooEarly):
		return 3
	}
	return 1
}

// newFlags returns an empty flag set that prints help and an example.
func newFlags(name, text string) *pflag.FlagSet {
	f := pflag.NewFlagSet(name, pflag.ContinueOnError)
	f.SortFlags = false
	f.SetOutput(io.Discard)
	f.Usage = func() {}
	f.SetInterspersed(true)
	f.BoolP("help", "h", false, "explain the command")
	f.Lookup("help").Hidden = true
	f.SetAnnotation("help", "text", []string{text})
	return f
}

// parse reads the flags and checks the number of arguments. It reports done
// when it has printed the help instead.
func parse(f *pflag.FlagSet, args []string, stdout io.Writer, want int) (done bool, err error) {
	if err := f.Parse(args); err != nil {
		return false, usagef("%s: %v; see omen %s --help", f.Name(), err, f.Name())
	}
	if asked, _ := f.GetBool("help"); asked {
		_, err := fmt.Fprintf(stdout, "%s\n%s", f.Lookup("help").Annotations["text"][0], usages(f))
		return true, err
	}
	if want >= 0 && f.NArg() != want {
		return false, usagef("%s: expected %s, found %d; see omen %s --help", f.Name(), digits.Count(want, "argument"), f.NArg(), f.Name())
	}
	return false, nil
}

// usages lists the flags. A switch is shown by its name alone, without the values
// that it could be given too.
func usages(f *pflag.FlagSet) string {
	const values = "[=true|false]"
	return strings.ReplaceAll(f.FlagUsagesWrapped(80), values, strings.Repeat(" ", len(values)))
}
