package gather

import (
	"fmt"
	"math"
	"slices"
	"strings"

	"omen/cmd/omen/internal/density"
	"omen/cmd/omen/internal/figure"
	"omen/likelihood"
	"omen/model"
	"omen/sampler"
)

// planeDraws is how many draws an outline is made of.
const planeDraws = 20000

// mostTables is how many regions can be told apart beside that of all together.
const mostTables = 5

// plane is the regions of (Om, OL) with the lines that divide the fates.
func (r *Run) plane() (*Picture, error) {
	s := r.Job.Space
	om, ol := index(s, "Om"), index(s, "OL")
	switch {
	case s.Family().Flat:
		return absent("space is flat by assumption: OL follows from Om, and there is no plane to show"), nil
	case om < 0 || ol < 0:
		return absent("Om and OL are not both free"), nil
	}
	in := figure.Plane{X: axis("Om"), Y: axis("OL"), Unfinished: r.Unfinished(),
		XEdges: edges(s.Free()[om].Prior), YEdges: edges(s.Free()[ol].Prior)}
	left := r.separately(&in)
	name := r.Job.Tables[0].Name
	if len(in.Sets) > 0 {
		name = "all together"
	}
	in.Sets = append(in.Sets, r.set(name, [2]string{"Om", "OL"}, r.Best))
	in.Dividers = dividers(s)
	in.Frame = frame(in.Sets, in.XEdges, in.YEdges)
	caption := r.planeCaption(&in) + left
	return &Picture{Caption: caption, Alt: r.planeAlt(), draw: func(w figure.Width) (*figure.Figure, error) { return figure.DrawPlane(in, w) }}, nil
}

func index(s *likelihood.Space, name string) int {
	return slices.IndexFunc(s.Free(), func(p likelihood.Parameter) bool { return p.Name == name })
}

// edges are the hard ends of a prior.
func edges(p likelihood.Prior) density.Edges {
	lo, hi := p.Range()
	return density.Edges{Lo: lo, Hi: hi}
}

// separately adds the region of every table by itself where there are several. It
// says which are missing.
func (r *Run) separately(in *figure.Plane) string {
	n := len(r.Job.Tables)
	switch {
	case n < 2:
		return ""
	case n > mostTables:
		return fmt.Sprintf(" The %d tables are not shown one by one.", n)
	}
	var missing []string
	for i := range r.Job.Tables {
		name := r.Job.Tables[i].Name
		a, err := r.alone(i)
		if err != nil || a.check.ESS() < 100 {
			missing = append(missing, name)
			continue
		}
		v := a.check.Sample
		rows := max(1, planeDraws/(v.Ensembles()*v.Walkers()))
		v = v.Thin(max(1, v.Steps()/rows))
		in.Sets = append(in.Sets, figure.Set{Name: figure.Plain(name), X: v.Coordinate(index(a.space, "Om")).Values(),
			Y: v.Coordinate(index(a.space, "OL")).Values(), ESS: a.check.ESS()})
	}
	if len(missing) > 0 {
		return " Not shown by itself, for it leaves the plane too open: " + strings.Join(missing, ", ") + "."
	}
	return ""
}

// set is the draws of two parameters of a run.
func (r *Run) set(name string, pair [2]string, best []float64) figure.Set {
	x, y := index(r.Job.Space, pair[0]), index(r.Job.Space, pair[1])
	columns, ess := r.draws(planeDraws)
	out := figure.Set{Name: figure.Plain(name), X: columns[x], Y: columns[y], ESS: ess}
	if best != nil {
		out.Best = &[2]float64{best[x], best[y]}
	}
	return out
}

// Has reports whether a parameter is free in a run.
func (r *Run) Has(name string) bool { return index(r.Job.Space, name) >= 0 }

// OnLine reports whether the universes of a run lie on a line of the plane of two
// parameters: those of flat space do in that of Om and OL.
func (r *Run) OnLine(pair [2]string) bool {
	return pair == [2]string{"Om", "OL"} && r.Job.Space.Family().Flat && r.Has("Om")
}

// line is the draws of a run in flat space, on the line that they lie on.
func (r *Run) line(name string) figure.Set {
	columns, ess := r.draws(planeDraws)
	out := figure.Set{Name: figure.Plain(name), X: columns[index(r.Job.Space, "Om")], ESS: ess, Line: true}
	x := make([]float64, len(columns))
	for i := range out.X {
		for k := range x {
			x[k] = columns[k][i]
		}
		out.Y = append(out.Y, r.universe(x).OL)
	}
	return out
}

