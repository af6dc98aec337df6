package main

import (
	"bytes"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strings"
	"testing"
)

// TestDemoBatch: the demonstration of a batch makes what it says, tells what each command came to, ends well, and comes to
// the same bytes every time.
func TestDemoBatch(t *testing.T) {
	if testing.Short() {
		t.Skip("takes some seconds")
	}
	t.Chdir(t.TempDir())
	demo := func(code int, flags ...string) (stdout, stderr string) {
		t.Helper()
		c := exec.Command("drumlin", append([]string{"demo", "--batch", "--out", "show"}, flags...)...)
		var out, told bytes.Buffer
		c.Stdout, c.Stderr = &out, &told
		c.Run()
		if got := c.ProcessState.ExitCode(); got != code {
			t.Fatalf("%v: exit %d: %s%s", flags, got, out.String(), told.String())
		}
		return out.String(), told.String()
	}
	first, stderr := demo(exitDone)
	if stderr != "" {
		t.Errorf("on standard error is %q", stderr)
	}
	for _, want := range []string{
		"\n  drumlin batch plan.toml --out maps --check\n", "\nplan     plan.toml: 24 regions, 24 new; nothing was run\n",
		"\n  drumlin batch plan.toml --out maps\n", "\nregions  24: 23 done, ", "\nfailed   Farskerrow: ", "\nexit     3: of 24 regions, 1 failed\n",
		"23 unchanged since an earlier run", "\n  drumlin batch plan.toml --out maps --gather\n", "show/commands.txt\n",
	} {
		if !strings.Contains(first, want) {
			t.Errorf("%q is not told:\n%s", want, first)
		}
	}
	if strings.Contains(first, ".partial") {
		t.Error("the folder is told by another name than it has")
	}
	for _, name := range []string{"plan.toml", "commands.txt", "data/posts.csv", "maps/ledger.csv", "maps/regions.csv", "maps/mosaic.csv", "maps/mosaic.png", "maps/breaks.toml",
		"maps/Lorquith/map.png", "maps/Lorquith/chance.png", "maps/Jurrowdale/set-aside.csv"} {
		if info, err := os.Stat(filepath.Join("show", name)); err != nil || info.Size() == 0 {
			t.Errorf("%s: %v", name, err)
		}
	}
	want := results(t, "show")
	for _, times := range []string{"maps/ledger.csv", "maps/ledger.jsonl"} {
		delete(want, times)
	}

	if _, stderr := demo(exitRequest); !strings.Contains(stderr, "show exists already") {
		t.Errorf("again without --force: %s", stderr)
	}
	again, _ := demo(exitDone, "--force", "--workers", "1")
	if again != first {
		t.Errorf("again it tells:\n%s", again)
	}
	got := results(t, "show")
	for _, times := range []string{"maps/ledger.csv", "maps/ledger.jsonl"} {
		delete(got, times)
	}
	sameResults(t, "again", want, got)
	if left, _ := filepath.Glob("show.*"); left != nil {
		t.Errorf("left behind: %v", left)
	}

	// The commands can be run from within, as it says: nothing is left to be done.
	c := exec.Command("sh", "commands.txt")
	c.Dir = "show"
	said, err := c.Output()
	if n := len(regexp.MustCompile(`(?m)^regions  24: 23 done, 23 unchanged`).FindAll(said, -1)); n != 3 {
		t.Errorf("%v: the commands say:\n%s", err, said)
	}
	if !strings.Contains(string(said), "1 failed before, 23 unchanged; nothing was run") {
		t.Errorf("the first command says:\n%s", said)
	}
}
