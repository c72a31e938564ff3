package main

import (
	"bytes"
	"context"
	"path/filepath"
	"testing"

	"omen/cmd/omen/internal/explore"
	"omen/cmd/omen/internal/gather"
)

// The whole report of a run with 4000 effective samples, read from its folder.
func BenchmarkReport(b *testing.B) {
	dir := filepath.Join(b.TempDir(), "fate")
	var out bytes.Buffer
	if err := run(context.Background(), []string{"fit", "--quiet", "--no-report", "-o", dir, runsFile("fate.toml")}, &out, &out); err != nil {
		b.Fatal(err)
	}
	b.Run("open", func(b *testing.B) {
		for b.Loop() {
			if _, err := gather.Open(context.Background(), dir, explore.Options{Version: version()}); err != nil {
				b.Fatal(err)
			}
		}
	})
	r, err := gather.Open(context.Background(), dir, explore.Options{Version: version()})
	if err != nil {
		b.Fatal(err)
	}
	for _, name := range gather.Names() {
		b.Run(name, func(b *testing.B) {
			for b.Loop() {
				if _, err := writeReport(r, reportOptions{only: []string{name}, formats: []string{"pdf", "svg"}}); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
	b.Run("all", func(b *testing.B) {
		for b.Loop() {
			if _, err := writeReport(r, defaultReport()); err != nil {
				b.Fatal(err)
			}
		}
	})
}
