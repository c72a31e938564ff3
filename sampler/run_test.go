package sampler

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"testing"
)

// recorder keeps everything a run says.
type recorder struct {
	rows   []float64   // step, ensemble, walker, position, log-density; again and again
	moves  map[int]int // proposals accepted up to a step, since the row before
	checks []Check
	steps  []int
	stop   func(step int) error
}

var _ Observer = (*recorder)(nil)

func (r *recorder) Advanced(step int, rows View) error {
	r.rows = flat(r.rows, rows)
	if r.moves == nil {
		r.moves = map[int]int{}
	}
	if rows.Steps() > 0 && rows.After(0).Accepted(0) != -1 {
		return errors.New("a part of the rows claims to know how many moves were accepted")
	}
	for i := range rows.Steps() {
		r.moves[rows.Number(i)] = rows.Accepted(i)
	}
	r.steps = append(r.steps, step)
	if r.stop != nil {
		return r.stop(step)
	}
	return nil
}

// flat appends the rows of a view.
func flat(to []float64, v View) []float64 {
	for row := range v.Rows() {
		to = append(to, float64(row.Step), float64(row.Ensemble), float64(row.Walker))
		to = append(append(to, row.X...), row.LogP)
	}
	return to
}

func (r *recorder) Checked(c Check) { r.checks = append(r.checks, c) }

// verdicts are the checks without the views, which hold slices of a chain.
func (r *recorder) verdicts() []string {
	var v []string
	for _, c := range r.checks {
		c.Sample = View{}
		v = append(v, fmt.Sprintf("%+v", c))
	}
	return v
}

func mustRun(t *testing.T, ctx context.Context, densities []Density, c *Chain, s Settings, o Observer) Outcome {
	t.Helper()
	out, err := Run(ctx, densities, c, s, o)
	if err != nil {
		t.Fatal(err)
	}
	return out
}

func quick() Settings {
	return Settings{Seed: 3, Effective: 800, MaxSteps: 8000}
}

func TestThreadsDoNotChangeTheChain(t *testing.T) {
	var first *recorder
	for _, threads := range []int{1, 2, 8} {
		c, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
		r := &recorder{}
		s := quick()
		s.Threads = threads
		out := mustRun(t, context.Background(), densities, c, s, r)
		if out.Stop != Converged {
			t.Fatalf("stopped with %v", out.Stop)
		}
		if first == nil {
			first = r
			continue
		}
		if !slices.Equal(r.rows, first.rows) {
			t.Errorf("%d threads: another chain", threads)
		}
		if !slices.Equal(r.verdicts(), first.verdicts()) {
			t.Errorf("%d threads: other checks", threads)
		}
	}
}

// Rows come in the order of a chain file: step, ensemble, walker, none left out.
func TestObserverSeesEveryRowInOrder(t *testing.T) {
	const every = 3
	c, densities := small().newChain(t, 3, 1, every, DefaultRecord)
	r := &recorder{}
	mustRun(t, context.Background(), densities, c, Settings{Seed: 1, MaxSteps: 301}, r)
	if c.Steps() != 303 {
		t.Errorf("ended at step %d, want 303: the limit rounded up to a recorded step", c.Steps())
	}
	i := 0
	for step := every; step <= 303; step += every {
		for m := range 3 {
			for k := range c.walkers {
				want := []float64{float64(step), float64(m), float64(k)}
				if got := r.rows[i : i+3]; !slices.Equal(got, want) {
					t.Fatalf("found the row of step, ensemble, walker %v, want %v", got, want)
				}
				i += 7
			}
		}
	}
	if i != len(r.rows) {
		t.Errorf("%d numbers, want %d", len(r.rows), i)
	}
	if !slices.IsSorted(r.steps) || r.steps[len(r.steps)-1] != 303 {
		t.Errorf("progress at steps %v", r.steps)
	}
	if !slices.Equal(flat(nil, c.View()), r.rows) {
		t.Error("the chain keeps other rows than the observer saw")
	}
}

// restored returns a chain that starts like an undisturbed one and is given the
// rows up to a step, as if read from a file.
func restored(t *testing.T, g target, from *recorder, upTo, every, record int) (*Chain, []Density) {
	t.Helper()
	rows := from.rows
	c, densities := g.newChain(t, 4, 3, every, record)
	length := 4 * c.walkers * (c.dim + 4)
	for ; len(rows) > 0 && rows[0] <= float64(upTo); rows = rows[length:] {
		x, logp := make([][]float64, 4), make([][]float64, 4)
		for row := range slices.Chunk(rows[:length], c.dim+4) {
			m := int(row[1])
			x[m] = append(x[m], row[3:3+c.dim]...)
			logp[m] = append(logp[m], row[3+c.dim])
		}
		if err := c.Append(int(rows[0]), x, logp, from.moves[int(rows[0])]); err != nil {
			t.Fatal(err)
		}
	}
	return c, densities
}

