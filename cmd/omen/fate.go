package main

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"

	"omen/cmd/omen/internal/outlook"
	"omen/model"

	"github.com/spf13/pflag"
)

const fateHelp = `omen fate says what one universe does: its fate, its age, its distances.

  omen fate --Om 0.3 --OL 0.7
  omen fate --Om 0.3 --w0 -1.1 --H0 70 --z 0.5,1,2 --json
  omen fate --samples posterior.csv --columns Om=omega_m,OL=omega_l

Distances are in Mpc and times in Gyr. Without --OL the universe is flat.

With --samples it reads a posterior sample that someone has published and says
what omen fit would: constraints, the probability of each fate, times. Columns:
Om; OL or Ok (without them: flat); H0, w0, wa, Or and weight if there are such.
Times are in units of 1/H0 unless there is a column H0, or --H0 is given.
`

// fromTemperature is the radiation that follows from the CMB temperature.
const fromTemperature = "from-temperature"

// fateOptions are the flags of omen fate.
type fateOptions struct {
	u         model.Universe
	radiation string
	z         redshifts
	asJSON    bool
	samples   string
	columns   []string
}

func fateFlags(o *fateOptions) *pflag.FlagSet {
	f := newFlags("fate", fateHelp)
	f.Float64Var(&o.u.Om, "Om", 0, "density parameter of matter today")
	f.Float64Var(&o.u.OL, "OL", 0, "density parameter of dark energy today (without it: flat)")
	f.Float64Var(&o.u.H0, "H0", 70, "Hubble constant, km/s/Mpc")
	f.Float64Var(&o.u.W0, "w0", -1, "dark-energy equation of state today")
	f.Float64Var(&o.u.Wa, "wa", 0, "its change: w(a) = w0 + wa (1-a)")
	f.StringVar(&o.radiation, "Or", "0", "density parameter of radiation today, or from-temperature")
	o.z.z = []float64{0.5, 1, 2, 3}
	f.Var(&o.z, "z", "redshifts for the table of distances")
	f.StringVar(&o.samples, "samples", "", "read universes from a posterior sample instead")
	f.StringSliceVar(&o.columns, "columns", nil, "which columns of it carry what, as Om=omega_m,OL=omega_l,weight=w")
	f.BoolVar(&o.asJSON, "json", false, "write JSON")
	return f
}

func runFate(args []string, stdout io.Writer) error {
	var o fateOptions
	f := fateFlags(&o)
	if done, err := parse(f, args, stdout, 0); done || err != nil {
		return err
	}
	switch {
	case o.samples == "" && f.Changed("samples"):
		return usagef("--samples names no file; give it one, or leave it out")
	case o.samples == "" && len(o.columns) > 0:
		return usagef("--columns maps the columns of --samples FILE, which is missing")
	case o.samples != "" && (f.Changed("Om") || f.Changed("OL")):
		return usagef("--samples brings its own Om and OL; remove --Om and --OL")
	case o.samples != "":
		if err := o.common(); err != nil {
			return err
		}
		return o.runSamples(f.Changed("H0"), stdout)
	}
	if err := o.complete(f.Changed); err != nil {
		return err
	}
	report := destiny(o.u, o.z.z)
	if o.asJSON {
		enc := json.NewEncoder(stdout)
		enc.SetIndent("", "  ")
		return enc.Encode(report)
	}
	return report.write(stdout)
}

// redshifts is a flag of numbers between commas. What is given replaces the default; given
// again it adds to it.
type redshifts struct {
	z     []float64
	given bool
}

func (r *redshifts) Type() string { return "numbers" }

func (r *redshifts) String() string {
	words := make([]string, len(r.z))
	for i, z := range r.z {
		words[i] = strconv.FormatFloat(z, 'g', -1, 64)
	}
	return strings.Join(words, ",")
}

func (r *redshifts) Set(text string) error {
	if !r.given {
		r.z, r.given = nil, true
	}
	for _, word := range strings.Split(text, ",") {
		z, err := strconv.ParseFloat(strings.TrimSpace(word), 64)
		if err != nil {
			return fmt.Errorf("found %q, expected redshifts such as 0.5,1,2", word)
		}
		r.z = append(r.z, z)
	}
	return nil
}

// Beyond these a number is a slip of the pen rather than a universe.
const (
	largestDensity  = 100
	largestW        = 50
	largestRedshift = 1e6
	leastH0         = 10 // below it is h = H0/100
	largestH0       = 1e4
)

