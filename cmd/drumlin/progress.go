package main

import (
	"fmt"
	"io"
	"os"
	"strings"
	"sync"
	"unicode/utf8"

	"drumlin/cmd/internal/pipeline"

	"golang.org/x/term"
)

// progress is the one line that tells on a terminal how far the work is. It is safe for concurrent use.
type progress struct {
	w       io.Writer // nil says nothing
	columns int

	mu     sync.Mutex
	before string // what the work is part of
	shown  string
}

var _ pipeline.Events = (*progress)(nil)

// newProgress makes the line for stderr; it stays silent where stderr is not a terminal or quiet was asked for.
func newProgress(stderr io.Writer, quiet bool) *progress {
	f, ok := stderr.(*os.File)
	if quiet || !ok || !term.IsTerminal(int(f.Fd())) {
		return &progress{}
	}
	columns, _, err := term.GetSize(int(f.Fd()))
	if err != nil || columns < 20 {
		columns = 80
	}
	return &progress{w: f, columns: columns}
}

// within sets what stands before the stages that follow.
func (p *progress) within(name string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.before = name
}

// Stage shows the stage and how much of it is done; a total of 0 means that is not known.
func (p *progress) Stage(name string, done, total int) {
	p.mu.Lock()
	defer p.mu.Unlock()
	text := name
	if p.before != "" {
		text = p.before + ": " + name
	}
	if total > 1 {
		// In per cent, so that a stage of a million steps does not write a million lines.
		text += fmt.Sprintf(" %3d %%", int(100*float64(done)/float64(total)))
	}
	p.show(text)
}

// clear empties the line. It must be called before anything else is written to the terminal.
func (p *progress) clear() {
	p.mu.Lock()
	defer p.mu.Unlock()
	p.show("")
}

// above writes a text that stays, above the line.
func (p *progress) above(text string) {
	p.mu.Lock()
	defer p.mu.Unlock()
	if p.w == nil {
		return
	}
	line := p.shown
	p.show("")
	fmt.Fprintln(p.w, text)
	p.show(line)
}

// show replaces the line. What is left of a longer line is covered with blanks, which every terminal understands.
func (p *progress) show(text string) {
	if p.w == nil || text == p.shown {
		return
	}
	if letters := []rune(text); len(letters) >= p.columns {
		text = string(letters[:p.columns-1])
	}
	blanks := max(0, utf8.RuneCountInString(p.shown)-utf8.RuneCountInString(text))
	fmt.Fprint(p.w, "\r", text, strings.Repeat(" ", blanks))
	if text == "" {
		fmt.Fprint(p.w, "\r")
	}
	p.shown = text
}
