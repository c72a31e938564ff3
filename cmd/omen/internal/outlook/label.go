package outlook

import "omen/model"

// Label is what is said of a universe in words.
type Label struct {
	Fate         model.Fate
	Held         model.Fate // with the equation of state held at today's value from now on
	Curvature    int8       // the sign of Ok: -1 closed, 0 flat, +1 open
	Accelerating bool       // today
}

// LabelOf looks at a universe.
func LabelOf(u model.Universe) Label {
	l := Label{Fate: u.Fate(), Accelerating: u.Q0() < 0}
	l.Held = l.Fate
	if u.Wa != 0 && l.Fate != model.NoBigBang {
		l.Held = u.Frozen().Future()
	}
	switch ok := u.Ok(); {
	case ok < 0:
		l.Curvature = -1
	case ok > 0:
		l.Curvature = 1
	}
	return l
}

// Code packs a label into a small whole number, for draws of labels.
func (l Label) Code() float64 {
	c := (int(l.Fate)*16+int(l.Held))*4 + int(l.Curvature+1)
	c *= 2
	if l.Accelerating {
		c++
	}
	return float64(c)
}

// Decode is the label of a code.
func Decode(code float64) Label {
	c := int(code)
	return Label{Fate: model.Fate(c / 128), Held: model.Fate(c / 8 % 16), Curvature: int8(c/2%4) - 1, Accelerating: c%2 == 1}
}

// Statement is something that a label says or does not.
type Statement struct {
	Name  string
	Holds func(Label) bool
}

// Fates are the statements of what will be: one for each fate, in the order in
// which they are reported.
func Fates() []Statement { return fates(func(l Label) model.Fate { return l.Fate }) }

// HeldFates are the same with the equation of state held at today's value.
func HeldFates() []Statement { return fates(func(l Label) model.Fate { return l.Held }) }

func fates(of func(Label) model.Fate) []Statement {
	var out []Statement
	for _, f := range model.Fates() {
		out = append(out, Statement{f.String(), func(l Label) bool { return of(l) == f }})
	}
	return out
}

// Today are the statements about the present.
func Today() []Statement {
	curved := func(sign int8) func(Label) bool { return func(l Label) bool { return l.Curvature == sign } }
	return []Statement{
		{"accelerating", func(l Label) bool { return l.Accelerating }},
		{"closed (Ok < 0)", curved(-1)},
		{"flat (Ok = 0)", curved(0)},
		{"open (Ok > 0)", curved(1)},
	}
}
