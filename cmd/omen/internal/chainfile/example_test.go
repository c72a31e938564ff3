package chainfile_test

import (
	"fmt"
	"os"
	"path/filepath"

	"omen/cmd/omen/internal/chainfile"
)

// A run of two steps is cut short within its third and recovered.
func Example() {
	dir, err := os.MkdirTemp("", "chain")
	if err != nil {
		panic(err)
	}
	defer os.RemoveAll(dir)
	run := chainfile.Run{
		Format: chainfile.Format, Seed: 1, Ensembles: 1, Walkers: 2, Every: 1,
		Parameters: []string{"Om"},
	}
	w, err := chainfile.Create(dir, run, chainfile.Options{Interval: chainfile.DefaultInterval})
	if err != nil {
		panic(err)
	}
	for n := 1; n <= 2; n++ {
		err = w.Append(chainfile.Step{Number: n, X: [][]float64{{0.3, 0.31}}, LogP: [][]float64{{-1.5, -1.25}}})
		if err != nil {
			panic(err)
		}
	}
	if err := w.Close(false); err != nil {
		panic(err)
	}
	f, err := os.OpenFile(filepath.Join(dir, chainfile.ChainName), os.O_APPEND|os.O_WRONLY, 0)
	if err != nil {
		panic(err)
	}
	fmt.Fprint(f, "0,3,0,0.2")
	f.Close()

	state, err := chainfile.ReadState(dir)
	if err != nil {
		panic(err)
	}
	rec, err := chainfile.Recover(dir, state, func(s chainfile.Step) error {
		fmt.Println(s.Number, s.X, s.LogP)
		return nil
	})
	fmt.Println(rec.Notice(), err)
	// Output:
	// 1 [[0.3 0.31]] [[-1.5 -1.25]]
	// 2 [[0.3 0.31]] [[-1.5 -1.25]]
	// chain.csv: used up to step 2; dropped the 9 bytes after it: the run was stopped before step 3 was confirmed in chain.sums <nil>
}
