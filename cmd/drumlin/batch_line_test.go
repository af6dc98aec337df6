package main

import (
	"bytes"
	"fmt"
	"strings"
	"sync"
	"testing"
	"time"

	"drumlin/cmd/internal/batch"
)

// clock is a time that the test moves.
type clock struct{ time.Time }

func (c *clock) now() time.Time        { return c.Time }
func (c *clock) after(d time.Duration) { c.Time = c.Add(d) }
func started() *clock                  { return &clock{time.Date(2031, 5, 4, 3, 2, 1, 0, time.UTC)} }
func onTerminal(w *bytes.Buffer, c *clock) *batchLine {
	return &batchLine{line: &progress{w: w, columns: 60}, now: c.now}
}

func TestTimeLeft(t *testing.T) {
	since := started().Time
	for _, c := range []struct {
		name              string
		done, fresh, work int64
		gone              time.Duration
		want              string
	}{
		{"nothing is fitted yet", 0, 0, 1000, time.Minute, ""},
		{"only what was there already", 400, 0, 1000, time.Minute, ""},
		{"all is done", 1000, 600, 1000, time.Minute, ""},
		{"a quarter", 250, 250, 1000, 10 * time.Second, "31 s"},
		{"a tenth of what has to be fitted", 550, 50, 1000, 9 * time.Second, "82 s"},
		{"less than a second", 999, 999, 1000, time.Second, "1 s"},
		{"not yet minutes", 500, 500, 1000, 89 * time.Second, "90 s"},
		{"minutes", 500, 500, 1000, 90 * time.Second, "2 min"},
		{"minutes, rounded", 500, 500, 1000, 12*time.Minute + 29*time.Second, "12 min"},
		{"not yet hours", 500, 500, 1000, 89 * time.Minute, "89 min"},
		{"hours", 500, 500, 1000, 90 * time.Minute, "1.5 h"},
		{"a night", 100, 100, 1000, time.Hour, "9.0 h"},
		{"sizes beyond 32 bits", 1 << 40, 1 << 40, 3 << 40, time.Hour, "2.0 h"},
	} {
		got, known := timeLeft(batch.Tally{WorkDone: c.done, WorkFresh: c.fresh, Work: c.work, Since: since}, since.Add(c.gone))
		if got != c.want || known != (c.want != "") {
			t.Errorf("%s: %q, %v, want %q", c.name, got, known, c.want)
		}
	}
}

// TestBatchLine: on a terminal one line tells how many regions are done, how many have failed and how long it will take;
// failures stay above it.
func TestBatchLine(t *testing.T) {
	var b bytes.Buffer
	c := started()
	line := onTerminal(&b, c)
	tally := batch.Tally{Regions: 4, Work: 4000, Since: c.Time}
	region := func(l batch.Line, fresh bool) func() {
		return func() {
			tally.Done, tally.WorkDone = tally.Done+1, tally.WorkDone+1000
			if fresh {
				tally.WorkFresh += 1000
			}
			if l.Status == batch.Failed {
				tally.Failed++
			}
			line.Region(l, tally)
		}
	}
	for _, step := range []struct {
		do   func()
		want string // on the last line
	}{
		{func() { line.Stage("reading the plan", 0, 0) }, "reading the plan"},
		{region(batch.Line{Region: "ash", Status: batch.Unchanged}, false), "regions 1 of 4"},
		{func() { c.after(10 * time.Second) }, "regions 1 of 4"},
		{region(batch.Line{Region: "birch", Status: batch.Done}, true), "regions 2 of 4, 21 s left"},
		{region(batch.Line{Region: "ced\x1b[2Jar", Status: batch.Failed, Reason: "its table is empty"}, true), "regions 3 of 4, 1 failed, 6 s left"},
		{region(batch.Line{Region: "elm", Status: batch.Stop, Figures: batch.Figures{WorstCheck: "rows set aside"}}, true), "regions 4 of 4, 1 failed"},
		{func() { line.Stage("drawing", 1, 2) }, "drawing  50 %"},
		{func() { line.Note("the last line of the ledger was dropped") }, "drawing  50 %"},
		{line.clear, ""},
	} {
		step.do()
		lines := strings.Split(b.String(), "\n")
		if got := screen(lines[len(lines)-1]); got != step.want {
			t.Errorf("the line is %q, want %q", got, step.want)
		}
	}
	var above []string
	lines := strings.Split(b.String(), "\n")
	for _, l := range lines[:len(lines)-1] {
		above = append(above, screen(l))
	}
	want := []string{`"ced\x1b[2Jar" failed: its table is empty`, "elm is not to be used: rows set aside", "the last line of the ledger was dropped"}
	if strings.Join(above, "\n") != strings.Join(want, "\n") {
		t.Errorf("above the line stand %q, want %q", above, want)
	}
	if strings.Contains(b.String(), "\x1b") {
		t.Error("a name of a region acts on the terminal")
	}
}

// TestBatchLinePlain: elsewhere failures have a line each, and the count one every 15 seconds and at the end.
func TestBatchLinePlain(t *testing.T) {
	var b bytes.Buffer
	c := started()
	line := newBatchLine(&b, false)
	line.now, line.next = c.now, c.Add(pause)
	line.Stage("reading the plan", 0, 0)
	tally := batch.Tally{Regions: 100, Work: 100, Since: c.Time}
	for k := range tally.Regions {
		c.after(time.Second)
		l := batch.Line{Region: fmt.Sprint("vale ", k), Status: batch.Done}
		tally.Done, tally.WorkDone, tally.WorkFresh = k+1, int64(k+1), int64(k+1)
		if k == 20 {
			l.Status, l.Reason = batch.Failed, "no rows"
			tally.Failed++
		}
		line.Region(l, tally)
	}
	line.Stage("drawing", 1, 2)
	line.clear()
	want := "regions 16 of 100, 85 s left\nvale 20 failed: no rows\nregions 32 of 100, 1 failed, 69 s left\nregions 48 of 100, 1 failed, 53 s left\n" +
		"regions 64 of 100, 1 failed, 37 s left\nregions 80 of 100, 1 failed, 21 s left\nregions 96 of 100, 1 failed, 5 s left\nregions 100 of 100, 1 failed\n"
	if b.String() != want {
		t.Errorf("told:\n%swant:\n%s", b.String(), want)
	}
}

func TestBatchLineQuiet(t *testing.T) {
	var b bytes.Buffer
	line := newBatchLine(&b, true)
	line.Stage("reading the plan", 0, 0)
	line.Note("something found")
	line.Region(batch.Line{Region: "ash", Status: batch.Failed, Reason: "no rows"}, batch.Tally{Regions: 1, Done: 1, Failed: 1})
	line.clear()
	if b.Len() > 0 {
		t.Errorf("told: %q", b.String())
	}
}

// TestBatchLineFromManySides is for the race detector: stages may come from the drawing while a note is written.
func TestBatchLineFromManySides(t *testing.T) {
	var b bytes.Buffer
	line := onTerminal(&b, started())
	var group sync.WaitGroup
	for k := range 4 {
		group.Go(func() {
			for i := range 100 {
				line.Stage("drawing", i, 100)
				line.Region(batch.Line{Region: fmt.Sprint(k), Status: batch.Failed}, batch.Tally{Regions: 400, Done: i})
			}
		})
	}
	group.Wait()
	line.clear()
	lines := strings.Split(b.String(), "\n")
	if n := len(lines) - 1; n != 400 || screen(lines[n]) != "" {
		t.Errorf("%d lines stand above %q", n, screen(lines[n]))
	}
}
