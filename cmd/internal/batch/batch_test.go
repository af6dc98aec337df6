package batch

import (
	"context"
	"encoding/csv"
	"errors"
	"fmt"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"sync"
	"syscall"
	"testing"

	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// planted writes a plan and its tables to a folder of their own and returns the plan's path.
func planted(t testing.TB, planText string, tables map[string]string) string {
	t.Helper()
	dir := t.TempDir()
	for name, text := range tables {
		path := filepath.Join(dir, name)
		if err := os.MkdirAll(filepath.Dir(path), 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	path := filepath.Join(dir, "plan.toml")
	if err := os.WriteFile(path, []byte(planText), 0o644); err != nil {
		t.Fatal(err)
	}
	return path
}

// vale is an invented table of counts on plots with its lower left corner at (east, 0), 2 km wide.
func vale(seed uint64, rows int, east float64) string {
	random := rand.New(rand.NewPCG(seed, 1))
	var b strings.Builder
	b.WriteString("x,y,stems,plot_ha\n")
	for range rows {
		x, y := 2000*random.Float64(), 2000*random.Float64()
		level := 8 * math.Exp(math.Sin((east+x)/700)+math.Cos(y/500))
		fmt.Fprintf(&b, "%.1f,%.1f,%d,0.5\n", east+x, y, int(level*(0.6+0.8*random.Float64())))
	}
	return b.String()
}

const valesPlan = `
[defaults]
response = "stems"
area = "plot_ha"
max_knots = 30
cells_across = 20
write = ["csv", "pictures"]
[regions]
files = "data/*.csv"
`

// fourVales are three regions side by side and one that is too small to map.
func fourVales() map[string]string {
	return map[string]string{"data/ash.csv": vale(1, 60, 0), "data/birch.csv": vale(2, 90, 2000), "data/cedar.csv": vale(3, 40, 4000),
		"data/dwarf.csv": "x,y,stems,plot_ha\n1,1,3,0.5\n2,5,4,0.5\n"}
}

func loaded(t testing.TB, path string) *Batch {
	t.Helper()
	b, err := Load(t.Context(), path)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

func ran(t *testing.T, path, out string, o Options) Report {
	t.Helper()
	r, err := loaded(t, path).Run(t.Context(), out, o, silent{})
	if err != nil {
		t.Fatal(err)
	}
	return r
}

// states are the statuses of the outcomes, by region.
func states(r Report) string {
	var list []string
	for _, o := range r.Outcomes {
		list = append(list, o.Region+" "+string(o.Status))
	}
	return strings.Join(list, ", ")
}

// tree is every file below a folder with its text, but for ledgers and locks.
func tree(t *testing.T, dir string) map[string]string {
	t.Helper()
	files := map[string]string{}
	err := filepath.WalkDir(dir, func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		name, _ := filepath.Rel(dir, path)
		if strings.HasPrefix(name, "ledger.") || strings.HasPrefix(name, "batch.") {
			return nil
		}
		text, err := os.ReadFile(path)
		files[name] = string(text)
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return files
}

func sameTree(t *testing.T, what string, want, got map[string]string) {
	t.Helper()
	for name := range want {
		if got[name] != want[name] {
			t.Errorf("%s: %s differs or is missing", what, name)
		}
	}
	if len(got) != len(want) {
		t.Errorf("%s: %d files, want %d", what, len(got), len(want))
	}
}

func records(t *testing.T, path string) []map[string]string {
	t.Helper()
	f, err := os.Open(path)
	if err != nil {
		t.Fatal(err)
	}
	defer f.Close()
	all, err := csv.NewReader(f).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	var list []map[string]string
	for _, record := range all[1:] {
		row := map[string]string{}
		for k, v := range record {
			row[all[0][k]] = v
		}
		list = append(list, row)
	}
	return list
}

func TestRunAndAgain(t *testing.T) {
	path := planted(t, valesPlan, fourVales())
	out := filepath.Join(t.TempDir(), "maps")
	first := ran(t, path, out, Options{Workers: 2})
	if got := states(first); !strings.HasPrefix(got, "ash ") || !strings.HasSuffix(got, "dwarf failed") || first.Tally.Fresh != 3 || first.Tally.Failed != 1 || !first.Incomplete() {
		t.Fatalf("%s; %+v", got, first.Tally)
	}
	want := tree(t, out)
	for _, name := range []string{"ash/summary.json", "ash/surface.csv", "ash/map.png", "ash/uncertainty.png", "birch/residuals.csv", "regions.csv", "mosaic.csv", "mosaic.png", "breaks.toml"} {
		if want[name] == "" {
			t.Errorf("%s is missing", name)
		}
	}
	if _, err := os.Stat(filepath.Join(out, "dwarf")); err == nil {
		t.Error("a region that failed has a folder")
	}
	ledger := records(t, filepath.Join(out, "ledger.csv"))
	if len(ledger) != 4 || ledger[3]["status"] != "failed" || ledger[3]["reason"] == "" || ledger[0]["observations"] != "60" || ledger[0]["total"] == "" ||
		ledger[0]["fingerprint"] == "" || ledger[0]["cpu"] == "" || ledger[0]["distribution"] == "" {
		t.Errorf("the ledger says %v", ledger)
	}

	again := ran(t, path, out, Options{Workers: 1})
	if again.Tally.Unchanged != 3 || again.Tally.Fresh != 0 || again.Tally.Failed != 1 {
		t.Errorf("run again: %+v", again.Tally)
	}
	sameTree(t, "run again", want, tree(t, out))
	if l := records(t, filepath.Join(out, "ledger.csv")); l[0]["status"] != "unchanged" || l[0]["total"] != ledger[0]["total"] {
		t.Errorf("run again, the ledger says %v", l[0])
	}
	others := []Options{{Workers: 1}, {Workers: 5}}
	if testing.Short() {
		others = nil
	}
	for _, o := range others {
		other := filepath.Join(t.TempDir(), "maps")
		ran(t, path, other, o)
		sameTree(t, fmt.Sprintf("%d workers", o.Workers), want, tree(t, other))
	}
	parts := filepath.Join(t.TempDir(), "maps")
	for k := 1; k <= 3; k++ {
		ran(t, path, parts, Options{Part: Part{k, 3}})
	}
	if _, err := os.Stat(filepath.Join(parts, "regions.csv")); err == nil {
		t.Error("a part has written regions.csv")
	}
	gathered := ran(t, path, parts, Options{Gather: true})
	if gathered.Tally.Failed != 1 || gathered.Tally.Unchanged != 3 || len(gathered.Missing) > 0 {
		t.Errorf("gathered: %+v, missing %v", gathered.Tally, gathered.Missing)
	}
	sameTree(t, "parts gathered", want, tree(t, parts))
	if left, _ := filepath.Glob(filepath.Join(parts, "ledger.part*")); left != nil {
		t.Errorf("left after gathering: %v", left)
	}
}

// TestChanges: what is done again is what has changed, and no more.
func TestChanges(t *testing.T) {
	tables := fourVales()
	delete(tables, "data/dwarf.csv")
	path := planted(t, valesPlan, tables)
	out := filepath.Join(t.TempDir(), "maps")
	ran(t, path, out, Options{})
	var last Tally
	fresh := func(what, want string, o Options) {
		t.Helper()
		b := loaded(t, path)
		heard := &listener{}
		r, err := b.Run(t.Context(), out, o, heard)
		if err != nil {
			t.Fatalf("%s: %v", what, err)
		}
		last = r.Tally
		slices.Sort(heard.fresh)
		if got := strings.Join(heard.fresh, " "); got != want {
			t.Errorf("%s: done again are %q, want %q", what, got, want)
		}
	}
	again := func(what string, want, got int) {
		t.Helper()
		if got != want {
			t.Errorf("%s: %d regions are counted, want %d", what, got, want)
		}
	}
	fresh("nothing", "", Options{})
	rewrite(t, filepath.Join(filepath.Dir(path), "data/birch.csv"), vale(9, 91, 2000))
	fresh("a table", "birch", Options{})
	again("a table", 1, last.Changed)
	rewrite(t, path, valesPlan+"[region.ash]\ncells_across = 25\n")
	fresh("a region's own word", "ash", Options{})
	rewrite(t, path, strings.Replace(valesPlan, "max_knots = 30", "max_knots = 31", 1))
	fresh("a default", "ash birch cedar", Options{})
	if err := os.Remove(filepath.Join(out, "cedar", "surface.csv")); err != nil {
		t.Fatal(err)
	}
	fresh("a file that is gone", "cedar", Options{})
	again("a file that is gone", 1, last.Changed)
	fresh("on request", "birch", Options{Redo: []string{"birch"}})
	again("on request", 1, last.Redone)

	ledger := filepath.Join(out, "ledger.jsonl")
	text, err := os.ReadFile(ledger)
	if err != nil {
		t.Fatal(err)
	}
	rewrite(t, ledger, string(text[:len(text)-40])) // a torn last line
	fresh("a torn ledger", "", Options{})
	if err := os.Remove(ledger); err != nil {
		t.Fatal(err)
	}
	fresh("no ledger", "", Options{})
	again("no ledger", 3, last.Adopted)
	for _, row := range records(t, filepath.Join(out, "ledger.csv")) {
		if !strings.HasPrefix(row["reason"], "adopted") || row["observations"] == "" {
			t.Errorf("without a ledger: %v", row)
		}
	}
	if _, err := loaded(t, path).Run(t.Context(), out, Options{Redo: []string{"brich"}}, silent{}); err == nil || !strings.Contains(hint(err), `"birch"`) {
		t.Errorf("an unknown region to redo: %v, %q", err, hint(err))
	}
}

// listener hears which regions were fitted.
type listener struct {
	silent
	mu    sync.Mutex
	fresh []string
	notes []string
}

func (l *listener) Region(line Line, _ Tally) {
	l.mu.Lock()
	defer l.mu.Unlock()
	if line.Status != Unchanged {
		l.fresh = append(l.fresh, line.Region)
	}
}

func (l *listener) Note(text string) { l.notes = append(l.notes, text) }

func rewrite(t *testing.T, path, text string) {
	t.Helper()
	if err := os.WriteFile(path, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
}

func hint(err error) string {
	var advisor interface {
		error
		Hint() string
	}
	if errors.As(err, &advisor) {
		return advisor.Hint()
	}
	return ""
}

// TestPanic: a fault in our own code fails its region and no other, and says where it happened.
func TestPanic(t *testing.T) {
	b := loaded(t, planted(t, valesPlan, fourVales()))
	fit := b.fit
	b.fit = func(ctx context.Context, s plan.Settings, g pipeline.Region, dir string, ev pipeline.Events) (summary.Document, error) {
		if g.Name == "birch" {
			panic("a fault on purpose")
		}
		return fit(ctx, s, g, dir, ev)
	}
	out := filepath.Join(t.TempDir(), "maps")
	r, err := b.Run(t.Context(), out, Options{}, silent{})
	if err != nil {
		t.Fatal(err)
	}
	for _, o := range r.Outcomes {
		if o.Region == "birch" && (o.Status != Failed || !strings.Contains(o.Reason, "internal error: a fault on purpose, at batch_test.go:")) {
			t.Errorf("birch: %s, %s", o.Status, o.Reason)
		}
		if o.Region == "ash" && o.Status == Failed {
			t.Errorf("ash failed as well: %s", o.Reason)
		}
	}
}

// TestFullDiskStopsAll: after the first region that finds no room no other is begun, and the ledger stays true.
func TestFullDiskStopsAll(t *testing.T) {
	b := loaded(t, planted(t, valesPlan, fourVales()))
	fit, begun := b.fit, 0
	b.fit = func(ctx context.Context, s plan.Settings, g pipeline.Region, dir string, ev pipeline.Events) (summary.Document, error) {
		if begun++; begun == 2 {
			return summary.Document{}, pipeline.Plainly(&os.PathError{Op: "write", Path: "surface.csv", Err: syscall.ENOSPC}, dir)
		}
		return fit(ctx, s, g, dir, ev)
	}
	out := filepath.Join(t.TempDir(), "maps")
	_, err := b.Run(t.Context(), out, Options{Workers: 1}, silent{})
	// One region may be under way when another finds the disk full, so the order of the first two is not fixed.
	if !pipeline.NoRoom(err) || begun > 3 {
		t.Fatalf("%v after %d regions", err, begun)
	}
	lines, err := ReadLedgers(out)
	if err != nil || len(lines) > 2 {
		t.Errorf("the ledger has %v, %v", lines, err)
	}
	for _, l := range lines {
		if _, err := os.Stat(filepath.Join(out, l.Folder, "summary.json")); l.Status != Failed && err != nil {
			t.Errorf("the ledger has %s as %s, and there is no folder", l.Region, l.Status)
		}
	}
}

// TestStop: a region that is not to be used is stamped, stays out of the mosaic, the ranks and the colours of the others.
func TestStop(t *testing.T) {
	tables := fourVales()
	delete(tables, "data/dwarf.csv")
	bad := strings.Split(strings.TrimSpace(tables["data/cedar.csv"]), "\n")
	for i := 1; i < len(bad); i += 3 { // a third of the rows cannot be used, which is a stop
		bad[i] = "1,1,none,0.5"
	}
	tables["data/cedar.csv"] = strings.Join(bad, "\n") + "\n"
	out := filepath.Join(t.TempDir(), "maps")
	r := ran(t, planted(t, valesPlan, tables), out, Options{})
	if r.Tally.Stops != 1 || !r.Incomplete() {
		t.Fatalf("%+v", r.Tally)
	}
	for _, row := range records(t, filepath.Join(out, "regions.csv")) {
		if stop := row["region"] == "cedar"; (row["status"] == "stop") != stop || (row["rank"] == "") != stop || (row["rank_lower"] == "") != stop {
			t.Errorf("%v", row)
		}
	}
	for _, row := range records(t, filepath.Join(out, "mosaic.csv")) {
		if row["region"] == "cedar" {
			t.Fatal("a region with a stop is in the mosaic")
		}
	}
	var told strings.Builder
	if err := r.WriteWords(&told, "maps"); err != nil || !strings.Contains(told.String(), "stop     cedar: rows set aside; left out") {
		t.Errorf("told is %q", told.String())
	}
}

// TestBreaks: breaks are common, can be pinned as a list or as the file that an earlier batch wrote, or left to each map.
func TestBreaks(t *testing.T) {
	path := planted(t, valesPlan, fourVales())
	out := filepath.Join(t.TempDir(), "maps")
	ran(t, path, out, Options{})
	first := tree(t, out)
	if !strings.Contains(first["breaks.toml"], "map.png") || !strings.Contains(first["breaks.toml"], "uncertainty.png") {
		t.Fatalf("breaks.toml is\n%s", first["breaks.toml"])
	}
	rewrite(t, filepath.Join(filepath.Dir(path), "last.toml"), first["breaks.toml"])
	rewrite(t, filepath.Join(filepath.Dir(path), "data/dwarf.csv"), vale(77, 50, 9000))
	rewrite(t, path, valesPlan+"[pictures]\nbreaks = \"last.toml\"\n")
	ran(t, path, out, Options{})
	pinned := tree(t, out)
	if pinned["breaks.toml"] != first["breaks.toml"] || pinned["ash/map.png"] != first["ash/map.png"] {
		t.Error("with the breaks of the last batch its maps have changed")
	}
	rewrite(t, path, valesPlan+"[pictures]\nbreaks = [0, 10, 20, 40]\n")
	ran(t, path, out, Options{})
	if listed := tree(t, out); !strings.Contains(listed["breaks.toml"], "[0.0, 10.0, 20.0, 40.0]") || listed["ash/map.png"] == first["ash/map.png"] {
		t.Errorf("with a list of breaks breaks.toml is\n%s", listed["breaks.toml"])
	}
	if err := os.Remove(filepath.Join(out, "ash", "map.png")); err != nil {
		t.Fatal(err)
	}
	rewrite(t, path, valesPlan+"[pictures]\nbreaks = [2, 10, 20, 40]\n")
	ran(t, path, out, Options{})
	if raised := tree(t, out); !strings.Contains(raised["breaks.toml"], "[-inf, 10.0, 20.0, 40.0]") || raised["ash/map.png"] == "" {
		t.Errorf("with breaks above the least values breaks.toml is\n%s", raised["breaks.toml"])
	}
	if err := os.Remove(filepath.Join(out, "ash", "map.png")); err != nil {
		t.Fatal(err)
	}
	ran(t, path, out, Options{})
	if again := tree(t, out); again["ash/map.png"] == "" {
		t.Error("a picture that was taken away is not drawn again")
	}
	rewrite(t, path, valesPlan+"[pictures]\nscale = \"own\"\n")
	ran(t, path, out, Options{})
	if own := tree(t, out); own["breaks.toml"] != "" || own["ash/map.png"] == first["ash/map.png"] {
		t.Error("with a scale of its own a map is as it was")
	}
	rewrite(t, path, valesPlan+"[pictures]\nbreaks = [0, 10]\n[region.ash]\nunit_label = \"stems a hectare\"\n")
	if _, err := Load(t.Context(), path); err == nil || !strings.Contains(err.Error(), "plan.toml: line 11") || !strings.Contains(err.Error(), "2 responses or units") {
		t.Errorf("one list for two units: %v", err)
	}
}
