package progress

import (
	"io"
	"sync"
	"time"
)

// Tasks tells of work that has no steps to count, if it takes long: on a terminal
// while it lasts, in a log as a line.
type Tasks struct {
	w        io.Writer
	kind     Kind
	patience time.Duration // before anything is told
}

// NewTasks returns tasks that are told to w in the way of kind.
func NewTasks(w io.Writer, kind Kind) *Tasks {
	t := &Tasks{w: w, kind: kind, patience: time.Second}
	if kind == Lines {
		t.patience = firstLine
	}
	return t
}

// Begin begins a task; call what it returns when the task ends.
func (t *Tasks) Begin(what string) (end func()) {
	if t.kind == Silent {
		return func() {}
	}
	var lock sync.Mutex
	told, over := false, false
	timer := time.AfterFunc(t.patience, func() {
		lock.Lock()
		defer lock.Unlock()
		if !over {
			told = true
			io.WriteString(t.w, what+t.ending())
		}
	})
	return func() {
		timer.Stop()
		lock.Lock()
		defer lock.Unlock()
		if told && !over && t.kind == Bar {
			io.WriteString(t.w, eraseLine)
		}
		over = true
	}
}

func (t *Tasks) ending() string {
	if t.kind == Bar {
		return " ..."
	}
	return "\n"
}
