package chainfile

import (
	"bufio"
	"bytes"
	"errors"
	"fmt"
	"io"
	"os"
	"path/filepath"
)

// Recovered is the longest valid beginning of a chain.
type Recovered struct {
	Steps   int    // recorded steps in it
	Step    int    // the number of the last one, 0 if none
	Bytes   int64  // its length in chain.csv
	Dropped int64  // bytes in chain.csv after it
	Lost    int    // recorded steps after it that had once been safe
	Reason  string // why it ends where it does, empty if the chain is whole

	sum sum
}

// Notice tells the user what was dropped and why, in one line, or is empty
// when nothing was.
func (r Recovered) Notice() string {
	if r.Reason == "" {
		return ""
	}
	s := fmt.Sprintf("%s: used up to step %d; dropped the %d bytes after it: %s", ChainName, r.Step, r.Dropped, r.Reason)
	if r.Dropped == 0 {
		s = fmt.Sprintf("%s: used up to step %d, the end of the file: %s", ChainName, r.Step, r.Reason)
	}
	if r.Lost > 0 {
		s += fmt.Sprintf("; %d recorded steps are missing that had been safe: the file was changed or damaged since", r.Lost)
	}
	return s
}

// Recover reads the chain of the run in dir, whose state is s, and hands its
// recorded steps to visit one by one, as far as they are complete, well
// formed and confirmed by their checksums. The slices of a step are reused
// for the next. It changes nothing, and its memory does not depend on the length
// of the chain; an error of visit ends it and is returned.
//
// A chain of which not one step is left although some had been safe is
// refused with an error.
func Recover(dir string, s State, visit func(Step) error) (Recovered, error) {
	chain, err := os.Open(filepath.Join(dir, ChainName))
	if err != nil {
		return Recovered{}, err
	}
	defer chain.Close()
	sums, err := os.Open(filepath.Join(dir, SumsName))
	if err != nil {
		return Recovered{}, fmt.Errorf("%w: without it no row of %s can be trusted", err, ChainName)
	}
	defer sums.Close()
	if err := s.check(); err != nil {
		return Recovered{}, err
	}
	rec, err := recoverFrom(chain, sums, s.Run, visit)
	if err != nil {
		return rec, err
	}
	info, err := chain.Stat()
	if err != nil {
		return rec, err
	}
	rec.Dropped = info.Size() - rec.Bytes
	rec.Lost = max(0, (s.Step-rec.Step)/s.Every)
	if rec.Lost > 0 && rec.Reason == "" {
		rec.Reason = fmt.Sprintf("%s and %s both end there", ChainName, SumsName)
	}
	if rec.Steps == 0 && rec.Lost > 0 {
		return rec, fmt.Errorf("%s: not one step is valid, although %d had been recorded: %s; restore the folder from a copy, or start again in another",
			chain.Name(), rec.Lost, rec.Reason)
	}
	return rec, nil
}

// recoverFrom does the work of Recover on the contents of the two files.
func recoverFrom(chain, sums io.Reader, run Run, visit func(Step) error) (rec Recovered, err error) {
	r := newReader(chain, sums, run)
	for err = r.header(); err == nil; err = r.next() {
		if r.step.Number > 0 && visit != nil {
			if err := visit(r.step); err != nil {
				return rec, err
			}
		}
		rec = Recovered{Steps: r.step.Number / run.Every, Step: r.step.Number, Bytes: r.bytes, sum: r.sum}
	}
	var why damage
	switch {
	case errors.Is(err, io.EOF):
		return rec, nil
	case errors.As(err, &why):
		rec.Reason = string(why)
		return rec, nil
	}
	return rec, err
}

// damage is why a chain ends, as opposed to a failure to read it.
type damage string

func (d damage) Error() string { return string(d) }

func damaged(format string, a ...any) error { return damage(fmt.Sprintf(format, a...)) }

// reader walks through chain.csv and chain.sums side by side.
type reader struct {
	run         Run
	chain, sums *bufio.Reader
	step        Step
	sum         sum
	bytes       int64 // of chain.csv that are confirmed
	line        int   // of chain.csv, the last one read
	rows        []byte
}

func newReader(chain, sums io.Reader, run Run) *reader {
	return &reader{
		run:   run,
		chain: bufio.NewReaderSize(chain, max(1<<16, run.maxRow(), len(run.header()))),
		sums:  bufio.NewReaderSize(sums, 1<<14),
		step:  run.newStep(),
	}
}

func (r *reader) header() error {
	rec, err := r.confirmed()
	if err != nil {
		return err
	}
	r.rows = r.rows[:0]
	want := r.run.header()
	if err := r.readLine(len(want)); err != nil {
		return err
	}
	if !bytes.Equal(r.rows, want) {
		return damaged("line 1: found %q, expected %q", clip(string(r.rows)), want)
	}
	r.sum = r.run.seal()
	if rec != (record{sum: r.sum}) {
		return damaged("%s does not belong to this run", SumsName)
	}
	r.bytes = int64(len(want))
	return nil
}

// next reads one recorded step. It returns io.EOF where both files end.
func (r *reader) next() error {
	r.step.Number += r.run.Every
	rec, err := r.confirmed()
	if err != nil {
		return err
	}
	first := r.line + 1
	r.rows = r.rows[:0]
	for range r.run.Ensembles * r.run.Walkers {
		if err := r.readLine(r.run.maxRow()); err != nil {
			return err
		}
	}
	if row, err := r.run.parseStep(string(r.rows), r.step); err != nil {
		return damaged("line %d: %v", first+row, err)
	}
	if r.sum = r.sum.next(r.rows, rec.accepted); r.sum != rec.sum {
		return damaged("lines %d to %d: step %d does not match its checksum", first, r.line, r.step.Number)
	}
	r.step.Accepted = rec.accepted
	r.bytes += int64(len(r.rows))
	return nil
}

// confirmed reads the next record of chain.sums.
func (r *reader) confirmed() (record, error) {
	var b [recordLen]byte
	_, err := io.ReadFull(r.sums, b[:])
	if err == io.EOF || err == io.ErrUnexpectedEOF {
		return record{}, r.unconfirmed()
	}
	if err != nil {
		return record{}, err
	}
	rec, ok := parseRecord(b[:])
	if !ok {
		return record{}, damaged("%s: found %q for step %d, expected two hexadecimal numbers", SumsName, clip(string(b[:])), r.step.Number)
	}
	return rec, nil
}

// unconfirmed tells the clean end of a chain from rows that were on their
// way when the run stopped.
func (r *reader) unconfirmed() error {
	_, err := r.chain.Peek(1)
	if err != nil {
		return err // io.EOF above all
	}
	return damaged("the run was stopped before step %d was confirmed in %s", r.step.Number, SumsName)
}

// readLine appends a line of chain.csv, at most limit bytes, to r.rows.
func (r *reader) readLine(limit int) error {
	line, err := r.chain.ReadSlice('\n')
	switch {
	case err == io.EOF:
		return damaged("line %d: the file ends before step %d is complete", r.line+1, r.step.Number)
	case err == bufio.ErrBufferFull, err == nil && len(line) > limit:
		return damaged("line %d: found a line of more than %d bytes", r.line+1, limit)
	case err != nil:
		return err
	}
	r.line++
	r.rows = append(r.rows, line...)
	return nil
}
