package batch

import (
	"bytes"
	"encoding/csv"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"
	"time"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"

	"drumlin/basis2d/blocks"
	"drumlin/io/summary"
)

// ledgerLine is a line with something in every field.
func ledgerLine(region string, n int) Line {
	v := float64(n)
	return Line{Region: region, Folder: "folder-" + region, Status: Look,
		Figures: Figures{Observations: 100 + n, SetAside: n % 3, Knots: 60, DegreesOfFreedom: summary.Number(12.5 + v/7), DevianceShare: summary.Number(0.4 + v/1e6),
			Distribution: "negative-binomial", Response: "cases", Unit: "cases per 1000 people", Link: "log", Confidence: 0.95, Per: 1000,
			Total: summary.Number(math.NaN()), TotalCV: summary.Number(math.NaN()), TotalLower: summary.Number(math.NaN()), TotalUpper: summary.Number(math.NaN()),
			Mean: summary.Number(3.25 + v), MeanCV: 0.125, MeanLower: summary.Number(2.5 + v), MeanUpper: summary.Number(4.5 + v),
			WorstLevel: summary.Look, WorstCheck: "dispersion"},
		Seconds: 1.5 + v/1000, CPU: "Alder 9 Processor @ 2.20GHz", Host: "vale", Part: "3/16", Ended: time.Date(2031, 5, 3, 14, 2, 11, 1000*n, time.UTC),
		Fingerprint: strings.Repeat("0123456789abcdef", 4), Version: "1.2.3"}
}

// failedLine is one of a region without a fit.
func failedLine(region, reason string) Line {
	l := ledgerLine(region, 0)
	l.Status, l.Reason, l.Figures = Failed, reason, noFigures()
	return l
}

// sameLines compares lines to the last bit; NaN is as good as NaN.
func sameLines(t *testing.T, what string, got, want []Line) {
	t.Helper()
	equal := cmp.Comparer(func(a, b summary.Number) bool { return a == b || a != a && b != b })
	if diff := cmp.Diff(want, got, equal, cmpopts.EquateEmpty()); diff != "" {
		t.Errorf("%s: %s", what, diff)
	}
}

func encoded(t testing.TB, lines ...Line) []byte {
	t.Helper()
	var all []byte
	for _, l := range lines {
		text, err := encodeLine(l)
		if err != nil {
			t.Fatal(err)
		}
		all = append(all, text...)
	}
	return all
}

