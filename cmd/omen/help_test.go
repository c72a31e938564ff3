package main

import (
	"bytes"
	"context"
	"io"
	"strings"
	"syscall"
	"testing"
)

// words splits a line as a shell does, quotes and all that the examples need.
func words(line string) []string {
	var out []string
	for i, part := range strings.Split(line, "'") {
		if i%2 == 1 { // inside quotes: goes on with the word before
			out[len(out)-1] += part
			continue
		}
		if fields := strings.Fields(part); i > 0 && part != "" && part[0] != ' ' {
			out[len(out)-1] += fields[0]
			out = append(out, fields[1:]...)
		} else {
			out = append(out, fields...)
		}
	}
	return out
}

// examples are the command lines in a text.
func examples(text string) []string {
	var out []string
	for line := range strings.Lines(text) {
		if line, ok := strings.CutPrefix(line, "  omen "); ok {
			out = append(out, strings.TrimSpace(line))
		}
	}
	return out
}

func helpOf(t *testing.T, args ...string) string {
	t.Helper()
	var stdout, stderr bytes.Buffer
	if err := run(context.Background(), args, &stdout, &stderr); err != nil {
		t.Errorf("omen %s: %v", strings.Join(args, " "), err)
	}
	return stdout.String()
}

// Every command has help with examples, and every example is one.
func TestHelp(t *testing.T) {
	for _, line := range examples(helpOf(t, "help")) {
		name := strings.Fields(line)[0]
		text := helpOf(t, "help", name)
		if text != helpOf(t, name, "--help") {
			t.Errorf("omen help %s and omen %s --help differ", name, name)
		}
		found := 0
		for _, example := range examples(text) {
			if words := words(example); words[0] == name {
				found++
				helpOf(t, append(words, "--help")...)
			}
		}
		if found == 0 {
			t.Errorf("omen %s --help gives no example:\n%s", name, text)
		}
		for line := range strings.Lines(text) {
			if n := len([]rune(line)) - 1; n > 80 {
				t.Errorf("omen %s --help: a line of %d columns: %s", name, n, line)
			}
		}
	}
}

// The package comment is the manual: it lists what help lists.
func TestManualListsTheCommands(t *testing.T) {
	source := string(read(t, "main.go"))
	manual, _, _ := strings.Cut(source, "\npackage main")
	list := examples(strings.ReplaceAll(manual, "//\t", "  "))
	if got, want := strings.Join(list, "\n"), strings.Join(examples(help), "\n"); got != want {
		t.Errorf("the package comment lists\n%s\nand help\n%s", got, want)
	}
	if len(list) < 6 {
		t.Errorf("%d commands", len(list))
	}
}

// full is a device without space.
type full struct{}

func (full) Write([]byte) (int, error) { return 0, syscall.ENOSPC }

// A text that could not be written is a failure, the help and the version too.
func TestHelpIntoAFullDevice(t *testing.T) {
	for _, line := range []string{"help", "--help", "version", "fit --help", "help compare", "fate --Om 0.3"} {
		if err := run(t.Context(), strings.Fields(line), full{}, io.Discard); status(err) != 1 {
			t.Errorf("omen %s: status %d (%v), expected 1", line, status(err), err)
		}
	}
}