// PlaneOf is several runs in the plane of two parameters that all of them have, or on a
// line of which they lie. The edges of a prior that all of them share are respected.
func PlaneOf(runs []*Run, names []string, pair [2]string, caption, alt string) *Picture {
	in := figure.Plane{X: axis(pair[0]), Y: axis(pair[1])}
	var x, y []density.Edges
	same := true
	for i, r := range runs {
		s := r.Job.Space
		in.Unfinished = in.Unfinished || r.Unfinished()
		if r.OnLine(pair) {
			in.Sets = append(in.Sets, r.line(names[i]))
			continue
		}
		in.Sets = append(in.Sets, r.set(names[i], pair, nil))
		x, y = append(x, edges(s.Free()[index(s, pair[0])].Prior)), append(y, edges(s.Free()[index(s, pair[1])].Prior))
		same = same && x[len(x)-1] == x[0] && y[len(y)-1] == y[0]
	}
	if same {
		in.XEdges, in.YEdges = x[0], y[0]
	}
	if pair == [2]string{"Om", "OL"} {
		of := runs[0]
		for _, r := range runs {
			if r.Has("OL") && r.Job.Space.Family().DarkEnergy != likelihood.Constant { // the lines that hold for all
				of = r
			}
		}
		in.Dividers = dividers(of.Job.Space)
		if same {
			in.Frame = frame(in.Sets, in.XEdges, in.YEdges)
		} else {
			in.Frame = frame(in.Sets, density.NoEdges(), density.NoEdges())
		}
	}
	return NewPicture("plane", "One plane", caption, alt, false, func(w figure.Width) (*figure.Figure, error) { return figure.DrawPlane(in, w) })
}

// The part of the plane that is always shown: the lines between the fates run
// through it.
var always = [4]float64{0, 0.9, -0.25, 1.6}

// frame is that part, wider where a set needs it, within the priors.
func frame(sets []figure.Set, x, y density.Edges) *[4]float64 {
	f := always
	for _, s := range sets {
		xs, ys := slices.Sorted(slices.Values(s.X)), slices.Sorted(slices.Values(s.Y))
		reach := func(v []float64, lo, hi *float64) { // all but a few draws, with a margin
			a, b := quantile(v, 0.005), quantile(v, 0.995)
			*lo, *hi = min(*lo, a-0.08*(b-a)), max(*hi, b+0.08*(b-a))
		}
		reach(xs, &f[0], &f[1])
		reach(ys, &f[2], &f[3])
	}
	return &[4]float64{max(f[0], x.Lo), min(f[1], x.Hi), max(f[2], y.Lo), min(f[3], y.Hi)}
}

// dividers are the lines between kinds of universe. All but that of flat space
// move with the equation of state and are left out where it is free.
func dividers(s *likelihood.Space) []figure.Divider {
	var p likelihood.Point
	lo, hi := s.Box()
	s.Point(lo, &p)
	u := p.Universe
	om := index(s, "Om")
	x := grid(max(lo[om], 1e-3), hi[om], 240, false)
	line := func(left, right string, exclude bool, above func(model.Universe) bool) figure.Divider {
		return figure.Divider{X: x, Y: border(u, x, above), Left: figure.Plain(left), Right: figure.Plain(right), Exclude: exclude}
	}
	out := []figure.Divider{line("closed", "open", false, func(u model.Universe) bool { return u.Ok() < 0 })}
	if s.Family().DarkEnergy != likelihood.Constant {
		return out
	}
	return append(out,
		line("accelerates today", "decelerates today", false, func(u model.Universe) bool { return u.Q0() < 0 }),
		line("expands forever", "recollapses", false, func(u model.Universe) bool { return u.Future() != model.Recollapse }),
		line("no big bang", "", s.Family().RequireBigBang, func(u model.Universe) bool { return !u.HasBigBang() }))
}

// border is where, going up in OL at each Om, universes begin to be above. The
// functions of package model know the published boundaries (Carroll, Press &
// Turner 1992, ARA&A 30, 499; Felten & Isaacman 1986, RMP 58, 689) and what
// radiation does to them.
func border(u model.Universe, om []float64, above func(model.Universe) bool) []float64 {
	y := make([]float64, len(om))
	for i, x := range om {
		u.Om = x
		lo, hi := -20.0, 20+10*x
		for hi-lo > 1e-9 {
			u.OL = (lo + hi) / 2
			if above(u) {
				hi = u.OL
			} else {
				lo = u.OL
			}
		}
		y[i] = (lo + hi) / 2
	}
	return y
}

func (r *Run) planeCaption(in *figure.Plane) string {
	var b strings.Builder
	b.WriteString("Regions of highest density that hold 68% and 95% of the posterior of Om and OL")
	if len(in.Sets) > 1 {
		b.WriteString(", of each table by itself and of all together")
	}
	b.WriteString(". The cross is the best fit. ")
	if len(in.Dividers) > 1 {
		b.WriteString("Dashed lines divide universes that are closed from open ones, that accelerate today from those that do not, " +
			"that recollapse from those that expand for ever, and that had no big bang (Carroll, Press & Turner 1992; Felten & Isaacman 1986)")
	} else {
		b.WriteString("The dashed line is flat space; those between the fates depend on w and are not lines in this plane")
	}
	if r.Job.Space.Family().RequireBigBang && len(in.Dividers) > 1 {
		b.WriteString("; these last are left out by assumption and hatched")
	}
	b.WriteString(".")
	return b.String()
}

func (r *Run) planeAlt() string {
	s := "Posterior regions in the plane of Om and OL: " + r.Values("Om", "OL") + "; " + r.Values("Ok") + "."
	if c := r.correlation("Om", "OL"); !math.IsNaN(c) {
		s += fmt.Sprintf(" Their correlation is %.2f.", c)
	}
	return s
}

func (r *Run) correlation(a, b string) float64 {
	columns, _ := r.draws(planeDraws)
	i, j := index(r.Job.Space, a), index(r.Job.Space, b)
	return sampler.Correlation(sampler.NewDraws(1, columns[i]), sampler.NewDraws(1, columns[j]))
}
