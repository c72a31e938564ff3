package sampler

import (
	"context"
	"fmt"
	"time"
)

// Settings of a run. [DefaultSettings] are a good start.
type Settings struct {
	Seed      uint64
	Effective float64 // goal: effective sample size of every parameter; 0 for none
	MaxSteps  int     // steps at most, rounded up to a recorded one; 0 for no limit
	Threads   int     // ensembles that run at the same time; 0 for one per processor

	// Enough, if set, is one more thing a chain must show before the run is
	// done: it gets the sample of a [Check] once all else is met, and must be a
	// function of that alone.
	Enough func(View) bool
}

// DefaultSettings returns seed 1, 4000 effective samples, a million steps.
func DefaultSettings() Settings {
	return Settings{Seed: 1, Effective: 4000, MaxSteps: 1e6}
}

// Observer watches a run. Its methods are called one at a time; the ensembles go on
// while Advanced works, at most until it would be called again.
type Observer interface {
	// Advanced gets the rows recorded since the last call, valid only during
	// the call; there may be none. step is where the run is; the chain already
	// holds the rows. How many rows come at a time depends on the clock; the
	// rows, and their order, do not. An error stops the run.
	Advanced(step int, rows View) error
	// Checked gets the convergence at every check. Checks come at steps that
	// depend on the step number alone.
	Checked(Check)
}

// Stop says why a run ended.
type Stop uint8

// Reasons for the end of a run.
const (
	Interrupted Stop = iota // its context was cancelled, or an observer failed
	Converged               // the goal is met
	StepLimit               // MaxSteps are done and the goal is not met
)

func (s Stop) String() string {
	switch s {
	case Interrupted:
		return "interrupted"
	case Converged:
		return "converged"
	case StepLimit:
		return "step limit"
	}
	return fmt.Sprintf("Stop(%d)", uint8(s))
}

// Outcome is how a run ended. The chain itself is where Run was given it.
type Outcome struct {
	Stop  Stop
	Check Check // of the chain as it is
}

// Run takes a chain on from its last complete step until the goal is met, the
// steps are used up, or the context is cancelled, which ends the run after the
// step or few that are under way. Each ensemble has a density of its own.
//
// The chain that results depends on the seed, the start and the step it ends at;
// where it ends depends on the settings and the chain, unless it is
// interrupted. A run that was interrupted any number of times ends with the same
// chain as one that was not. It is an error if a walker starts where the density
// is not finite; an error of the observer is returned as it is, and the chain
// remains valid.
func Run(ctx context.Context, densities []Density, c *Chain, s Settings, o Observer) (Outcome, error) {
	r, err := newRunner(densities, c, s, o)
	if err != nil {
		return Outcome{}, err
	}
	outcome, err := r.run(ctx)
	if late := r.settle(); err == nil && late != nil {
		outcome.Stop, err = Interrupted, late
	}
	return outcome, err
}

// run takes the chain to where the run ends.
func (r *runner) run(ctx context.Context) (Outcome, error) {
	c, s := r.chain, r.settings
	for next := dueAt(r.step, c.every); ; {
		last := r.limit > 0 && r.step >= r.limit
		if r.step == next || last {
			check, err := r.check(last)
			switch {
			case err != nil:
				return Outcome{Interrupted, check}, err
			case check.Converged:
				return Outcome{Converged, check}, nil
			case last:
				return Outcome{StepLimit, check}, nil
			}
			next = dueAt(r.step+1, c.every)
		}
		if ctx.Err() != nil {
			return Outcome{Interrupted, Assess(c, s)}, nil
		}
		if err := r.block(next); err != nil {
			return Outcome{Interrupted, Assess(c, s)}, err
		}
	}
}

const (
	firstCheck = 50 // the step of the first check
	earlyRatio = 1.5
	checkRatio = 1.15 // from one check to the next, once a chain may be long enough
	hardlyLong = 400  // before that it hardly is
)

// dueAt returns the first step not before the given one at which a chain is
// checked. Checks come at steps that grow by checkRatio, rounded up to recorded
// ones: all checks together cost less than eight times the last, however long
// the run, and a run goes on for 7% longer than it must on average. All but the
// last two or three are glances.
func dueAt(step, every int) int {
	up := func(n int) int { return (n + every - 1) / every * every }
	due := up(firstCheck)
	for due < step {
		ratio := checkRatio
		if due < hardlyLong {
			ratio = earlyRatio
		}
		due = up(max(due+1, int(float64(due)*ratio)))
	}
	return due
}

// runner is a run under way.
type runner struct {
	chain     *Chain
	settings  Settings
	observer  Observer
	ensembles []*Ensemble
	step      int // of the ensembles; the chain may be behind by less than one record
	limit     int // steps, 0 for none
	stride    int // steps in the next block
	records   []record
	before    []int // proposals that each ensemble had accepted at its last record

	// The observer reads one block's records while the next are made.
	handed chan error // its answer to the last block, nil if it has none
	spare  []record
}

