package batch

import (
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"drumlin/cmd/internal/locks"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/summary"
)

// prepareFolder makes the folder of the batch, and refuses one that holds something else.
func (r *runner) prepareFolder() error {
	if _, err := os.Stat(r.out); r.Gather && errors.Is(err, fs.ErrNotExist) {
		return &fault{fmt.Sprintf("%s: there is no such folder, so there is nothing to gather", r.out), "name the folder that the parts wrote to"}
	}
	if err := r.holdsNoInput(r.out); err != nil {
		return err
	}
	return MakeFolder(r.out)
}

// MakeFolder makes the folder of a batch. One that is there already must be empty or a batch's.
func MakeFolder(out string) error {
	info, err := os.Stat(out)
	switch {
	case errors.Is(err, fs.ErrNotExist):
		return pipeline.MakeFolder(out)
	case err == nil && !info.IsDir():
		return &fault{out + " is a file, not a folder", "name a folder for the batch"}
	}
	entries, err := os.ReadDir(out)
	if err != nil {
		return pipeline.Plainly(err, out)
	}
	if len(entries) > 0 && !slices.ContainsFunc(entries, ours) {
		return &fault{out + " holds files that no batch wrote", "name another folder, or empty it yourself"}
	}
	return nil
}

// ours reports whether a file is one that a batch has in its folder and nobody else.
func ours(e os.DirEntry) bool {
	name := e.Name()
	return name == ledgerName || name == "ledger.csv" || partLedger.MatchString(name) || name == "batch.lock" ||
		strings.HasPrefix(name, "batch.part-") || slices.ContainsFunc(jobFiles, func(f jobFile) bool { return f.file == name })
}

// holdsNoInput refuses a folder that the plan takes files from: what one run writes would be input to the next.
func (b *Batch) holdsNoInput(out string) error {
	for _, dir := range slices.Sorted(maps.Keys(b.inputs)) {
		if within(dir, out) {
			return &fault{fmt.Sprintf("--out %s holds the input %s", out, b.inputs[dir]), "choose another folder, or have the plan name other files"}
		}
	}
	return nil
}

// within reports whether a folder is another or below it, links followed. One that is not there holds nothing.
func within(dir, other string) bool {
	from, err := realPath(other)
	if err != nil {
		return false
	}
	to, err := realPath(dir)
	if err != nil {
		return false
	}
	rel, err := filepath.Rel(from, to)
	return err == nil && rel != ".." && !strings.HasPrefix(rel, ".."+string(filepath.Separator))
}

// realPath is the absolute path of a folder, without symbolic links.
func realPath(dir string) (string, error) {
	real, err := filepath.EvalSymlinks(dir)
	if err != nil {
		return "", err
	}
	return filepath.Abs(real)
}

// lock takes what keeps two runs out of each other's way: parts share batch.lock and have a lock each, and a whole run or
// a gather has batch.lock for itself. Parts of another division would do the same regions twice and are refused as well.
func (r *runner) lock() (release func(), err error) {
	whole := filepath.Join(r.out, "batch.lock")
	if r.Part.Of == 0 {
		doing := "the whole batch"
		if r.Gather {
			doing = "the gathering"
		}
		release, err := locks.Take(whole, doing)
		return release, r.taken(err)
	}
	shared, err := locks.TakeShared(whole)
	if err != nil {
		return nil, r.taken(err)
	}
	own, err := locks.Take(filepath.Join(r.out, partLock(r.Part)), "part "+r.Part.String())
	if err != nil {
		shared()
		return nil, r.taken(err)
	}
	both := func() { own(); shared() }
	if other, holder := r.otherDivision(); other != "" {
		both()
		return nil, &fault{fmt.Sprintf("%s is being written in another division: %s", r.out, told(holder)), "wait for it, or divide the batch into as many parts"}
	}
	return both, nil
}

func partLock(p Part) string { return fmt.Sprintf("batch.part-%d-of-%d.lock", p.Index, p.Of) }

// taken words that somebody else is at work. A shared lock does not say whose it is; the parts' own locks do.
func (r *runner) taken(err error) error {
	var held *locks.Held
	if !errors.As(err, &held) {
		return pipeline.Plainly(err, r.out)
	}
	holder := held.Holder
	if holder.PID == 0 {
		if _, h := r.heldPart(func(string) bool { return true }); h.PID != 0 {
			holder = h
		}
	}
	return &fault{fmt.Sprintf("%s is being written by another drumlin: %s", r.out, told(holder)), "wait for it, or name another folder"}
}

// otherDivision finds a part at work whose division is not ours.
func (r *runner) otherDivision() (file string, h locks.Holder) {
	suffix := fmt.Sprintf("-of-%d.lock", r.Part.Of)
	return r.heldPart(func(name string) bool { return !strings.HasSuffix(name, suffix) })
}

// heldPart finds a part's lock that somebody holds.
func (r *runner) heldPart(wanted func(name string) bool) (file string, h locks.Holder) {
	found, _ := filepath.Glob(filepath.Join(globSafe(r.out), "batch.part-*.lock"))
	for _, path := range found {
		if !wanted(filepath.Base(path)) {
			continue
		}
		if h, held := locks.HeldBy(path); held {
			return path, h
		}
	}
	return "", locks.Holder{}
}

// globSafe takes the meaning from signs that stand for others.
func globSafe(path string) string {
	if os.PathSeparator == '\\' {
		return path
	}
	return strings.NewReplacer(`\`, `\\`, `*`, `\*`, `?`, `\?`, `[`, `\[`).Replace(path)
}

func told(h locks.Holder) string {
	if h.PID == 0 {
		return "it does not say which"
	}
	return fmt.Sprintf("%s, process %d on %s", h.Doing, h.PID, h.Host)
}

// openLedger opens the ledger of the run or part and reads what is known of each region.
func (r *runner) openLedger() error {
	if r.Part.Of == 0 {
		if err := MergeLedgers(r.out); err != nil {
			return err
		}
	}
	ledger, dropped, err := OpenLedger(r.out, r.Part.String())
	if err != nil {
		return err
	}
	r.ledger = ledger
	if dropped > 0 {
		r.events.Note("the last line of the ledger was cut short by an earlier end and was dropped")
	}
	lines, err := ReadLedgers(r.out)
	if err != nil {
		return errors.Join(err, ledger.Close())
	}
	r.past = Latest(lines)
	return nil
}

// finished reads the summary of a region's folder if it is whole and comes from the same input, settings and program.
func (r *runner) finished(folder, fingerprint string) (summary.Document, bool) {
	dir := filepath.Join(r.out, folder)
	text, err := os.ReadFile(filepath.Join(dir, "summary.json"))
	if err != nil {
		return summary.Document{}, false
	}
	var d summary.Document
	if json.Unmarshal(text, &d) != nil || d.Region == nil || d.Region.Fingerprint != fingerprint {
		return summary.Document{}, false
	}
	for _, o := range d.Outputs {
		if o.SHA256 == "" {
			continue // a picture, which can be drawn again
		}
		if _, err := os.Stat(filepath.Join(dir, o.File)); err != nil {
			return summary.Document{}, false
		}
	}
	return d, true
}
