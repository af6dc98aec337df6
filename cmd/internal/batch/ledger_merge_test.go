package batch

import (
	"fmt"
	"maps"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// partsToMerge are ledgers of a run that began whole and went on in parts, and the one that they come to.
func partsToMerge(t *testing.T) (files map[string][]byte, merged string) {
	t.Helper()
	text := func(region string, n int) string { return string(encoded(t, ledgerLine(region, n))) }
	old, both := text("north", 1), text("south", 2)
	first, second, third := text("east", 3), text("north", 4), text("west", 5)
	torn := text("torn", 6)
	files = map[string][]byte{
		"ledger.jsonl":               []byte(old + both + old + torn[:40]),
		"ledger.part-1-of-2.jsonl":   []byte(first + both + torn[:len(torn)-1]),
		"ledger.part-2-of-2.jsonl":   []byte(strings.ReplaceAll(second, "\n", "\r\n\n") + second),
		"ledger.part-10-of-16.jsonl": []byte(third),
		"ledger.part-9-of-16.jsonl":  {},
	}
	return files, old + both + old + first + second + third
}

// merges demands that a merge of files comes to the ledger merged alone, beside others that are none of ledgers.
func merges(t *testing.T, what string, files map[string][]byte, merged string) {
	t.Helper()
	dir := t.TempDir()
	lay(t, dir, files)
	lay(t, dir, map[string][]byte{"ledger.csv": []byte("region\n"), "breaks.toml": nil})
	want := map[string]string{"ledger.jsonl": merged, "ledger.csv": "region\n", "breaks.toml": ""}
	for range 2 {
		if err := MergeLedgers(dir); err != nil {
			t.Fatalf("%s: %v", what, err)
		}
		if diff := cmp.Diff(want, laid(t, dir)); diff != "" {
			t.Fatalf("%s: %s", what, diff)
		}
	}
}

func TestMergeLedgers(t *testing.T) {
	files, merged := partsToMerge(t)
	merges(t, "all", files, merged)
	alone := maps.Clone(files)
	delete(alone, "ledger.jsonl")
	again := slices.Collect(strings.Lines(merged))
	merges(t, "parts only", alone, again[3]+again[1]+again[4]+again[5])
	merges(t, "nothing to add", map[string][]byte{"ledger.jsonl": []byte(merged), "ledger.part-2-of-2.jsonl": files["ledger.part-2-of-2.jsonl"]}, merged)
	torn := merged + merged[:30] // is left for whoever opens it, to be told of
	merges(t, "no parts", map[string][]byte{"ledger.jsonl": []byte(torn)}, torn)

	dir := t.TempDir()
	if err := MergeLedgers(dir); err != nil || len(laid(t, dir)) > 0 {
		t.Errorf("an empty folder: %v, %v", err, laid(t, dir))
	}
	advised(t, "no folder", MergeLedgers(filepath.Join(dir, "none")), "there is no such folder")
}

// TestMergeCutShort begins again from all that a merge may leave when it is killed: a half of the new ledger beside the
// old one, the new one with all or some of the parts, and with the lock's file or without.
func TestMergeCutShort(t *testing.T) {
	files, merged := partsToMerge(t)
	for cut := 0; cut <= len(merged); cut += 97 {
		left := maps.Clone(files)
		left["ledger.jsonl.partial"] = []byte(merged[:cut])
		left["ledger.jsonl.partial.lock"] = []byte("{}\n")
		merges(t, fmt.Sprintf("cut at %d", cut), left, merged)
	}
	left := maps.Clone(files)
	left["ledger.jsonl"] = []byte(merged)
	left["ledger.jsonl.partial.lock"] = nil
	merges(t, "replaced", left, merged)
	delete(left, "ledger.jsonl.partial.lock")
	for _, name := range []string{"ledger.part-1-of-2.jsonl", "ledger.part-2-of-2.jsonl", "ledger.part-9-of-16.jsonl", "ledger.part-10-of-16.jsonl"} {
		merges(t, "before "+name, left, merged)
		delete(left, name)
	}
	merges(t, "at the end", left, merged)
}

// A ledger that cannot be replaced, or a part's that cannot be read, leaves all as it was.
func TestMergeFails(t *testing.T) {
	files, _ := partsToMerge(t)
	for name, spoil := range map[string]func(dir string) error{
		"a folder in its place": func(dir string) error {
			if err := os.Remove(filepath.Join(dir, "ledger.jsonl")); err != nil {
				return err
			}
			return os.MkdirAll(filepath.Join(dir, "ledger.jsonl", "x"), 0o755)
		},
		"a folder for a part": func(dir string) error { return os.Mkdir(filepath.Join(dir, "ledger.part-4-of-16.jsonl"), 0o755) },
		"a folder in the way": func(dir string) error {
			return os.MkdirAll(filepath.Join(dir, "ledger.jsonl.partial", "x"), 0o755)
		},
	} {
		dir := t.TempDir()
		lay(t, dir, files)
		if err := spoil(dir); err != nil {
			t.Fatal(err)
		}
		if err := MergeLedgers(dir); err == nil {
			t.Errorf("%s: no error", name)
		}
		for file, want := range files {
			got, err := os.ReadFile(filepath.Join(dir, file))
			if string(got) != string(want) && !(file == "ledger.jsonl" && name == "a folder in its place") {
				t.Errorf("%s: %s was changed, %v", name, file, err)
			}
		}
	}
}
