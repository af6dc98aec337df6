package batch

import (
	"fmt"
	"io"
	"path/filepath"
	"strconv"
	"strings"
	"unicode"
)

// named bounds how many regions of a kind are named in the summary in words; the rest stand in regions.csv.
const named = 12

// WriteWords tells what came of a batch.
func (r Report) WriteWords(w io.Writer, out string) error {
	var text strings.Builder
	t := r.Tally
	parts := []string{fmt.Sprintf("%d done", t.Done-t.Failed)}
	for _, p := range []struct {
		n    int
		what string
	}{{t.Unchanged, "unchanged since an earlier run"}, {t.Adopted, "of these without a line in the ledger until now"},
		{t.Changed, "redone after a change"}, {t.Retried, "tried again after failing"}, {t.Redone, "redone on request"}, {t.Looks, "to look at"}, {t.Stops, "with a stop"}, {t.Failed, "failed"}, {len(r.Missing), "missing"}} {
		if p.n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", p.n, p.what))
		}
	}
	fmt.Fprintf(&text, "regions  %d: %s\n", t.Regions, strings.Join(parts, ", "))
	r.list(&text, Failed, "failed", func(o Outcome) string { return o.Reason })
	r.list(&text, Stop, "stop", func(o Outcome) string { return o.Figures.WorstCheck + "; left out of mosaic and ranks" })
	r.list(&text, Look, "look", func(o Outcome) string { return o.Figures.WorstCheck })
	if len(r.Missing) > 0 {
		var few []string
		for _, name := range r.Missing[:min(named, len(r.Missing))] {
			few = append(few, Shown(name))
		}
		fmt.Fprintf(&text, "missing  %s", strings.Join(few, ", "))
		if more := len(r.Missing) - len(few); more > 0 {
			fmt.Fprintf(&text, " and %d more", more)
		}
		text.WriteString(": run the parts that have them again\n")
	}
	for _, n := range r.Notes {
		fmt.Fprintf(&text, "note     %s\n", n)
	}
	if len(r.Written) > 0 {
		fmt.Fprintf(&text, "written  %s: %s, and a folder for each region that was fitted\n", out, strings.Join(r.Written, ", "))
	} else {
		fmt.Fprintf(&text, "written  %s: a folder for each region that was fitted; the rest when all parts are gathered\n", filepath.Clean(out))
	}
	_, err := io.WriteString(w, text.String())
	return err
}

// list names the regions of one status, with what there is to say of each.
func (r Report) list(text *strings.Builder, s Status, title string, say func(Outcome) string) {
	n := 0
	for _, o := range r.Outcomes {
		if o.Status != s {
			continue
		}
		if n++; n <= named {
			fmt.Fprintf(text, "%-8s %s: %s\n", title, Shown(o.Region), say(o))
		}
	}
	if n > named {
		fmt.Fprintf(text, "%-8s and %d more", title, n-named)
		if len(r.Written) > 0 {
			fmt.Fprintf(text, ", see %s", regionsFile)
		}
		text.WriteByte('\n')
	}
}

// Shown is a region's name as it can be written on a line: in quotes where a letter of it would not show, or would act
// on the terminal.
func Shown(name string) string {
	if strings.ContainsFunc(name, func(c rune) bool { return !unicode.IsPrint(c) }) {
		return strconv.Quote(name)
	}
	return name
}

// Counted is a number of things: 1 region, 2 regions.
func Counted(n int, what string) string {
	if n == 1 {
		return "1 " + what
	}
	return fmt.Sprintf("%d %ss", n, what)
}
