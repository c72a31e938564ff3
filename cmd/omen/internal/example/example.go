// Package example invents a supernova survey. Nothing in it was measured: two
// imagined surveys observe a universe whose parameters are known, so that a fit
// can be judged against the truth.
package example

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"omen/model"
)

// Truth is the universe that the invented surveys look at, and AbsoluteMagnitude
// the standardised magnitude of its supernovae.
var Truth = model.Universe{Om: 0.31, OL: 0.69, H0: 70, W0: -1}

// AbsoluteMagnitude is in mag.
const AbsoluteMagnitude = -19.3

// survey is one imagined search: how many supernovae, where, how well measured.
type survey struct {
	name, prefix string
	count        int
	zMin, zMax   float64
	noise        float64 // photometric error, mag, at zMin; doubles towards zMax
}

// intrinsic is the scatter of standardised magnitudes (mag), and peculiar the
// spread of galaxies' line-of-sight velocities (km/s); both typical figures,
// common practice.
const (
	intrinsic = 0.10
	peculiar  = 300.0
)

// Seed is the one that made the table in testdata/runs.
const Seed = 20260

// Table writes the invented survey as CSV: about 150 supernovae with the name,
// survey, CMB-frame and heliocentric redshift, standardised magnitude and error.
// The same seed gives the same bytes.
func Table(seed uint64) []byte {
	random := rand.New(rand.NewPCG(seed, 0))
	var b bytes.Buffer
	fmt.Fprintf(&b, "# An invented survey (seed %d): no such supernova was ever seen.\n", seed)
	fmt.Fprintf(&b, "# Truth: Om = %g, OL = %g, no radiation, w = -1, M = %g mag with H0 = %g km/s/Mpc.\n",
		Truth.Om, Truth.OL, AbsoluteMagnitude, Truth.H0)
	b.WriteString("name,survey,z,z_hel,mag,mag_err\n")
	for _, s := range []survey{
		{"Lowland", "low", 50, 0.015, 0.10, 0.07},
		{"Longwatch", "far", 102, 0.10, 1.15, 0.06},
	} {
		s.observe(random, &b)
	}
	return b.Bytes()
}

// observe adds one survey's supernovae in the order of their redshifts.
func (s survey) observe(random *rand.Rand, b *bytes.Buffer) {
	z := make([]float64, s.count)
	for i := range z {
		z[i] = s.zMin + (s.zMax-s.zMin)*math.Sqrt(random.Float64())
	}
	slices.Sort(z)
	for i, z := range z {
		depth := (z - s.zMin) / (s.zMax - s.zMin)
		photometric := s.noise * (1 + depth)
		// The CMB-frame redshift is what is left when a known motion is taken
		// out; an unknown one of the galaxy itself scatters the magnitude.
		sun := 370 * (2*random.Float64() - 1) // km/s towards us, the solar motion's share
		moving := 5 / math.Ln10 * peculiar / (model.C * z)
		sigma := math.Sqrt(photometric*photometric + intrinsic*intrinsic + moving*moving)
		zHel := (1+z)*(1-sun/model.C) - 1
		mag := AbsoluteMagnitude + Truth.DistanceModulus(z, zHel) + sigma*random.NormFloat64()
		fmt.Fprintf(b, "%s-%03d,%s,%.5f,%.5f,%.4f,%.4f\n", s.prefix, i+1, s.name, z, zHel, mag, sigma)
	}
}