// A chain cut after any step and taken on gives the rows, the decisions and the
// diagnostics of one that was left alone; also with a record that overflows.
func TestResumedRunEqualsUndisturbedRun(t *testing.T) {
	for _, c := range []struct{ every, record int }{{1, DefaultRecord}, {1, 60000}, {5, 20000}} {
		t.Run(fmt.Sprint(c), func(t *testing.T) {
			g, s := small(), quick()
			chain, densities := g.newChain(t, 4, 3, c.every, c.record)
			whole := &recorder{}
			out := mustRun(t, context.Background(), densities, chain, s, whole)
			last := out.Check.Step
			if out.Stop != Converged || last < 300 {
				t.Fatalf("the undisturbed run ended with %v at step %d", out.Stop, last)
			}
			if c.record < DefaultRecord && chain.View().Spacing() == c.every {
				t.Fatalf("the record did not overflow in %d steps", last)
			}
			for _, cut := range []int{1, 58, 111, last} {
				part, densities := restored(t, g, whole, cut, c.every, c.record)
				r := &recorder{}
				again := mustRun(t, context.Background(), densities, part, s, r)
				if again.Stop != out.Stop || again.Check.Step != last {
					t.Fatalf("cut after %d: ended with %v at step %d, undisturbed at %d", cut, again.Stop, again.Check.Step, last)
				}
				from := cut / c.every * 4 * chain.walkers * 7
				if !slices.Equal(r.rows, whole.rows[from:]) {
					t.Fatalf("cut after %d: other rows", cut)
				}
				if !slices.Equal(flat(nil, part.View()), flat(nil, chain.View())) {
					t.Fatalf("cut after %d: another record", cut)
				}
				if !slices.Equal(again.Check.Parameters, out.Check.Parameters) || again.Check.BurnIn != out.Check.BurnIn {
					t.Fatalf("cut after %d: other diagnostics", cut)
				}
				if again.Check.Acceptance != out.Check.Acceptance {
					t.Fatalf("cut after %d: acceptance %v, undisturbed %v", cut, again.Check.Acceptance, out.Check.Acceptance)
				}
			}
		})
	}
}

// Without the count, a chain of every step finds it by looking who moved.
func TestAcceptanceCanBeCounted(t *testing.T) {
	g := small()
	chain, densities := g.newChain(t, 4, 3, 1, DefaultRecord)
	mustRun(t, context.Background(), densities, chain, Settings{Seed: 3, MaxSteps: 100}, nil)
	copied, _ := g.newChain(t, 4, 3, 1, DefaultRecord)
	v := chain.View()
	for i := range v.Steps() {
		x, logp := v.Step(i)
		if err := copied.Append(v.Number(i), x, logp, v.Accepted(i)); err != nil {
			t.Fatal(err)
		}
	}
	if a, b := copied.Acceptance(), chain.Acceptance(); a != b || !(a > 0.2 && a < 0.8) {
		t.Errorf("acceptance %v, counted %v", b, a)
	}
}

// A run that is cancelled ends soon, keeps what it has, and can be taken on.
func TestCancelledRun(t *testing.T) {
	g, s := small(), quick()
	chain, densities := g.newChain(t, 4, 3, 1, DefaultRecord)
	whole := &recorder{}
	mustRun(t, context.Background(), densities, chain, s, whole)

	chain, densities = g.newChain(t, 4, 3, 1, DefaultRecord)
	r := &recorder{}
	for range 1000 {
		ctx, cancel := context.WithCancel(context.Background())
		after := chain.Steps() + 50
		r.stop = func(step int) error {
			if step >= after {
				cancel()
			}
			return nil
		}
		out := mustRun(t, ctx, densities, chain, s, r)
		cancel()
		if out.Check.Step != chain.Steps() {
			t.Fatalf("check at step %d of a chain of %d", out.Check.Step, chain.Steps())
		}
		if out.Stop == Converged {
			break
		}
		if out.Stop != Interrupted {
			t.Fatalf("stopped with %v", out.Stop)
		}
	}
	if !slices.Equal(r.rows, whole.rows) {
		t.Errorf("%d rows after interruptions, %d without, or not the same", len(r.rows), len(whole.rows))
	}
	ctx, cancel := context.WithCancel(context.Background())
	cancel()
	chain, densities = g.newChain(t, 4, 3, 1, DefaultRecord)
	if out := mustRun(t, ctx, densities, chain, s, nil); out.Stop != Interrupted || chain.Steps() != 0 {
		t.Errorf("cancelled before it began: %v after %d steps", out.Stop, chain.Steps())
	}
}

