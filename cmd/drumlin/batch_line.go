package main

import (
	"fmt"
	"io"
	"sync"
	"time"

	"drumlin/cmd/internal/batch"
)

// batchLine tells how far a batch is: one line on a terminal, and plain lines elsewhere, few enough for a log of
// thousands of regions.
type batchLine struct {
	line  *progress
	plain io.Writer // nil on a terminal and where nothing is to be told
	now   func() time.Time

	mu   sync.Mutex
	next time.Time // of the next plain line
}

var _ batch.Events = (*batchLine)(nil)

// pause is the time between two plain lines that only count.
const pause = 15 * time.Second

func newBatchLine(stderr io.Writer, quiet bool) *batchLine {
	b := &batchLine{line: newProgress(stderr, quiet), now: time.Now}
	if b.line.w == nil && !quiet {
		b.plain = stderr
	}
	b.next = b.now().Add(pause)
	return b
}

// Stage shows a stage that is not that of the regions' own runs.
func (b *batchLine) Stage(name string, done, total int) { b.line.Stage(name, done, total) }

// Region counts a region that is done. One that failed or carries a stop gets a line of its own.
func (b *batchLine) Region(l batch.Line, t batch.Tally) {
	text := fmt.Sprintf("regions %d of %d", t.Done, t.Regions)
	if t.Failed > 0 {
		text += fmt.Sprintf(", %d failed", t.Failed)
	}
	if left, ok := timeLeft(t, b.now()); ok {
		text += ", " + left + " left"
	}
	switch {
	case l.Status == batch.Failed:
		b.Note(batch.Shown(l.Region) + " failed: " + l.Reason)
	case l.Status == batch.Stop:
		b.Note(batch.Shown(l.Region) + " is not to be used: " + l.WorstCheck)
	}
	b.line.Stage(text, 0, 0)
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.plain != nil && (t.Done == t.Regions || b.now().After(b.next)) {
		fmt.Fprintln(b.plain, text)
		b.next = b.now().Add(pause)
	}
}

// Note writes a line that stays.
func (b *batchLine) Note(text string) {
	b.mu.Lock()
	defer b.mu.Unlock()
	if b.plain != nil {
		fmt.Fprintln(b.plain, text)
		return
	}
	b.line.above(text)
}

func (b *batchLine) clear() { b.line.clear() }

// timeLeft judges by the size of the input that is done and that is not. There is nothing to judge by before the first
// region is fitted.
func timeLeft(t batch.Tally, now time.Time) (string, bool) {
	left := t.Work - t.WorkDone
	if t.WorkFresh == 0 || left <= 0 {
		return "", false
	}
	d := time.Duration(float64(now.Sub(t.Since)) * float64(left) / float64(t.WorkFresh))
	switch {
	case d < 90*time.Second:
		return fmt.Sprintf("%d s", int(d.Seconds())+1), true
	case d < 90*time.Minute:
		return fmt.Sprintf("%d min", int(d.Minutes()+0.5)), true
	}
	return fmt.Sprintf("%.1f h", d.Hours()), true
}
