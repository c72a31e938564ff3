// Package progress shows how far a run is: as a bar that stays on the last
// line of a terminal, as one plain line a minute in a log, or not at all.
// No colour is ever used.
package progress

import (
	"io"
	"os"
	"strings"
	"sync"
	"time"

	"github.com/schollz/progressbar/v3"
	"golang.org/x/term"
)

// Kind is how progress is shown.
type Kind uint8

// The kinds of progress.
const (
	Silent Kind = iota
	Lines       // a plain line a minute
	Bar         // a live bar on a terminal
)

// Detect returns Silent if quiet is set, Bar if w is a terminal that can
// rewrite its last line, and Lines otherwise.
func Detect(w io.Writer, quiet bool) Kind {
	f, ok := w.(*os.File)
	switch {
	case quiet:
		return Silent
	case ok && term.IsTerminal(int(f.Fd())) && os.Getenv("TERM") != "dumb":
		return Bar
	}
	return Lines
}

const (
	frame     = 200 * time.Millisecond // between two bars
	firstLine = 5 * time.Second        // before the first plain line
	nextLine  = time.Minute            // between two plain lines
)

// The length of a bar, in columns. The shortest leaves room for all there is
// to say on a terminal of 80.
const (
	fullBar  = 30
	shortBar = 5
)

// Meter shows the progress of one run. Its methods may be called from
// several goroutines. A failure to write is ignored: a run must not end
// because the terminal it was started from has gone.
type Meter struct {
	w     io.Writer
	kind  Kind
	now   func() time.Time
	width func() int

	mu    sync.Mutex
	next  time.Duration // from last to the next output
	last  time.Time
	shown string // the bar on the screen
}

// New returns a meter that writes to w in the way of kind. Time counts from
// here.
func New(w io.Writer, kind Kind) *Meter {
	m := &Meter{w: w, kind: kind, now: time.Now, width: func() int { return columns(w) }}
	m.last = m.now()
	if kind == Lines {
		m.next = firstLine
	}
	return m
}

// columns is the width of the terminal behind w, 80 if there is none.
func columns(w io.Writer) int {
	if f, ok := w.(*os.File); ok {
		if width, _, err := term.GetSize(int(f.Fd())); err == nil && width > 0 {
			return width
		}
	}
	return 80
}

// Due reports whether Show would show something. Ask first if an update
// takes time to put together.
func (m *Meter) Due() bool {
	m.mu.Lock()
	defer m.mu.Unlock()
	return m.due()
}

func (m *Meter) due() bool {
	d := m.now().Sub(m.last)
	return m.kind != Silent && (d >= m.next || d < 0)
}

// Show shows u if it is time to.
func (m *Meter) Show(u Update) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.due() {
		m.show(u)
	}
}

func (m *Meter) show(u Update) {
	m.last = m.now()
	if m.kind == Lines {
		m.next = nextLine
		io.WriteString(m.w, u.String()+"\n")
		return
	}
	m.next = frame
	m.shown = bar(u, m.width()-1) // a full line would wrap on some terminals
	io.WriteString(m.w, eraseLine+m.shown)
}

const eraseLine = "\r\x1b[K"

// Message shows one or more lines of text, above the bar if there is one.
// A silent meter keeps them to itself.
func (m *Meter) Message(text string) {
	m.mu.Lock()
	defer m.mu.Unlock()
	text = strings.TrimRight(text, "\n") + "\n"
	switch m.kind {
	case Lines:
		io.WriteString(m.w, text)
	case Bar:
		io.WriteString(m.w, eraseLine+text+m.shown)
	}
}

// Close shows u whatever the time and leaves the cursor on a new line.
func (m *Meter) Close(u Update) {
	m.mu.Lock()
	defer m.mu.Unlock()
	if m.kind == Silent {
		return
	}
	m.show(u)
	if m.kind == Bar {
		io.WriteString(m.w, "\n")
		m.shown = ""
	}
}

// bar is u as one line of at most width columns, the bar itself as long as
// the words leave room for.
func bar(u Update, width int) string {
	const around = len(" 100% [] ")
	words := fit(u.words(), width-around-shortBar)
	length := min(fullBar, width-around-len([]rune(words)))
	if u.Goal < 1 || length < 1 {
		return string([]rune(words)[:min(len([]rune(words)), max(0, width))])
	}
	const whole = 1000
	b := progressbar.NewOptions64(whole,
		progressbar.OptionSetWriter(io.Discard),
		progressbar.OptionSetWidth(length),
		progressbar.OptionSetTheme(progressbar.Theme{Saucer: "#", SaucerPadding: ".", BarStart: "[", BarEnd: "]"}),
		progressbar.OptionSetPredictTime(false),
		progressbar.OptionShowDescriptionAtLineEnd(),
		progressbar.OptionSetDescription(words))
	b.Set64(min(whole, max(0, int64(whole*u.Done))))
	b.RenderBlank()
	return strings.Join(strings.Fields(b.String()), " ")
}
