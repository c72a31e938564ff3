package example

import (
	"bytes"
	"flag"
	"os"
	"path/filepath"
	"testing"

	"omen/data"
)

var update = flag.Bool("update", false, "write the invented survey to testdata/runs")

// The table in testdata/runs is what the generator makes, byte for byte.
func TestTableOnDisk(t *testing.T) {
	name := filepath.Join("..", "..", "..", "..", "testdata", "runs", "own-distances.csv")
	if *update {
		if err := os.WriteFile(name, Table(Seed), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	onDisk, err := os.ReadFile(name)
	if err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(onDisk, Table(Seed)) {
		t.Error("the table differs from the generator's; run the test with -update after a deliberate change")
	}
}

// Residuals from the truth, in units of the errors, are a standard normal sample:
// the survey that says it knows the truth must be fair to it.
func TestTableIsFairToTheTruth(t *testing.T) {
	var sum, squares, n float64
	for seed := range uint64(20) {
		sn, err := data.ReadSupernovae(bytes.NewReader(Table(seed)), "example.csv", data.Options{})
		if err != nil {
			t.Fatal(err)
		}
		for i := range sn.Z {
			r := (sn.Value[i] - AbsoluteMagnitude - Truth.DistanceModulus(sn.Z[i], sn.ZHel[i])) / sn.Err[i]
			sum, squares, n = sum+r, squares+r*r, n+1
		}
	}
	// 3040 residuals: the mean is good to 0.018, the mean square to 0.026.
	if mean := sum / n; mean > 0.09 || mean < -0.09 {
		t.Errorf("mean residual %.3f errors", mean)
	}
	if ms := squares / n; ms > 1.13 || ms < 0.87 {
		t.Errorf("mean square residual %.3f", ms)
	}
}