// lay writes files into a folder.
func lay(t testing.TB, dir string, files map[string][]byte) {
	t.Helper()
	for name, content := range files {
		if err := os.WriteFile(filepath.Join(dir, name), content, 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// laid reads all files of a folder.
func laid(t testing.TB, dir string) map[string]string {
	t.Helper()
	entries, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	files := map[string]string{}
	for _, e := range entries {
		content, err := os.ReadFile(filepath.Join(dir, e.Name()))
		if err != nil {
			t.Fatal(err)
		}
		files[e.Name()] = string(content)
	}
	return files
}

// advised demands an error with advice whose text holds all of says.
func advised(t *testing.T, what string, err error, says ...string) {
	t.Helper()
	var advisor interface{ Hint() string }
	if err == nil || !errors.As(err, &advisor) || advisor.Hint() == "" {
		t.Errorf("%s: no error with advice: %v", what, err)
		return
	}
	for _, part := range says {
		if !strings.Contains(err.Error(), part) {
			t.Errorf("%s: %q does not say %q", what, err, part)
		}
	}
}

// addTo opens the ledger, adds lines and closes it.
func addTo(t *testing.T, dir, part string, lines ...Line) (dropped int) {
	t.Helper()
	l, dropped, err := OpenLedger(dir, part)
	if err != nil {
		t.Fatal(err)
	}
	for _, line := range lines {
		if err := l.Append(line); err != nil {
			t.Fatal(err)
		}
	}
	if err := l.Close(); err != nil {
		t.Fatal(err)
	}
	return dropped
}

func TestLedgerReadsBack(t *testing.T) {
	dir := t.TempDir()
	odd := ledgerLine("Öl & <Wasser>, \"quoted\"\nsecond line\u2028third\t\\ 日本", 7)
	odd.Mean, odd.Seconds = summary.Number(math.Nextafter(0.1, 1)), 1e-300
	local := ledgerLine("west", 8)
	local.Ended = time.Date(2031, 5, 3, 23, 59, 59, 999999999, time.FixedZone("", -5*3600))
	lines := []Line{ledgerLine("north", 1), failedLine("south", "data/south.csv: row 4, column \"cases\": -3 is no count (give counts from 0)"), odd, local}
	for i, part := range []string{"", "3/16"} {
		if dropped := addTo(t, dir, part, lines[2*i:2*i+2]...); dropped != 0 {
			t.Errorf("%d lines of a new ledger were dropped", dropped)
		}
	}
	got, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	lines[3].Ended = lines[3].Ended.UTC()
	sameLines(t, "read back", got, lines)
	var names []string
	for name := range laid(t, dir) {
		names = append(names, name)
	}
	slices.Sort(names)
	if want := []string{"ledger.jsonl", "ledger.part-3-of-16.jsonl"}; !slices.Equal(names, want) {
		t.Errorf("the files are %v", names)
	}
}

func TestLedgerText(t *testing.T) {
	want := `{"region":"north","folder":"folder-north","status":"look","reason":"","observations":100,"set_aside":0,"knots":60,` +
		`"degrees_of_freedom":12.5,"deviance_share":0.4,"distribution":"negative-binomial","response":"cases","unit":"cases per 1000 people","link":"log",` +
		`"confidence":0.95,"per":1000,"total":null,"total_cv":null,"total_lower":null,"total_upper":null,"mean":3.25,"mean_cv":0.125,"mean_lower":2.5,"mean_upper":4.5,` +
		`"worst_level":"look","worst_check":"dispersion","seconds":1.5,"cpu":"Alder 9 Processor @ 2.20GHz","host":"vale","part":"3/16",` +
		`"ended":"2031-05-03T14:02:11Z","fingerprint":"` + strings.Repeat("0123456789abcdef", 4) + `","version":"1.2.3"}` + "\n"
	if diff := cmp.Diff(want, string(encoded(t, ledgerLine("north", 0)))); diff != "" {
		t.Error(diff)
	}
}

func TestLedgerRefusesLines(t *testing.T) {
	dir := t.TempDir()
	l, _, err := OpenLedger(dir, "")
	if err != nil {
		t.Fatal(err)
	}
	endless := ledgerLine("north", 1)
	endless.Seconds = math.Inf(1)
	for name, line := range map[string]Line{"no region": {}, "no number": endless} {
		if err := l.Append(line); err == nil {
			t.Errorf("%s: it was taken", name)
		}
	}
	if err := errors.Join(l.Append(ledgerLine("north", 1)), l.Close()); err != nil {
		t.Fatal(err)
	}
	if err := l.Append(ledgerLine("south", 1)); err == nil {
		t.Error("a closed ledger takes lines")
	}
	got, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	sameLines(t, "what was taken", got, []Line{ledgerLine("north", 1)})
}

func TestLedgerOfAPart(t *testing.T) {
	for part, want := range map[string]string{"": "ledger.jsonl", "1/1": "ledger.part-1-of-1.jsonl", "3/16": "ledger.part-3-of-16.jsonl", "12/300": "ledger.part-12-of-300.jsonl"} {
		if got, err := ledgerFile(part); err != nil || got != want {
			t.Errorf("%q: %s, %v", part, got, err)
		}
	}
	for _, part := range []string{"3", "0/4", "5/4", "-1/4", "a/b", "1/2/3", "/", "../1"} {
		dir := t.TempDir()
		_, _, err := OpenLedger(dir, part)
		advised(t, part, err, fmt.Sprintf("%q", part))
		if files := laid(t, dir); len(files) > 0 {
			t.Errorf("%s: files %v", part, files)
		}
	}
}

// TestTornLastLine cuts the last line short at every byte: nothing before it is lost, the next line comes whole after it,
// and readers that may not change the file do without it.
func TestTornLastLine(t *testing.T) {
	dir := t.TempDir()
	path := filepath.Join(dir, "ledger.part-2-of-2.jsonl")
	kept, added := []Line{ledgerLine("north", 1), failedLine("south", "no rows")}, ledgerLine("east", 3)
	whole, last := encoded(t, kept...), encoded(t, failedLine("west", "torn, \"{\"}"))
	for cut := range len(last) {
		text := append(slices.Clone(whole), last[:cut]...)
		lay(t, dir, map[string][]byte{filepath.Base(path): text})
		lines, err := ReadLedgers(dir)
		if err != nil {
			t.Fatalf("cut at %d: %v", cut, err)
		}
		sameLines(t, "only read", lines, kept)
		if now, _ := os.ReadFile(path); !bytes.Equal(now, text) {
			t.Fatalf("cut at %d: reading changed the file", cut)
		}
		if dropped := addTo(t, dir, "2/2", added); dropped != min(cut, 1) {
			t.Errorf("cut at %d: %d lines were dropped", cut, dropped)
		}
		if lines, err = ReadLedgers(dir); err != nil {
			t.Fatalf("cut at %d: %v", cut, err)
		}
		sameLines(t, "added", lines, append(slices.Clone(kept), added))
		if t.Failed() {
			break
		}
	}
}

// What a power cut leaves at the end need not be the beginning of a line.
func TestTornOtherwise(t *testing.T) {
	kept := []Line{ledgerLine("north", 1)}
	for name, tail := range map[string]string{
		"zeros": strings.Repeat("\x00", 500), "zeros and an end": strings.Repeat("\x00", 500) + "\n", "half, zeros and an end": "{\"region\":\"w\x00\x00\x00\n", "space": "   ",
	} {
		dir := t.TempDir()
		lay(t, dir, map[string][]byte{"ledger.jsonl": append(encoded(t, kept...), tail...)})
		if dropped := addTo(t, dir, ""); dropped != 1 {
			t.Errorf("%s: %d lines were dropped", name, dropped)
		}
		if got := laid(t, dir)["ledger.jsonl"]; got != string(encoded(t, kept...)) {
			t.Errorf("%s: the file holds %q", name, got)
		}
	}
	dir := t.TempDir() // lines that a person has spaced are no torn ones
	text := bytes.ReplaceAll(encoded(t, ledgerLine("north", 1), ledgerLine("south", 2)), []byte("\n"), []byte("\r\n\r\n"))
	lay(t, dir, map[string][]byte{"ledger.jsonl": text})
	if dropped := addTo(t, dir, "", ledgerLine("east", 3)); dropped != 0 {
		t.Errorf("%d lines were dropped", dropped)
	}
	lines, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	sameLines(t, "spaced", lines, []Line{ledgerLine("north", 1), ledgerLine("south", 2), ledgerLine("east", 3)})
}

func TestUnreadableLine(t *testing.T) {
	for name, c := range map[string]struct{ line, says string }{
		"no JSON":       {`{"region":"n", oops}`, `line 2 is none of a ledger: from byte 16 on it is no JSON`},
		"torn":          {`{"region":"no`, `line 2 is none of a ledger: from byte 13 on it is no JSON`},
		"a number":      {`5`, `line 2 is none of a ledger: it is no object`},
		"a list":        {`[]`, `line 2 is none of a ledger: it is no object`},
		"null":          {`null`, `line 2 is none of a ledger: it names no region`},
		"no region":     {`{"knots":3}`, `line 2 is none of a ledger: it names no region`},
		"a word":        {`{"region":"n","knots":"many"}`, `line 2 is none of a ledger: its "knots" is a string`},
		"half a knot":   {`{"region":"n","knots":3.5}`, `line 2 is none of a ledger: its "knots" is a number 3.5`},
		"a long figure": {`{"region":"n","mean":"long"}`, `line 2 is none of a ledger: its "mean" is a string`},
		"no time":       {`{"region":"n","ended":"noon"}`, `line 2 is none of a ledger: "noon" is no time`},
	} {
		for _, part := range []string{"", "2/3"} {
			dir := t.TempDir()
			file, _ := ledgerFile(part)
			text := append(append(encoded(t, ledgerLine("north", 1)), c.line+"\n"...), encoded(t, ledgerLine("south", 1))...)
			lay(t, dir, map[string][]byte{file: text})
			_, _, err := OpenLedger(dir, part)
			advised(t, name, err, filepath.Join(dir, file)+": ", c.says)
			_, err = ReadLedgers(dir)
			advised(t, name, err, filepath.Join(dir, file)+": ", c.says)
			if part != "" {
				advised(t, name, MergeLedgers(dir), filepath.Join(dir, file)+": ", c.says)
			}
			if now := laid(t, dir); len(now) != 1 || now[file] != string(text) {
				t.Errorf("%s: the file was changed", name)
			}
		}
	}
	// The first of several is named, also where they are read by several workers.
	text := encoded(t, ledgerLine("north", 1))
	text = append(bytes.Repeat(text, 3*blocks.Size), bytes.Repeat(append([]byte("{}\n"), text...), 3*blocks.Size)...)
	if _, err := parseLedger(text); err == nil || !strings.Contains(err.Error(), fmt.Sprintf("line %d ", 3*blocks.Size+1)) {
		t.Errorf("%v", err)
	}
}

func TestLedgersOfAFolder(t *testing.T) {
	dir := t.TempDir()
	if lines, err := ReadLedgers(dir); err != nil || len(lines) > 0 {
		t.Errorf("of an empty folder: %v, %v", lines, err)
	}
	_, err := ReadLedgers(filepath.Join(dir, "none"))
	advised(t, "no folder", err, "there is no such folder")
	order := []string{"ledger.jsonl", "ledger.part-1-of-2.jsonl", "ledger.part-2-of-2.jsonl", "ledger.part-1-of-16.jsonl", "ledger.part-2-of-16.jsonl", "ledger.part-10-of-16.jsonl"}
	files := map[string][]byte{}
	var want []Line
	for i, name := range order {
		want = append(want, ledgerLine(fmt.Sprint(i), i))
		files[name] = encoded(t, want[i])
	}
	for _, name := range []string{"ledger.csv", "ledger.part-1-of-2.jsonl.bak", "ledger.jsonl.partial", "ledger.part-x-of-2.jsonl", "my ledger.jsonl"} {
		files[name] = []byte("not ours\n")
	}
	lay(t, dir, files)
	got, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	sameLines(t, "in order", got, want)
}

func TestLatest(t *testing.T) {
	at := func(region string, second int, reason string) Line {
		return Line{Region: region, Reason: reason, Ended: time.Date(2031, 1, 1, 0, 0, second, 0, time.UTC)}
	}
	zoned := at("north", 9, "zoned")
	zoned.Ended = zoned.Ended.In(time.FixedZone("", 3600))
	got := Latest([]Line{at("north", 5, "first"), at("south", 3, "late"), zoned, at("south", 2, "early"), at("east", 1, "one"), at("east", 1, "two"), at("north", 8, "")})
	for region, want := range map[string]string{"north": "zoned", "south": "late", "east": "two"} {
		if got[region].Reason != want {
			t.Errorf("%s: %q, not %q", region, got[region].Reason, want)
		}
	}
	if len(got) != 3 {
		t.Errorf("%d regions", len(got))
	}
}

func TestConcurrentAppends(t *testing.T) {
	const workers, each = 8, 20
	dir := t.TempDir()
	l, _, err := OpenLedger(dir, "")
	if err != nil {
		t.Fatal(err)
	}
	err = blocks.Do(t.Context(), workers, workers, func(_, w int) error {
		for n := range each {
			if err := l.Append(ledgerLine(fmt.Sprintf("%d-%d-%s", w, n, strings.Repeat("x", 50*w)), w)); err != nil {
				return err
			}
		}
		return nil
	})
	if err := errors.Join(err, l.Close()); err != nil {
		t.Fatal(err)
	}
	lines, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	next := map[string]int{} // of each worker
	for _, line := range lines {
		var w, n int
		if _, err := fmt.Sscanf(line.Region, "%d-%d-", &w, &n); err != nil || n != next[line.Region[:1]] {
			t.Errorf("%s: out of its order", line.Region)
		}
		next[line.Region[:1]]++
	}
	if len(lines) != workers*each {
		t.Errorf("%d lines", len(lines))
	}
}

// TestCutBackLater has a disk that takes half a line and then refuses even to remove it: that is made up for before the
// next line.
func TestCutBackLater(t *testing.T) {
	dir := t.TempDir()
	l, _, err := OpenLedger(dir, "")
	if err != nil {
		t.Fatal(err)
	}
	if err := l.Append(ledgerLine("north", 1)); err != nil {
		t.Fatal(err)
	}
	good := l.file
	if l.file, err = os.Open(l.path); err != nil { // can be neither written nor cut
		t.Fatal(err)
	}
	for range 2 {
		if err := l.Append(ledgerLine("south", 1)); err == nil {
			t.Fatal("it was taken")
		}
	}
	if _, err := good.WriteString(`{"region":"sou`); err != nil {
		t.Fatal(err)
	}
	if err := l.file.Close(); err != nil {
		t.Fatal(err)
	}
	l.file = good
	if err := errors.Join(l.Append(ledgerLine("east", 2)), l.Close()); err != nil {
		t.Fatal(err)
	}
	lines, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	sameLines(t, "after all", lines, []Line{ledgerLine("north", 1), ledgerLine("east", 2)})
}

func TestLedgerCSV(t *testing.T) {
	local := ledgerLine("=north, \"x\"", 0)
	local.Ended = time.Date(2031, 5, 3, 23, 59, 59, 999, time.FixedZone("", -5*3600))
	failed := failedLine("south", "data/south.csv: no rows")
	failed.Part, failed.Ended = "", time.Time{}
	counted := failed
	counted.Observations, counted.Mean = 3, 0
	var b bytes.Buffer
	if err := WriteLedgerCSV(&b, []Line{local, failed, counted}); err != nil {
		t.Fatal(err)
	}
	rows, err := csv.NewReader(&b).ReadAll()
	if err != nil {
		t.Fatal(err)
	}
	print := strings.Repeat("0123456789abcdef", 4)
	want := [][]string{
		strings.Split("region folder status reason observations set_aside knots degrees_of_freedom deviance_share distribution response unit total total_cv mean mean_cv "+
			"worst_level worst_check seconds cpu host part ended fingerprint version", " "),
		{"'=north, \"x\"", "folder-=north, \"x\"", "look", "", "100", "0", "60", "12.5", "0.4", "negative-binomial", "cases", "cases per 1000 people", "", "", "3.25", "0.125",
			"look", "dispersion", "1.5", "Alder 9 Processor @ 2.20GHz", "vale", "3/16", "2031-05-04T04:59:59Z", print, "1.2.3"},
		{"south", "folder-south", "failed", "data/south.csv: no rows", "", "", "", "", "", "", "", "", "", "", "", "", "", "", "1.5", "Alder 9 Processor @ 2.20GHz", "vale", "", "", print, "1.2.3"},
		{"south", "folder-south", "failed", "data/south.csv: no rows", "3", "", "", "", "", "", "", "", "", "", "", "", "", "", "1.5", "Alder 9 Processor @ 2.20GHz", "vale", "", "", print, "1.2.3"},
	}
	if diff := cmp.Diff(want, rows); diff != "" {
		t.Error(diff)
	}
	b.Reset()
	if err := WriteLedgerCSV(&b, nil); err != nil || strings.Count(b.String(), "\n") != 1 {
		t.Errorf("without lines: %q, %v", b.String(), err)
	}
}

func FuzzLedger(f *testing.F) {
	text := encoded(f, ledgerLine("north", 1), failedLine("south", "no rows"))
	f.Add(text)
	f.Add(text[:len(text)-9])
	f.Add([]byte("\n\r\n{\"region\":\"\\ud800\",\"mean\":1e999}\n"))
	f.Add([]byte(`{"region":"a","mean":-0,"ended":"2031-05-03T14:02:11+01:00"}` + "\n\x00\n"))
	f.Fuzz(func(t *testing.T, data []byte) {
		got, err := parseLedger(data)
		if err != nil {
			return
		}
		if got.whole > int64(len(data)) || got.torn != (got.whole < int64(len(data))) {
			t.Fatalf("whole up to %d of %d, torn: %v", got.whole, len(data), got.torn)
		}
		again, err := parseLedger(data[:got.whole])
		if err != nil || again.torn {
			t.Fatalf("what is whole is not: %v", err)
		}
		sameLines(t, "cut back", again.lines, got.lines)
		rewritten, err := parseLedger(encoded(t, got.lines...))
		if err != nil || rewritten.torn {
			t.Fatal(err)
		}
		for i := range got.lines {
			got.lines[i].Ended = got.lines[i].Ended.UTC()
		}
		sameLines(t, "written again", rewritten.lines, got.lines)
	})
}

// BenchmarkReadLedgers reads 100 000 lines from a folder.
func BenchmarkReadLedgers(b *testing.B) {
	dir := b.TempDir()
	var text []byte
	for n := range 100_000 {
		text = append(text, encoded(b, ledgerLine(fmt.Sprintf("region %d", n), n))...)
	}
	lay(b, dir, map[string][]byte{"ledger.jsonl": text})
	b.SetBytes(int64(len(text)))
	for b.Loop() {
		lines, err := ReadLedgers(dir)
		if err != nil || len(lines) != 100_000 {
			b.Fatal(err)
		}
	}
}