// complete fills in what the flags left to be decided and checks them.
func (o *fateOptions) complete(given func(flag string) bool) error {
	if !given("Om") {
		return usagef("--Om is missing; write for example omen fate --Om 0.3 --OL 0.7")
	}
	if o.u.Om < 0 {
		return usagef("--Om %g: matter cannot have a negative density", o.u.Om)
	}
	if err := within("Om", o.u.Om, 0, largestDensity); err != nil {
		return err
	}
	if err := within("OL", o.u.OL, -largestDensity, largestDensity); err != nil {
		return err
	}
	if err := o.common(); err != nil {
		return err
	}
	if !given("OL") {
		o.u.OL = 1 - o.u.Om - o.u.Or
	}
	for _, z := range o.z.z {
		if !(z > 0 && z <= largestRedshift) {
			return usagef("--z %g: expected redshifts above 0 and up to %g", z, float64(largestRedshift))
		}
	}
	return nil
}

// within refuses a flag outside its range; NaN is outside all.
func within(flag string, x, from, to float64) error {
	if x >= from && x <= to {
		return nil
	}
	return usagef("--%s %g: expected a number from %g to %g", flag, x, from, to)
}

// common checks the flags that go with a sample too.
func (o *fateOptions) common() error {
	if o.u.H0 > 0 && o.u.H0 < leastH0 {
		return usagef("--H0 %g: expected km/s/Mpc; this looks like h = H0/100, write --H0 %g", o.u.H0, 100*o.u.H0)
	}
	if err := within("H0", o.u.H0, leastH0, largestH0); err != nil {
		return err
	}
	if err := within("w0", o.u.W0, -largestW, largestW); err != nil {
		return err
	}
	if err := within("wa", o.u.Wa, -largestW, largestW); err != nil {
		return err
	}
	return o.setRadiation()
}

func (o *fateOptions) setRadiation() error {
	if o.radiation == fromTemperature {
		o.u.Or = model.RadiationFromTemperature(o.u.H0)
		return nil
	}
	v, err := strconv.ParseFloat(o.radiation, 64)
	if err != nil || !(v >= 0 && v <= largestDensity) {
		return usagef("--Or %s: expected a density parameter from 0 to 100, or from-temperature", o.radiation)
	}
	o.u.Or = v
	return nil
}

// number is a float64 whose NaN and infinities are null in JSON.
type number float64

func (n number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(n)) || math.IsInf(float64(n), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(n))
}

// destinyReport is what omen fate prints: Mpc and Gyr, null where it does not
// exist.
type destinyReport struct {
	Fate         string          `json:"fate"`
	FateHeldW    string          `json:"fate_w_held,omitempty"`
	BigBang      bool            `json:"big_bang"`
	Accelerating bool            `json:"accelerating"`
	Universe     destinyUniverse `json:"universe"`
	Q0           number          `json:"q0"`
	Age          number          `json:"age"`
	H0T0         number          `json:"H0t0"`
	Onset        number          `json:"acceleration_onset_z"`
	Turnaround   *turnaround     `json:"turnaround"`
	Crunch       number          `json:"crunch"`
	Rip          number          `json:"rip"`
	Distances    []destinyAtZ    `json:"distances"`
	u            model.Universe
}

type destinyUniverse struct {
	Om, OL, Ok, Or, H0 float64
	W0                 float64 `json:"w0"`
	Wa                 float64 `json:"wa"`
}

type turnaround struct {
	A    float64 `json:"a"`
	Time float64 `json:"time"`
}

type destinyAtZ struct {
	Z                      float64 `json:"z"`
	DC, DM, DA, DL, DH, DV number
	Mu                     number `json:"mu"`
	Lookback               number `json:"lookback"`
	Age                    number `json:"age"`
}

// destiny computes everything that omen fate says of a universe.
func destiny(u model.Universe, zs []float64) *destinyReport {
	r := &destinyReport{u: u, Fate: u.Fate().String(), BigBang: u.HasBigBang(), Accelerating: u.Q0() < 0,
		Universe: destinyUniverse{u.Om, u.OL, u.Ok(), u.Or, u.H0, u.W0, u.Wa},
		Q0:       number(u.Q0()), Age: number(u.AgeToday()), H0T0: number(u.AgeToday() / u.HubbleTime()),
		Onset:  number(u.AccelerationOnset()),
		Crunch: number(u.Crunch()), Rip: number(u.Rip()), Distances: []destinyAtZ{}}
	if u.Wa != 0 {
		r.FateHeldW = outlook.LabelOf(u).Held.String()
	}
	if a, t := u.Turnaround(); !math.IsNaN(a) {
		r.Turnaround = &turnaround{a, t}
	}
	for _, z := range zs {
		r.Distances = append(r.Distances, destinyAtZ{z, number(u.DC(z)), number(u.DM(z)), number(u.DA(z)), number(u.DL(z)),
			number(u.DH(z)), number(u.DV(z)), number(u.DistanceModulus(z, z)), number(u.Lookback(z)), number(u.Age(z))})
	}
	return r
}

