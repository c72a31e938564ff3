package model_test

import (
	"fmt"

	"omen/model"
)

// A universe near ours, its distances and its end.
func Example() {
	u := model.Universe{Om: 0.3, OL: 0.7, H0: 70, W0: -1}
	fmt.Printf("DM(z=1) %.2f Mpc, mu %.4f\n", u.DM(1), u.DistanceModulus(1, 1))
	fmt.Printf("age %.3f Gyr, accelerating since z = %.3f\n", u.AgeToday(), u.AccelerationOnset())
	fmt.Println(u.Fate())

	u.OL = -0.3
	a, t := u.Turnaround()
	fmt.Printf("with OL = -0.3: %v\n", u.Fate())
	fmt.Printf("turns at a = %.3f, %.1f Gyr after the big bang; crunch at %.1f Gyr\n", a, t, u.Crunch())
	// Output:
	// DM(z=1) 3303.83 Mpc, mu 44.1002
	// age 13.467 Gyr, accelerating since z = 0.671
	// expands forever, accelerating
	// with OL = -0.3: recollapse (big crunch)
	// turns at a = 1.960, 35.9 Gyr after the big bang; crunch at 71.9 Gyr
}

// Many redshifts at once, as a fit needs them: the path is prepared once and filled for every trial universe.
func ExamplePath() {
	p, err := model.NewPath([]float64{0.5, 1, 2})
	if err != nil {
		fmt.Println(err)
		return
	}
	dm, dh := make([]float64, 3), make([]float64, 3)
	p.Fill(model.Universe{Om: 0.3, OL: 0.7, W0: -1}, dm, dh)
	fmt.Printf("DM %.4f c/H0\nDH %.4f c/H0\n", dm, dh)
	// Output:
	// DM [0.4410 0.7714 1.2095] c/H0
	// DH [0.7642 0.5680 0.3371] c/H0
}
