package main

import (
	"bytes"
	"encoding/json"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
)

// TestBatchFullDisk runs out of room on a file system of its own: in the middle of the regions, and while pictures are
// drawn. The batch ends with what is wrong, its ledger is true, nothing half-made is left, and once there is room the next
// run goes on and comes to the same as one that always had it.
func TestBatchFullDisk(t *testing.T) {
	if os.Getuid() != 0 {
		t.Skip("only root may mount a small file system")
	}
	laid(t, map[string]string{"plan.toml": strings.Replace(groves, `["csv"]`, `["csv", "pictures"]`, 1) + "[regions]\nfiles = \"data/*.csv\"\n"})
	const regions = 5
	for k := range regions {
		laidFile(t, fmt.Sprintf("data/vale-%d.csv", k), grove(700*k, 24+k))
	}
	if code, _, stderr := typed(t, "batch", "plan.toml", "--out", "roomy", "--quiet"); code != exitDone {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	want := results(t, "roomy")
	for _, c := range []struct {
		size         string
		least, most  int  // regions that are done before the disk is full
		ofLedgerOnly bool // no table that needs all of them is there yet
	}{{"40k", 0, 1, true}, {"128k", 1, regions - 1, true}, {"1m", regions, regions, false}} {
		t.Run(c.size, func(t *testing.T) {
			disk := t.TempDir()
			if err := syscall.Mount("tmpfs", disk, "tmpfs", 0, "size="+c.size); err != nil {
				t.Skipf("a small file system cannot be mounted here: %v", err)
			}
			t.Cleanup(func() {
				if err := syscall.Unmount(disk, 0); err != nil {
					t.Error(err)
				}
			})
			out := filepath.Join(disk, "deep", "maps")
			code, stdout, stderr := typed(t, "batch", "plan.toml", "--out", out, "--quiet", "--workers", "2")
			if code != exitRequest || stdout != "" || !strings.Contains(stderr, "there is no room left to write it\nhint: make room, ") {
				t.Fatalf("exit %d: %s%s", code, stdout, stderr)
			}
			err := filepath.WalkDir(out, func(path string, d fs.DirEntry, err error) error {
				if strings.Contains(d.Name(), ".partial") || strings.HasSuffix(d.Name(), ".lock") || strings.HasSuffix(d.Name(), ".replaced") {
					t.Errorf("%s is left behind", path)
				}
				return err
			})
			if err != nil {
				t.Fatal(err)
			}
			told := toldOf(t, filepath.Join(out, "ledger.jsonl"))
			if n := len(told); n < c.least || n > c.most || n != folders(t, out) {
				t.Errorf("the ledger tells of %d regions, and %d folders are there", n, folders(t, out))
			}
			if _, err := os.Stat(filepath.Join(out, "regions.csv")); (err != nil) != c.ofLedgerOnly {
				t.Errorf("regions.csv: %v", err)
			}
			for name, sum := range results(t, out) {
				if want[name] != sum && name != "regions.csv" && !strings.HasPrefix(name, "mosaic.") {
					t.Errorf("%s is not what it should be", name)
				}
			}

			if err := syscall.Mount("tmpfs", disk, "tmpfs", syscall.MS_REMOUNT, "size=8m"); err != nil {
				t.Fatal(err)
			}
			code, stdout, stderr = typed(t, "batch", "plan.toml", "--out", out)
			if code != exitDone {
				t.Fatalf("with room: exit %d: %s", code, stderr)
			}
			if kept := fmt.Sprintf("%d unchanged since an earlier run", len(told)); len(told) > 0 && !strings.Contains(stdout, kept) {
				t.Errorf("%q is not told: %s", kept, stdout)
			}
			sameResults(t, "with room", want, results(t, out))
		})
	}
}

// toldOf are the regions that a ledger has lines of, each of which must be whole.
func toldOf(t *testing.T, path string) map[string]bool {
	t.Helper()
	text, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	told := map[string]bool{}
	for line := range bytes.Lines(text) {
		var l struct{ Region, Status string }
		if err := json.Unmarshal(line, &l); err != nil || l.Region == "" || l.Status == "failed" || !bytes.HasSuffix(line, []byte("}\n")) {
			t.Fatalf("%s: %v: %s", path, err, line)
		}
		told[l.Region] = true
	}
	return told
}
