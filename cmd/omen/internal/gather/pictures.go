package gather

import (
	"fmt"
	"sync"

	"omen/cmd/omen/internal/figure"
)

// Picture is one figure of a run.
type Picture struct {
	Name    string // of its files, and what --only knows it by
	Title   string
	Caption string // what it shows, in words
	Alt     string // what it says, with the numbers
	Wide    bool   // cannot be read at the width of a column
	Why     string // why there is no such figure of this run; the rest is then empty

	draw  func(figure.Width) (*figure.Figure, error)
	lock  sync.Mutex
	drawn map[figure.Width]*figure.Figure
}

// Draw draws the figure, once for each width: the density estimates behind it
// serve all formats.
func (p *Picture) Draw(w figure.Width) (*figure.Figure, error) {
	p.lock.Lock()
	defer p.lock.Unlock()
	if f := p.drawn[w]; f != nil {
		return f, nil
	}
	f, err := p.draw(w)
	if err != nil {
		return nil, err
	}
	if p.drawn == nil {
		p.drawn = map[figure.Width]*figure.Figure{}
	}
	p.drawn[w] = f
	return f, nil
}

// picture makes one figure of a run: its caption and input, or why there is none.
type picture struct {
	name, title string
	make        func(*Run) (*Picture, error)
}

func pictures() []picture {
	return []picture{
		{"hubble", "Hubble diagram", (*Run).hubble},
		{"plane", "Matter and dark energy", (*Run).plane},
		{"marginals", "Marginal posteriors", (*Run).marginals},
		{"history", "Expansion history", (*Run).history},
		{"fates", "Probability of each fate", (*Run).fates},
		{"convergence", "Convergence", (*Run).convergence},
	}
}

// Names lists the figures that there can be.
func Names() []string {
	var out []string
	for _, p := range pictures() {
		out = append(out, p.name)
	}
	return out
}

// Pictures makes the named figures, or all if there is no name, several at a
// time.
func (r *Run) Pictures(only []string) ([]*Picture, error) {
	var chosen []picture
	for _, p := range pictures() {
		if len(only) == 0 || contains(only, p.name) {
			chosen = append(chosen, p)
		}
	}
	out := make([]*Picture, len(chosen))
	errs := make([]error, len(chosen))
	var wait sync.WaitGroup
	for i, p := range chosen {
		wait.Go(func() {
			out[i], errs[i] = p.make(r)
			if errs[i] == nil {
				out[i].Name, out[i].Title = p.name, p.title
			}
		})
	}
	wait.Wait()
	for i, err := range errs {
		if err != nil {
			return nil, fmt.Errorf("figure %s: %w", chosen[i].name, err)
		}
	}
	return out, nil
}

func contains(list []string, s string) bool {
	for _, v := range list {
		if v == s {
			return true
		}
	}
	return false
}

// NewPicture is a figure from elsewhere.
func NewPicture(name, title, caption, alt string, wide bool, draw func(figure.Width) (*figure.Figure, error)) *Picture {
	return &Picture{Name: name, Title: title, Caption: caption, Alt: alt, Wide: wide, draw: draw}
}

// Absent is a figure that cannot be made, and why.
func Absent(name, title, why string) *Picture { return &Picture{Name: name, Title: title, Why: why} }

// absent is the picture of a run of which there is none.
func absent(format string, args ...any) *Picture { return &Picture{Why: fmt.Sprintf(format, args...)} }
