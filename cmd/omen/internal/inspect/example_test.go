package inspect_test

import (
	"fmt"
	"os"
	"path/filepath"

	"omen/cmd/omen/internal/inspect"
	"omen/cmd/omen/internal/job"
	"omen/cmd/omen/internal/runfile"
)

// Four invented supernovae, one of them named twice, against the universe of Om = 0.3.
func ExampleWrite() {
	dir, err := os.MkdirTemp("", "")
	if err != nil {
		fmt.Println(err)
		return
	}
	defer os.RemoveAll(dir)
	const table = "name,z,mag,mag_err\nNorth-1,0.1,19.01,0.1\nNorth-2,0.3,21.60,0.1\nNorth-2,0.5,22.95,0.1\nNorth-4,0.9,24.55,0.1\n"
	if err := os.WriteFile(filepath.Join(dir, "mine.csv"), []byte(table), 0o600); err != nil {
		fmt.Println(err)
		return
	}
	run, err := runfile.Parse(filepath.Join(dir, "mine.toml"), []byte(`
[universe]
geometry = "flat"
[prior]
Om = { flat = [0, 1] }
[[data]]
kind  = "supernovae"
table = "mine.csv"
`), nil)
	if err != nil {
		fmt.Println(err)
		return
	}
	j, err := job.Load(run)
	if err != nil {
		fmt.Println(err)
		return
	}
	if err := inspect.Write(os.Stdout, j, []float64{0.3}); err != nil {
		fmt.Println(err)
	}
	// Output:
	// mine.csv (supernovae)
	//   file           mine.csv
	//   rows           4 kept of 4
	//   redshift       0.1 … 0.9
	//   z_hel          not given: z stands in for it in (1+z_hel) D_M
	//   repeated       1 name in 2 rows: North-2 (2)
	//   errors         0.1 … 0.1, median 0.1
	//   covariance     none: rows are taken as independent
	//   residuals      0 of 4 beyond 3 errors (0.0 expected); the largest:
	//                                  line         z   measured   best fit  errors
	//     North-2                         3       0.3    21.6000    21.6456    -0.5
	//     North-4                         5       0.9    24.5500    24.5077    +0.4
	//     North-1                         2       0.1    19.0100    19.0054    +0.0
	//     North-2                         4       0.5    22.9500    22.9513    -0.0
	//
	// Best fit: chi² 0.39 for 4 rows, 2 degrees of freedom, at
	//   Om 0.3
}