// record is what one ensemble recorded in a block.
type record struct {
	x, logp  []float64
	accepted []int // at each recorded step, since the ensemble was made
}

func newRunner(densities []Density, c *Chain, s Settings, o Observer) (*runner, error) {
	if len(densities) != len(c.x) {
		return nil, fmt.Errorf("sampler: %d densities for %d ensembles", len(densities), len(c.x))
	}
	r := &runner{
		chain:     c,
		settings:  s,
		observer:  o,
		ensembles: make([]*Ensemble, len(densities)),
		step:      c.last,
		limit:     (s.MaxSteps + c.every - 1) / c.every * c.every,
		stride:    1,
		records:   make([]record, len(densities)),
		spare:     make([]record, len(densities)),
		before:    make([]int, len(densities)),
	}
	for m, d := range densities {
		if c.lastP != nil {
			r.ensembles[m] = restore(d, s.Seed, m, c.dim, c.last, c.lastX[m], c.lastP[m])
			continue
		}
		e, err := NewEnsemble(d, s.Seed, m, c.dim, c.lastX[m])
		if err != nil {
			return nil, err
		}
		r.ensembles[m] = e
	}
	return r, nil
}

// check judges the chain, in full only where a glance leaves it open or nothing
// follows, and tells the observer.
func (r *runner) check(last bool) (Check, error) {
	check := glance(r.chain, r.settings)
	if last || !check.hopeless(r.settings) {
		check = Assess(r.chain, r.settings)
	}
	if err := r.settle(); err != nil {
		return check, err
	}
	if r.observer != nil {
		r.observer.Checked(check)
	}
	return check, nil
}

// Blocks between which a run looks up, to record, report and stop, take about
// this long, and no more numbers than blockNumbers.
const (
	blockTime    = 50 * time.Millisecond
	blockNumbers = 1 << 18
)

// block takes all ensembles on by some steps, at most to the step given, and
// hands over what they recorded.
func (r *runner) block(to int) error {
	if r.limit > 0 {
		to = min(to, r.limit)
	}
	n := min(r.stride, to-r.step)
	began := time.Now()
	each(len(r.ensembles), r.settings.Threads, func(m int) {
		r.records[m].run(r.ensembles[m], n, r.chain.every)
	})
	r.pace(time.Since(began))
	first := r.step - r.step%r.chain.every + r.chain.every
	r.step += n
	rows := r.rows(first)
	if err := r.settle(); err != nil { // the observer may look at the chain until then
		return err
	}
	if err := r.append(rows); err != nil {
		return err
	}
	r.hand(rows)
	return nil
}

// hand gives the observer what a block recorded, without waiting for it.
func (r *runner) hand(rows View) {
	if r.observer == nil {
		return
	}
	step, handed := r.step, make(chan error, 1)
	r.handed = handed
	r.records, r.spare = r.spare, r.records
	go func() { handed <- r.observer.Advanced(step, rows) }()
}

// settle waits for the observer's answer to the last block.
func (r *runner) settle() error {
	if r.handed == nil {
		return nil
	}
	err := <-r.handed
	r.handed = nil
	return err
}

// run takes an ensemble on by n steps and records those that are due.
func (b *record) run(e *Ensemble, n, every int) {
	b.x, b.logp, b.accepted = b.x[:0], b.logp[:0], b.accepted[:0]
	for range n {
		e.Step()
		if e.step%every == 0 {
			b.x = append(b.x, e.x...)
			b.logp = append(b.logp, e.logp...)
			b.accepted = append(b.accepted, e.accepted)
		}
	}
}

// pace adapts the length of the blocks to how long one took.
func (r *runner) pace(took time.Duration) {
	most := max(1, blockNumbers*r.chain.every/r.chain.numbersPerStep())
	switch {
	case took < blockTime/2:
		r.stride = min(2*r.stride, most)
	case took > 2*blockTime:
		r.stride = max(1, r.stride/2)
	}
}

// rows is a view of the records of a block.
func (r *runner) rows(first int) View {
	v := View{
		dim:     r.chain.dim,
		walkers: r.chain.walkers,
		first:   first,
		spacing: r.chain.every,
		stride:  1,
		n:       len(r.records[0].accepted),
	}
	v.accepted = make([]int, v.n)
	for m := range r.records {
		b := &r.records[m]
		v.x = append(v.x, b.x)
		v.logp = append(v.logp, b.logp)
		for i, total := range b.accepted {
			v.accepted[i] += total - r.before[m]
			r.before[m] = total
		}
	}
	return v
}

// append adds the records of a block to the chain.
func (r *runner) append(rows View) error {
	for i := range rows.n {
		x, logp := rows.Step(i)
		if err := r.chain.Append(rows.Number(i), x, logp, rows.Accepted(i)); err != nil {
			return err
		}
	}
	return nil
}
