//go:build long

package explore

import (
	"io"
	"os"
	"path/filepath"
	"runtime/metrics"
	"testing"
	"time"

	"omen/cmd/omen/internal/job/jobtest"
	"omen/cmd/omen/internal/result"
)

// peak is the most memory that the process takes from the system until stop is
// called, in MB.
func peak() (stop func() float64) {
	quit, most := make(chan bool), make(chan float64)
	go func() {
		samples := []metrics.Sample{{Name: "/memory/classes/total:bytes"}, {Name: "/memory/classes/heap/released:bytes"}}
		high := 0.0
		for {
			metrics.Read(samples)
			high = max(high, float64(samples[0].Value.Uint64()-samples[1].Value.Uint64())/1e6)
			select {
			case <-quit:
				most <- high
				return
			case <-time.After(10 * time.Millisecond):
			}
		}
	}()
	return func() float64 { quit <- true; return <-most }
}

// Ten million steps, recorded every 100th, stay within 200 MB: sampled, judged,
// written, summarised, and read again.
func TestLongRunKeepsItsMemory(t *testing.T) {
	const steps = 10_000_000
	dir := filepath.Join(t.TempDir(), "run")
	if err := os.Mkdir(dir, 0o755); err != nil {
		t.Fatal(err)
	}
	j := jobtest.Committed(t, "fate.toml", "sampling.record-every=100", "sampling.max-steps=10000000", "sampling.effective-samples=100000", "sampling.walkers=8")
	stop := peak()
	s, err := newSession(j, dir, quiet(), io.Discard)
	if err != nil {
		t.Fatal(err)
	}
	cheapen(s)
	if err := s.create(); err != nil {
		t.Fatal(err)
	}
	done, err := s.run(t.Context())
	if err != nil || done.Chain.Steps() != steps {
		t.Fatal(done, err)
	}
	result.Build(*done)
	most := stop()
	t.Logf("%.0f MB at most", most)
	if most > 200 {
		t.Errorf("%.0f MB, expected at most 200", most)
	}

	stop = peak()
	if s, err = newSession(j, dir, quiet(), io.Discard); err != nil {
		t.Fatal(err)
	}
	cheapen(s)
	state, err := readState(dir)
	if err != nil {
		t.Fatal(err)
	}
	if err := s.restore(state, io.Discard); err != nil || s.chain.Steps() != steps {
		t.Fatal(s.chain.Steps(), err)
	}
	s.writer.Close(false)
	if most = stop(); most > 200 {
		t.Errorf("%.0f MB", most)
	}
}

// cheapen gives each ensemble a cheap density of its own, so that they never
// agree.
func cheapen(s *session) {
	for m := range s.dense {
		s.dense[m] = func(x []float64) float64 {
			sum := 0.0
			for i, v := range x {
				u := (v - s.best[i]) / (0.05 * s.best[i])
				sum += (u - float64(m)) * (u - float64(m))
			}
			return -sum / 2
		}
	}
}