func (r *destinyReport) write(w io.Writer) error {
	var b strings.Builder
	r.writeHead(&b)
	r.writeTimes(&b)
	if len(r.Distances) > 0 {
		b.WriteString("\n     z      DC      DM      DA       DL      DH      DV      mu lookback     age\n")
		b.WriteString("           Mpc     Mpc     Mpc      Mpc     Mpc     Mpc     mag      Gyr     Gyr\n")
	}
	for _, d := range r.Distances {
		fmt.Fprintf(&b, "%6.4g%s%s%s%s%s%s%s%s%s\n", d.Z, cell(d.DC, 8), cell(d.DM, 8), cell(d.DA, 8), cell(d.DL, 9),
			cell(d.DH, 8), cell(d.DV, 8), cell(d.Mu, 8), cell(d.Lookback, 9), cell(d.Age, 8))
	}
	_, err := io.WriteString(w, b.String())
	return err
}

func (r *destinyReport) writeHead(b *strings.Builder) {
	u := r.Universe
	fmt.Fprintf(b, "Om %g, OL %.6g, Ok %.6g, Or %.4g, H0 %g km/s/Mpc", u.Om, u.OL, zero(u.Ok), u.Or, u.H0)
	if u.W0 != -1 || u.Wa != 0 {
		fmt.Fprintf(b, ", w0 %g, wa %g", u.W0, u.Wa)
	}
	fmt.Fprintf(b, "\n\nFate: %s\n", r.Fate)
	if !r.BigBang {
		fmt.Fprintf(b, "      from today on: %s\n", r.u.Future())
	}
	if r.FateHeldW != "" {
		fmt.Fprintf(b, "      %s, if w stays at today's value\n", r.FateHeldW)
		b.WriteString("      For wa ≠ 0 the far future extrapolates w(a) = w0 + wa (1-a).\n")
	}
	b.WriteString("\n")
}

func (r *destinyReport) writeTimes(b *strings.Builder) {
	line := func(label string, format string, args ...any) {
		fmt.Fprintf(b, "%-24s", label)
		fmt.Fprintf(b, format+"\n", args...)
	}
	if r.BigBang {
		line("age today", "%.4f Gyr (%.6f / H0)", r.Age, r.H0T0)
	} else {
		line("age today", "none: it bounced and never began")
	}
	line("deceleration q0", "%.5g", float64(r.Q0))
	switch z := float64(r.Onset); {
	case math.IsInf(z, 1):
		line("accelerating", "since always")
	case !math.IsNaN(z):
		line("accelerating since", "z = %.4f, %.3f Gyr ago", z, r.u.Lookback(z))
	}
	if r.Turnaround != nil {
		line("largest size", "a = %.5g, %.4g Gyr after the big bang", r.Turnaround.A, r.Turnaround.Time)
	}
	if c := float64(r.Crunch); !math.IsNaN(c) {
		line("big crunch", "%.4g Gyr after the big bang, %.4g Gyr from today", c, c-float64(r.Age))
	}
	if rip := float64(r.Rip); !math.IsNaN(rip) {
		line("big rip", "%.4g Gyr from today", rip)
	}
}

// zero takes rounding error and the sign off a curvature that is nothing.
func zero(x float64) float64 {
	if math.Abs(x) < 1e-12 {
		return 0
	}
	return x
}

// cell formats a number in a column with as many of six digits as leave a
// blank before it, a dash where there is no number.
func cell(n number, width int) string {
	if math.IsNaN(float64(n)) {
		return fmt.Sprintf("%*s", width, "–")
	}
	text := ""
	for digits := 6; digits > 0; digits-- {
		if text = strconv.FormatFloat(float64(n), 'g', digits, 64); len(text) < width {
			break
		}
	}
	return fmt.Sprintf("%*s", width, text)
}