// looker is an observer that looks at the chain.
type looker struct {
	t     *testing.T
	chain *Chain
}

func (l looker) Advanced(_ int, rows View) error {
	all := l.chain.View()
	if n := rows.Steps(); n > 0 && all.Number(all.Steps()-1) != rows.Number(n-1) {
		l.t.Errorf("the chain is at step %d, the rows end at %d", all.Number(all.Steps()-1), rows.Number(n-1))
	}
	return nil
}

func (l looker) Checked(Check) {}

// While an observer has rows, the chain ends with them.
func TestObserverMayLookAtTheChain(t *testing.T) {
	chain, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
	mustRun(t, context.Background(), densities, chain, quick(), looker{t, chain})
}

func TestObserverErrorStopsRun(t *testing.T) {
	chain, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
	full := errors.New("no space left")
	r := &recorder{stop: func(step int) error {
		if step > 100 {
			return full
		}
		return nil
	}}
	out, err := Run(context.Background(), densities, chain, quick(), r)
	if !errors.Is(err, full) || out.Stop != Interrupted || out.Check.Step != chain.Steps() {
		t.Errorf("%v, %v at step %d of %d", err, out.Stop, out.Check.Step, chain.Steps())
	}
}

func TestRunStopsAtTheStepLimit(t *testing.T) {
	chain, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
	s := quick()
	s.MaxSteps = 137
	out := mustRun(t, context.Background(), densities, chain, s, nil)
	if out.Stop != StepLimit || chain.Steps() != 137 || out.Check.Converged {
		t.Errorf("%v at step %d", out.Stop, chain.Steps())
	}
	if out.Check.Evaluations != 138*4*8 {
		t.Errorf("%d evaluations, want %d", out.Check.Evaluations, 138*4*8)
	}
}

// The caller's own criterion is asked only once all else is met, and obeyed.
func TestEnoughIsObeyed(t *testing.T) {
	chain, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
	s, asked := quick(), 0
	s.Enough = func(v View) bool {
		asked++
		if ess := ESS(v.Coordinate(0)); ess < s.Effective {
			t.Errorf("asked with an effective sample size of %v", ess)
		}
		return asked == 3
	}
	r := &recorder{}
	out := mustRun(t, context.Background(), densities, chain, s, r)
	if out.Stop != Converged || asked != 3 {
		t.Errorf("%v after asking %d times", out.Stop, asked)
	}
}

// Ensembles in two wells that they cannot leave must never pass.
func TestSeparateEnsemblesDoNotConverge(t *testing.T) {
	wells := func(x []float64) float64 {
		d := min((x[0]-30)*(x[0]-30), (x[0]+30)*(x[0]+30))
		return -(d + x[1]*x[1]) / 2
	}
	start := make([][]float64, 4)
	for m := range start {
		start[m] = normals(uint64(m), 64)
		for k := 0; k < 64; k += 2 {
			start[m][k] += 30 - 60*float64(m%2)
		}
	}
	c, err := NewChain(2, start, 1, DefaultRecord)
	if err != nil {
		t.Fatal(err)
	}
	s := Settings{Seed: 1, Effective: 10, MaxSteps: 1000}
	out := mustRun(t, context.Background(), []Density{wells, wells, wells, wells}, c, s, nil)
	if out.Stop != StepLimit || !(out.Check.RHat() > 1.5) || !(out.Check.ESS() < 5) {
		t.Errorf("%v with R-hat %v and ESS %v", out.Stop, out.Check.RHat(), out.Check.ESS())
	}
}

// The schedule depends on the step alone: it is the same from wherever it is
// asked.
func TestChecksAreDueAtFixedSteps(t *testing.T) {
	for _, every := range []int{1, 3, 100} {
		last := 0
		for step := range 20000 {
			due := dueAt(step, every)
			if due < step || due%every != 0 || dueAt(due, every) != due {
				t.Fatalf("every %d: check due at %d for step %d", every, due, step)
			}
			if due != last && last > 0 {
				growth, most := float64(due-last)/float64(last), 0.5
				if last >= hardlyLong {
					most = 0.2
				}
				if last > 100*every && (growth < 0.1 || growth > most) {
					t.Errorf("every %d: checks at %d and %d", every, last, due)
				}
			}
			last = due
		}
	}
}

func TestRunNeedsADensityPerEnsemble(t *testing.T) {
	chain, densities := small().newChain(t, 4, 3, 1, DefaultRecord)
	if _, err := Run(context.Background(), densities[:3], chain, quick(), nil); err == nil {
		t.Error("no error for 3 densities and 4 ensembles")
	}
}
