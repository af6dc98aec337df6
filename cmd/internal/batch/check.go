package batch

import (
	"cmp"
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"
)

// Prospect is what a run would do with a region.
type Prospect struct {
	Region, Folder string
	Bytes          int64  // of its rows
	State          string // new, changed, failed before, to be done again, or unchanged
}

// The states of a prospect.
const (
	stateNew     = "new"
	stateChanged = "changed"
	stateFailed  = "failed before"
	stateRedo    = "to be done again"
	stateSame    = "unchanged"
)

// Check tells what Run would do, the largest region first as there, and does nothing. out may be empty or not there yet.
func (b *Batch) Check(ctx context.Context, out string, o Options) ([]Prospect, error) {
	r, err := b.newRun(out, o, silent{})
	if err != nil {
		return nil, err
	}
	if out != "" {
		if err := r.look(ctx); err != nil {
			return nil, err
		}
	}
	var list []Prospect
	for _, i := range r.share() {
		g := r.regions[i]
		p := Prospect{Region: g.name, Folder: g.folder, Bytes: g.size, State: stateNew}
		line, known := r.past[g.name]
		switch {
		case known && line.Status == Failed:
			p.State = stateFailed
		case r.redo[g.name]:
			p.State = stateRedo
		default:
			state, err := r.state(ctx, i)
			if err != nil {
				return nil, err
			}
			p.State = state
		}
		list = append(list, p)
	}
	slices.SortStableFunc(list, func(a, b Prospect) int { return -cmp.Compare(a.Bytes, b.Bytes) })
	return list, nil
}

// look reads what an earlier run has left, without touching it.
func (r *runner) look(ctx context.Context) error {
	entries, err := os.ReadDir(r.out)
	if os.IsNotExist(err) || err == nil && len(entries) == 0 {
		r.out = ""
		return nil
	}
	if err := r.prepareFolder(); err != nil {
		return err
	}
	lines, err := ReadLedgers(r.out)
	if err != nil {
		return err
	}
	r.past = Latest(lines)
	if err := r.layMargin(ctx); err != nil {
		return err
	}
	if r.plan.Pooled {
		of, err := r.allInput(ctx)
		if err != nil {
			return err
		}
		r.pooled = readPooled(filepath.Join(r.out, pooledFile), of)
	}
	return nil
}

// state compares a region's folder with what would be run. Without a folder there is nothing to compare, which saves
// reading the input.
func (r *runner) state(ctx context.Context, i int) (string, error) {
	g := r.regions[i]
	if r.out == "" {
		return stateNew, nil
	}
	if _, err := os.Stat(filepath.Join(r.out, g.folder, "summary.json")); err != nil {
		return stateNew, nil
	}
	asked, _, err := r.ask(ctx, i)
	if ctx.Err() != nil {
		return "", ctx.Err()
	}
	if _, ok := r.finished(g.folder, asked.Fingerprint); err == nil && ok && (r.pooled != nil || !r.plan.Pooled) {
		return stateSame, nil
	}
	return stateChanged, nil
}

// shown bounds how many regions are listed one by one.
const shown = 30

// WriteProspects words what Check found.
func (b *Batch) WriteProspects(w io.Writer, list []Prospect) error {
	counts := map[string]int{}
	folder := 0
	for k, p := range list {
		counts[p.State]++
		if k < shown {
			folder = max(folder, len([]rune(p.Folder)))
		}
	}
	var parts []string
	for _, state := range []string{stateNew, stateChanged, stateFailed, stateRedo, stateSame} {
		if n := counts[state]; n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", n, state))
		}
	}
	var text strings.Builder
	fmt.Fprintf(&text, "plan     %s: %s, %s; nothing was run\n", filepath.Base(b.path), Counted(len(list), "region"), strings.Join(parts, ", "))
	if b.unnamed.Rows > 0 {
		fmt.Fprintf(&text, "note     %s\n", b.nameless())
	}
	text.WriteString("\nlargest first: folder, size, state, and the region's name where the folder has another\n")
	for k, p := range list {
		if k == shown {
			fmt.Fprintf(&text, "  and %d more\n", len(list)-shown)
			break
		}
		name := ""
		if p.Region != p.Folder {
			name = fmt.Sprintf("  %q", p.Region)
		}
		fmt.Fprintf(&text, "  %-*s %9s  %s%s\n", folder, p.Folder, size(p.Bytes), p.State, name)
	}
	_, err := io.WriteString(w, text.String())
	return err
}

// nameless tells of rows that are in no region.
func (b *Batch) nameless() string {
	return fmt.Sprintf("%s of %s without a region in %s (the first is row %d, line %d): in no map",
		Counted(b.unnamed.Rows, "row"), b.plan.File, b.plan.SplitBy, b.unnamed.Row, b.unnamed.Line)
}

// size writes a number of bytes for people.
func size(n int64) string {
	switch {
	case n >= 10<<20:
		return fmt.Sprintf("%d MiB", n>>20)
	case n >= 10<<10:
		return fmt.Sprintf("%d KiB", n>>10)
	}
	return fmt.Sprintf("%d bytes", n)
}
