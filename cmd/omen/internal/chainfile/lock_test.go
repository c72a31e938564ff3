package chainfile

import (
	"bufio"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"strings"
	"sync"
	"sync/atomic"
	"testing"
	"time"
)

// TestMain lets the test binary play the other process: it takes the lock of
// the folder it is given and waits to be killed.
func TestMain(m *testing.M) {
	if dir := os.Getenv("CHAINFILE_TEST_LOCK"); dir != "" {
		l, err := Acquire(dir)
		fmt.Println("locked:", err)
		time.Sleep(time.Hour)
		l.Release()
	}
	os.Exit(m.Run())
}

func TestOneWriter(t *testing.T) {
	dir := t.TempDir()
	if _, running, err := Running(dir); running || err != nil {
		t.Errorf("before: running %v, %v", running, err)
	}
	l, err := Acquire(dir)
	if err != nil {
		t.Fatal(err)
	}
	var busy *Busy
	if _, err := Acquire(dir); !errors.As(err, &busy) || busy.Holder.PID != os.Getpid() {
		t.Errorf("taken: %v", err)
	}
	if h, running, err := Running(dir); !running || err != nil || h.PID != os.Getpid() {
		t.Errorf("while: %+v, running %v, %v", h, running, err)
	}
	if err := l.Release(); err != nil {
		t.Fatal(err)
	}
	if l, err = Acquire(dir); err != nil {
		t.Fatalf("after release: %v", err)
	}
	l.Release()
	if _, err := Acquire(dir + "/nowhere"); err == nil || !strings.Contains(err.Error(), "nowhere: no such folder") {
		t.Errorf("no folder: %v", err)
	}
	if files, _ := os.ReadDir(dir); len(files) != 0 {
		t.Errorf("left behind: %v", files)
	}
}

func TestKilledHolder(t *testing.T) {
	dir := t.TempDir()
	cmd := exec.Command(os.Args[0])
	cmd.Env = append(os.Environ(), "CHAINFILE_TEST_LOCK="+dir)
	out, err := cmd.StdoutPipe()
	if err != nil {
		t.Fatal(err)
	}
	if err := cmd.Start(); err != nil {
		t.Fatal(err)
	}
	if line, err := bufio.NewReader(out).ReadString('\n'); line != "locked: <nil>\n" {
		t.Fatalf("%q, %v", line, err)
	}
	want := fmt.Sprintf("process %d on ", cmd.Process.Pid)
	if _, err := Acquire(dir); err == nil || !strings.Contains(err.Error(), want) {
		t.Errorf("while it lives: %v, want %q", err, want)
	}
	cmd.Process.Kill()
	cmd.Wait()
	if _, running, err := Running(dir); running || err != nil {
		t.Errorf("after its death: running %v, %v", running, err)
	}
	l, err := Acquire(dir)
	if err != nil {
		t.Fatalf("after its death: %v", err)
	}
	l.Release()
}

// Who opened the lock file before it was removed must not lock the remains.
func TestLockOnRemovedFile(t *testing.T) {
	dir := t.TempDir()
	first, err := Acquire(dir)
	if err != nil {
		t.Fatal(err)
	}
	late, err := os.Open(first.f.Name())
	if err != nil {
		t.Fatal(err)
	}
	defer late.Close()
	first.Release()
	second, err := Acquire(dir)
	if err != nil {
		t.Fatal(err)
	}
	defer second.Release()
	if ok, err := take(late); ok || err != nil {
		t.Errorf("a removed lock file could be locked: %v, %v", ok, err)
	}
}

// Of many who want the lock at once and give it back, no two have it at the
// same time, though every release removes the file.
func TestLockExcludes(t *testing.T) {
	dir := t.TempDir()
	var inside, had atomic.Int32
	var all sync.WaitGroup
	for range 8 {
		all.Go(func() {
			for range 20 {
				l, err := tryAcquire(dir + "/" + LockName)
				if err != nil {
					t.Error(err)
				}
				if l == nil {
					continue
				}
				if n := inside.Add(1); n != 1 {
					t.Errorf("%d hold the lock", n)
				}
				had.Add(1)
				inside.Add(-1)
				l.Release()
			}
		})
	}
	all.Wait()
	if had.Load() == 0 {
		t.Error("nobody got the lock")
	}
}
