package main

import (
	"encoding/json"
	"errors"
	"fmt"
	"io"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"time"
	"unicode/utf8"

	"omen/cmd/omen/internal/chainfile"
	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/progress"
)

const statusHelp = `omen status says how far a run is, while it runs or afterwards.

  omen status fate-1

It shows what was last made safe, at most a few seconds ago. It changes nothing.
`

func runStatus(args []string, stdout io.Writer) error {
	f := newFlags("status", statusHelp)
	if done, err := parse(f, args, stdout, 1); done || err != nil {
		return err
	}
	dir, err := runFolder(f.Arg(0))
	if err != nil {
		return err
	}
	state, err := chainfile.ReadState(dir)
	if errors.Is(err, fs.ErrNotExist) {
		return &explore.Refused{Dir: dir, Why: explore.NoRun}
	}
	if err != nil {
		return err
	}
	text, err := describe(dir, state)
	if err != nil {
		return err
	}
	_, err = io.WriteString(stdout, text)
	return err
}

// runFolder refuses a file in place of the folder of a run.
func runFolder(name string) (string, error) {
	dir := filepath.Clean(name)
	if info, err := os.Stat(dir); err == nil && !info.IsDir() {
		return "", &explore.Refused{Dir: dir, Why: "found a file, expected the folder of a run; name the one that omen fit made"}
	}
	return dir, nil
}

// describe says how far the run in dir is.
func describe(dir string, state chainfile.State) (string, error) {
	var u progress.Update
	if len(state.Progress) > 0 {
		if err := json.Unmarshal(state.Progress, &u); err != nil {
			return "", fmt.Errorf("%s: found a progress that cannot be read (%w)", filepath.Join(dir, chainfile.StateName), err)
		}
	}
	how, running, err := condition(dir, state, u)
	if err != nil {
		return "", err
	}
	if !running {
		u.Left, u.EvaluationsPerSecond = 0, 0
	}
	u.Note = ""
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s\n", dir, how)
	wrap(&b, " ", u.String())
	fmt.Fprintf(&b, "  last made safe: step %d, %s\n", state.Step, synced(dir))
	return b.String(), nil
}

// wrap writes a list behind a beginning, broken after its commas, in lines of at most
// 80 columns.
func wrap(b *strings.Builder, beginning, text string) {
	line := beginning
	for _, item := range strings.SplitAfter(text, ", ") {
		if utf8.RuneCountInString(line+strings.TrimSpace(item)) > 79 && line != beginning {
			fmt.Fprintf(b, "%s\n", strings.TrimRight(line, " "))
			line = "   "
		}
		line += " " + strings.TrimSpace(item)
	}
	fmt.Fprintf(b, "%s\n", line)
}

// condition says whether the run goes on, and what to do if it does not.
func condition(dir string, state chainfile.State, u progress.Update) (how string, running bool, err error) {
	holder, running, err := chainfile.Running(dir)
	_, leftover := os.Lstat(filepath.Join(dir, chainfile.LockName))
	on := "omen resume " + dir + " goes on"
	switch {
	case err != nil:
		return "", false, err
	case running:
		return fmt.Sprintf("running, process %d on %s since %s", holder.PID, holder.Host, clock(holder.Since)), true, nil
	case state.Finished:
		return "finished", false, nil
	case leftover == nil: // nobody was left to remove it
		return "not running, it was killed; " + on, false, nil
	case u.Note != "":
		return fmt.Sprintf("not running, it stopped (%s); %s", u.Note, on), false, nil
	}
	return "not running; " + on, false, nil
}

func clock(t time.Time) string { return t.Local().Format("2006-01-02 15:04:05") }

// synced is when run.json was last replaced. A clock that was set back gives no
// age.
func synced(dir string) string {
	info, err := os.Stat(filepath.Join(dir, chainfile.StateName))
	if err != nil {
		return "at an unknown time"
	}
	at := clock(info.ModTime())
	if age := time.Since(info.ModTime()).Round(time.Second); age >= 0 {
		at += fmt.Sprintf(" (%v ago)", age)
	}
	return at
}
