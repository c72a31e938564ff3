// Package chainfile keeps the chain of a run in a folder such that a run
// can be killed at any moment and go on as if nothing had happened.
//
// The folder holds
//
//	chain.csv   every recorded step: ensemble,step,walker,<parameters>,log_posterior
//	chain.sums  a checksum and the accepted moves of every recorded step
//	run.json    what the run was started from and how far it was at the last sync
//	run.lock    who is writing, while somebody is
//
// The first three are written in this order at every sync. The first line of
// chain.sums vouches for the header of chain.csv, every other for all that
// stands there up to one recorded step: a step is confirmed byte for byte or
// not used at all. Both files depend on nothing but the run and its steps, so
// those of a run that was killed and resumed are those of an undisturbed one.
//
// To start:  [Acquire], [Create], [Writer.Append] …, [Writer.Close].
// To resume: [Acquire], [ReadState], [Compare], [Recover], [Resume], ….
// To look:   [ReadState] and [Running], at any time and without the lock.
package chainfile

import (
	"encoding/binary"
	"encoding/hex"
	"fmt"
	"hash/crc64"
	"strconv"
	"strings"
)

// The files of a run, in its folder.
const (
	ChainName = "chain.csv"
	SumsName  = "chain.sums"
	StateName = "run.json"
	LockName  = "run.lock"
	CutName   = "chain.csv.cut" // what Resume cut off a damaged chain
)

// Format is the version of chain.csv and chain.sums. It is part of [Run] and
// must grow with any change to either file, to the fields of Run or to the
// way random numbers are drawn: a chain is never continued across it.
const Format = 2

// Step is the state of every walker after one step.
type Step struct {
	Number   int         // steps completed; recorded are Every, 2·Every, …
	Accepted int         // moves accepted since the recorded step before; negative if not known
	X        [][]float64 // for each ensemble walkers × parameters, row by row
	LogP     [][]float64 // for each ensemble the log-posterior of each walker
}

// newStep allocates a step of the run's shape.
func (r Run) newStep() Step {
	s := Step{X: make([][]float64, r.Ensembles), LogP: make([][]float64, r.Ensembles)}
	for e := range r.Ensembles {
		s.X[e] = make([]float64, r.Walkers*len(r.Parameters))
		s.LogP[e] = make([]float64, r.Walkers)
	}
	return s
}

func (r Run) header() []byte {
	return []byte("ensemble,step,walker," + strings.Join(r.Parameters, ",") + ",log_posterior\n")
}

// maxRow bounds the length of a row: 3 integers and the floats.
func (r Run) maxRow() int { return 3*21 + 25*(len(r.Parameters)+1) }

// appendStep formats the rows of s; the floats read back exactly.
func (r Run) appendStep(b []byte, s Step) []byte {
	dim := len(r.Parameters)
	for e := range r.Ensembles {
		for w, logp := range s.LogP[e] {
			b = appendKey(b, e, s.Number, w)
			for _, v := range s.X[e][w*dim : (w+1)*dim] {
				b = append(strconv.AppendFloat(b, v, 'g', -1, 64), ',')
			}
			b = append(strconv.AppendFloat(b, logp, 'g', -1, 64), '\n')
		}
	}
	return b
}

func appendKey(b []byte, ensemble, step, walker int) []byte {
	b = append(strconv.AppendInt(b, int64(ensemble), 10), ',')
	b = append(strconv.AppendInt(b, int64(step), 10), ',')
	return append(strconv.AppendInt(b, int64(walker), 10), ',')
}

// parseStep fills s from the rows in text, the inverse of appendStep. It
// returns the index of the first bad row and what is wrong with it.
func (r Run) parseStep(text string, s Step) (int, error) {
	dim := len(r.Parameters)
	var key []byte
	for i := range r.Ensembles * r.Walkers {
		e, w := i/r.Walkers, i%r.Walkers
		row, rest, _ := strings.Cut(text, "\n")
		text = rest
		key = appendKey(key[:0], e, s.Number, w)
		numbers, ok := strings.CutPrefix(row, string(key))
		if !ok {
			return i, fmt.Errorf("found %q, expected a row beginning %q", clip(row), key)
		}
		var err error
		if s.LogP[e][w], err = parseRow(numbers, s.X[e][w*dim:(w+1)*dim]); err != nil {
			return i, err
		}
	}
	return 0, nil
}

// parseRow reads the parameters into x and returns the number after them.
func parseRow(text string, x []float64) (logp float64, err error) {
	if n := strings.Count(text, ","); n != len(x) {
		return 0, fmt.Errorf("found %d numbers in %q, expected %d", n+1, clip(text), len(x)+1)
	}
	for j := range x {
		field, rest, _ := strings.Cut(text, ",")
		if x[j], err = parseNumber(field); err != nil {
			return 0, err
		}
		text = rest
	}
	return parseNumber(text)
}

func parseNumber(text string) (float64, error) {
	v, err := strconv.ParseFloat(text, 64)
	if err != nil || !finite(v) {
		return 0, fmt.Errorf("found %q, expected a finite number", clip(text))
	}
	return v, nil
}

func finite(v float64) bool { return v-v == 0 }

// clip shortens what a damaged file holds to what fits in a message.
func clip(s string) string {
	if len(s) > 40 {
		return s[:37] + "..."
	}
	return s
}

// sum is the running checksum of a chain, CRC-64 with the ECMA-182
// polynomial: any change confined to eight neighbouring bytes of a step is
// detected for certain, any other with probability 1 - 2⁻⁶⁴.
type sum uint64

var table = crc64.MakeTable(crc64.ECMA)

func (c sum) add(b []byte) sum { return sum(crc64.Update(uint64(c), table, b)) }

// next extends the checksum by the rows of a step and its accepted moves.
func (c sum) next(rows []byte, accepted int) sum {
	var n [8]byte
	binary.BigEndian.PutUint64(n[:], uint64(accepted))
	return c.add(rows).add(n[:])
}

// record is one line of chain.sums.
type record struct {
	sum      sum
	accepted int
}

const recordLen = 16 + 1 + 16 + 1

func (r record) append(b []byte) []byte {
	var n [8]byte
	binary.BigEndian.PutUint64(n[:], uint64(r.sum))
	b = append(hex.AppendEncode(b, n[:]), ' ')
	binary.BigEndian.PutUint64(n[:], uint64(r.accepted))
	return append(hex.AppendEncode(b, n[:]), '\n')
}

// parseRecord is the inverse of append; b is recordLen long.
func parseRecord(b []byte) (r record, ok bool) {
	var n [16]byte
	_, err1 := hex.Decode(n[:8], b[:16])
	_, err2 := hex.Decode(n[8:], b[17:33])
	r = record{sum(binary.BigEndian.Uint64(n[:8])), int(binary.BigEndian.Uint64(n[8:]))}
	return r, err1 == nil && err2 == nil && b[16] == ' ' && b[33] == '\n'
}
