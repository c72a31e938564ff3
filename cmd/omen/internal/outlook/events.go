package outlook

import (
	"math"

	"omen/model"
)

// Event is a moment in the life of a universe.
type Event struct {
	Name  string           // in JSON
	Words string           // in a text: "time to the big crunch"
	Given string           // the condition under which it is told
	Held  bool             // with the equation of state held at today's value
	Plain bool             // the value is a plain number, not a time
	Long  bool             // there is no end to how long it can take: its logarithm is what is spread out evenly
	Holds func(Label) bool // the condition

	// at is the value in units of 1/H0 (or plain), NaN where it does not come to
	// be.
	at func(u model.Universe) float64
}

// At is when the event is, in units of 1/H0 or, with gyr, in Gyr; NaN for a universe
// in which it does not come to be.
func (e Event) At(u model.Universe, gyr bool) float64 {
	if e.Held {
		u = u.Frozen()
	}
	if e.Plain || !gyr {
		return e.at(u)
	}
	return e.at(u) * u.HubbleTime()
}

// Events lists the moments that are reported. With evolving, those of the future
// are told for both rules of what the equation of state will be.
func Events(evolving bool) []Event {
	past := []Event{
		{Name: "acceleration_onset_z", Words: "acceleration began, z", Given: "it accelerates today", Holds: accelerates, Plain: true, at: onset},
		{Name: "acceleration_onset", Words: "accelerating for", Given: "it accelerates today", Holds: accelerates, at: onsetTime},
	}
	out := append(past, future(false)...)
	if evolving {
		out = append(out, future(true)...)
	}
	return out
}

func accelerates(l Label) bool { return l.Accelerating }

func future(held bool) []Event {
	suffix, rule := "", ""
	of := func(l Label) model.Fate { return l.Fate }
	if held {
		suffix, rule = "_w_held", ", w held"
		of = func(l Label) model.Fate { return l.Held }
	}
	recollapses := func(l Label) bool { return of(l) == model.Recollapse }
	rips := func(l Label) bool { return of(l) == model.BigRip }
	return []Event{
		{Name: "turnaround" + suffix, Words: "time to turnaround" + rule, Given: "it recollapses", Holds: recollapses, Held: held, Long: true, at: turnaround},
		{Name: "crunch" + suffix, Words: "time to the big crunch" + rule, Given: "it recollapses", Holds: recollapses, Held: held, Long: true, at: crunch},
		{Name: "rip" + suffix, Words: "time to the big rip" + rule, Given: "it rips", Holds: rips, Held: held, Long: true, at: rip},
	}
}

// onset is finite: a universe that accelerated from its beginning has none.
func onset(u model.Universe) float64 {
	if z := u.AccelerationOnset(); !math.IsInf(z, 0) {
		return z
	}
	return math.NaN()
}

func onsetTime(u model.Universe) float64 { return u.Lookback(onset(u)) / u.HubbleTime() }

// Without a big bang the time of a turnaround is NaN, but not that to a rip.

func turnaround(u model.Universe) float64 {
	_, t := u.Turnaround()
	if math.IsNaN(t) {
		return t
	}
	return (t - u.AgeToday()) / u.HubbleTime()
}

func crunch(u model.Universe) float64 {
	t := u.Crunch()
	if math.IsNaN(t) {
		return t
	}
	return (t - u.AgeToday()) / u.HubbleTime()
}

func rip(u model.Universe) float64 {
	if u.Future() != model.BigRip || !u.HasBigBang() {
		return math.NaN()
	}
	return u.Rip() / u.HubbleTime()
}
