package main

import (
	"os"
	"path/filepath"
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
	disk := mount(t, "48m") // a run takes some 20
	ballast := filepath.Join(disk, "ballast")
	write(t, make([]byte, 42<<20), ballast)
	dir := filepath.Join(disk, "run")
	_, stderr := must(t, 1, "no space left on device; the chain is safe up to step ", fitting(dir, quick...)...)
	has(t, "a full disk", stderr, "free some space, then resume")
	_, stderr = must(t, 1, "no space left on device", "resume", dir, "--quiet") // no room yet
	has(t, "a full disk", stderr, "free some space, then resume")
	if err := os.Remove(ballast); err != nil {
		t.Fatal(err)
	}
	text, _ := must(t, 0, "", "resume", dir, "--quiet", "--no-report")
	want, wantText := undisturbed(t)
	sameRun(t, want, dir, wantText, text)
}

func TestFullDiskAtStart(t *testing.T) {
	disk := mount(t, "64k")
	write(t, make([]byte, 64<<10), disk, "ballast")
	must(t, 1, "no space left on device", fitting(filepath.Join(disk, "run"), quick...)...)
	if names, _ := os.ReadDir(disk); len(names) != 1 {
		t.Errorf("something is left: %v", names)
	}
}

func TestReadOnlyDisk(t *testing.T) {
	disk := mount(t, "48m")
	dir := filepath.Join(disk, "run")
	must(t, 3, "step limit", fitting(dir, append(quick, "--max-steps", "100")...)...)
	if err := unix.Mount("", disk, "", unix.MS_REMOUNT|unix.MS_RDONLY, ""); err != nil {
		t.Skipf("needs the right to mount read-only: %v", err)
	}
	must(t, 1, "run.lock: read-only file system; make the folder writable or choose another", "resume", dir)
	must(t, 1, "cannot make the folder: read-only file system; choose another with -o", fitting(filepath.Join(disk, "another"))...)
	must(t, 0, "", "status", dir)
	if err := unix.Mount("", disk, "", unix.MS_REMOUNT, ""); err != nil {
		t.Fatal(err)
	}
	text, _ := must(t, 0, "", "resume", dir, "--max-steps", "1000000", "--no-report")
	want, wantText := undisturbed(t)
	sameRun(t, want, dir, wantText, text)
}
