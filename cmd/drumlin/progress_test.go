package main

import (
	"bytes"
	"os"
	"strings"
	"sync"
	"testing"
)

// screen shows what a terminal would show after text: the last line, as carriage returns overwrite it.
func screen(text string) string {
	var cells []rune
	at := 0
	for _, r := range text {
		if r == '\r' {
			at = 0
			continue
		}
		if at == len(cells) {
			cells = append(cells, r)
		} else {
			cells[at] = r
		}
		at++
	}
	return strings.TrimRight(string(cells), " ")
}

func TestProgress(t *testing.T) {
	var b bytes.Buffer
	p := &progress{w: &b, columns: 30}
	steps := []struct {
		do   func()
		want string
	}{
		{func() { p.Stage("reading", 0, 0) }, "reading"},
		{func() { p.Stage("choosing smoothness", 1, 8) }, "choosing smoothness  12 %"},
		{func() { p.Stage("fit", 3, 3) }, "fit 100 %"},
		{func() { p.within("map 1 of 2"); p.Stage("pictures", 1, 3) }, "map 1 of 2: pictures  33 %"},
		{func() { p.Stage("a stage with a very long name", 1, 3) }, "map 1 of 2: a stage with a ve"},
		{func() { p.within(""); p.Stage("größer", 0, 1) }, "größer"},
		{func() { p.clear() }, ""},
		{func() { p.clear() }, ""},
	}
	for _, step := range steps {
		step.do()
		if got := screen(b.String()); got != step.want {
			t.Errorf("the screen shows %q, want %q", got, step.want)
		}
	}
	if !strings.HasSuffix(b.String(), "\r") {
		t.Error("what comes next would not begin at the margin")
	}
	if strings.Contains(b.String(), "\n") {
		t.Error("the line is not one line")
	}
}

func TestProgressWritesNoMoreThanItMust(t *testing.T) {
	var b bytes.Buffer
	p := &progress{w: &b, columns: 80}
	for i := range 100000 {
		p.Stage("predict", i, 100000)
	}
	if n := strings.Count(b.String(), "\r"); n != 100 {
		t.Errorf("the line was written %d times", n)
	}
}

func TestProgressIsSilentElsewhere(t *testing.T) {
	null, err := os.OpenFile(os.DevNull, os.O_WRONLY, 0)
	if err != nil {
		t.Fatal(err)
	}
	defer null.Close()
	for name, p := range map[string]*progress{
		"a buffer": newProgress(&bytes.Buffer{}, false), "a file": newProgress(null, false), "quiet": newProgress(null, true),
	} {
		p.Stage("fit", 1, 2)
		p.clear()
		if p.w != nil || p.shown != "" {
			t.Errorf("%s is written to", name)
		}
	}
}

func TestProgressFromManySides(t *testing.T) {
	var b bytes.Buffer
	p := &progress{w: &b, columns: 80}
	var group sync.WaitGroup
	for range 4 {
		group.Go(func() {
			for i := range 200 {
				p.Stage("predict", i, 200)
			}
		})
	}
	group.Wait()
	p.clear()
	if got := screen(b.String()); got != "" {
		t.Errorf("the screen shows %q", got)
	}
}
