package main

import (
	"bytes"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"sync"
	"testing"
)

// build builds the program, once and without the race detector,
// which would make whole runs ten times as long.
var build = sync.OnceValues(func() (string, error) {
	path := filepath.Join(buildDir, "omen.exe") // Windows wants it so, others do not mind
	out, err := exec.Command("go", "build", "-o", path, ".").CombinedOutput()
	if err != nil {
		return "", fmt.Errorf("%w\n%s", err, out)
	}
	return path, nil
})

var buildDir string // set and removed by TestMain

func TestMain(m *testing.M) {
	dir, err := os.MkdirTemp("", "omen")
	if err != nil {
		fmt.Fprintln(os.Stderr, err)
		os.Exit(1)
	}
	buildDir = dir
	status := m.Run()
	os.RemoveAll(dir)
	os.Exit(status)
}

// omen is a command line of the program, as a process of its own.
func omen(t *testing.T, args ...string) *exec.Cmd {
	t.Helper()
	path, err := build()
	if err != nil {
		t.Fatal(err)
	}
	return exec.Command(path, args...)
}

// must runs omen to its end and wants an exit status and some words on stderr.
func must(t *testing.T, status int, words string, args ...string) (stdout, stderr string) {
	t.Helper()
	cmd := omen(t, args...)
	var out, errs bytes.Buffer
	cmd.Stdout, cmd.Stderr = &out, &errs
	cmd.Run()
	check(t, cmd, status, words, errs.String())
	return out.String(), errs.String()
}

// check looks at how a process ended.
func check(t *testing.T, cmd *exec.Cmd, status int, words, stderr string) {
	t.Helper()
	line := strings.Join(cmd.Args[1:], " ")
	if got := cmd.ProcessState.ExitCode(); got != status {
		t.Fatalf("omen %s: exit status %d, want %d\n%s", line, got, status, stderr)
	}
	has(t, "omen "+line, stderr, words)
	if strings.Contains(stderr, "panic") {
		t.Errorf("omen %s:\n%s", line, stderr)
	}
}

// has wants words in a text.
func has(t *testing.T, what, text string, words ...string) {
	t.Helper()
	for _, w := range words {
		if !strings.Contains(text, w) {
			t.Errorf("%s: no %q in\n%s", what, w, text)
		}
	}
}

// runFile is the path of a run file of the repository.
func runFile(name string) string { return filepath.Join("..", "..", "testdata", "runs", name) }

func read(t *testing.T, path ...string) []byte {
	t.Helper()
	b, err := os.ReadFile(filepath.Join(path...))
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func write(t *testing.T, content []byte, path ...string) {
	t.Helper()
	if err := os.WriteFile(filepath.Join(path...), content, 0o644); err != nil {
		t.Fatal(err)
	}
}
