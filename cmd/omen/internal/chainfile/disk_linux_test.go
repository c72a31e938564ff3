package chainfile

import (
	"errors"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"golang.org/x/sys/unix"
)

// mount gives a small file system of its own, which takes root.
func mount(t *testing.T, size string) string {
	t.Helper()
	dir := t.TempDir()
	if err := unix.Mount("tmpfs", dir, "tmpfs", 0, "size="+size); err != nil {
		t.Skipf("needs the right to mount a tmpfs: %v", err)
	}
	t.Cleanup(func() {
		if err := unix.Unmount(dir, unix.MNT_DETACH); err != nil {
			t.Error(err)
		}
	})
	return dir
}

func TestFullDisk(t *testing.T) {
	const last = 400
	dir := mount(t, "64k")
	ballast := filepath.Join(dir, "ballast")
	put(t, dir, "ballast", make([]byte, 20<<10))
	w, err := Create(dir, testRun(), Options{})
	if err != nil {
		t.Fatal(err)
	}
	i := 0
	for err == nil {
		if i++; i > last {
			t.Fatal("the disk never filled")
		}
		err = w.Append(testStep(testRun(), i))
	}
	if !errors.Is(err, syscall.ENOSPC) || !strings.Contains(err.Error(), "no space left on device; the chain is safe up to step") || !strings.Contains(err.Error(), "free some space") {
		t.Errorf("message: %v", err)
	}
	if err := w.Close(false); !errors.Is(err, syscall.ENOSPC) {
		t.Errorf("closing: %v", err)
	}
	safe := state(t, dir).Step / 5
	if safe < 10 || safe >= i {
		t.Fatalf("%d steps safe of %d", safe, i)
	}
	if err := os.Remove(ballast); err != nil {
		t.Fatal(err)
	}
	if rec := resumeTo(t, dir, i+5); rec.Steps < safe || rec.Lost != 0 {
		t.Errorf("%+v, although %d steps were safe", rec, safe)
	}
	if rec, err := recoverSame(t, dir); err != nil || rec.Steps != i+5 {
		t.Errorf("%+v, %v", rec, err)
	}
}

func TestFullDiskAtStart(t *testing.T) {
	dir := mount(t, "16k")
	put(t, dir, "ballast", make([]byte, 16<<10))
	if _, err := Create(dir, testRun(), Options{}); !errors.Is(err, syscall.ENOSPC) {
		t.Errorf("%v", err)
	}
}

func TestReadOnlyFileSystem(t *testing.T) {
	dir := mount(t, "256k")
	run := filepath.Join(dir, "run")
	if err := os.CopyFS(run, os.DirFS(write(t, testRun(), 2))); err != nil {
		t.Fatal(err)
	}
	if err := unix.Mount("", dir, "", unix.MS_REMOUNT|unix.MS_RDONLY, ""); err != nil {
		t.Skipf("needs the right to mount read-only: %v", err)
	}
	testReadOnly(t, dir, run, syscall.EROFS)
}

func TestReadOnlyFolder(t *testing.T) {
	if os.Geteuid() == 0 {
		t.Skip("root may write anywhere; see TestReadOnlyFileSystem")
	}
	dir := write(t, testRun(), 2)
	for _, name := range []string{ChainName, SumsName, StateName} {
		if err := os.Chmod(filepath.Join(dir, name), 0o444); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.Chmod(dir, 0o555); err != nil {
		t.Fatal(err)
	}
	t.Cleanup(func() { os.Chmod(dir, 0o755) })
	testReadOnly(t, dir, dir, fs.ErrPermission)
}

// testReadOnly wants refusals to write to empty and run, and run readable.
func testReadOnly(t *testing.T, empty, run string, want error) {
	t.Helper()
	rec, err := recoverSame(t, run)
	if err != nil || rec.Steps != 2 {
		t.Errorf("reading: %+v, %v", rec, err)
	}
	if _, running, err := Running(run); running || err != nil {
		t.Errorf("running: %v, %v", running, err)
	}
	s := state(t, run)
	_, errCreate := Create(empty, testRun(), Options{})
	_, errResume := Resume(run, s, rec, Options{})
	_, errLock := Acquire(run)
	for _, err := range []error{errLock, errCreate, errResume} {
		if !errors.Is(err, want) && !errors.Is(err, fs.ErrExist) || !strings.Contains(err.Error(), "folder") {
			t.Errorf("%v, want %v", err, want)
		}
	}
}
