package batch

import (
	"bytes"
	"errors"
	"fmt"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"

	"drumlin/cmd/internal/pipeline"
)

// ledgerChild starts this test's binary again to do one of the tasks of TestLedgerChild in a folder.
func ledgerChild(t *testing.T, task, dir string) (*exec.Cmd, *bytes.Buffer) {
	t.Helper()
	c := exec.Command(os.Args[0], "-test.run=^TestLedgerChild$", "-test.v")
	c.Env = append(os.Environ(), "LEDGER_TASK="+task, "LEDGER_DIR="+dir)
	said := &bytes.Buffer{}
	c.Stdout, c.Stderr = said, said
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	return c, said
}

// TestLedgerChild is what other tests start as a process of its own, which has limits or is killed.
func TestLedgerChild(t *testing.T) {
	dir := os.Getenv("LEDGER_DIR")
	switch os.Getenv("LEDGER_TASK") {
	case "":
		t.Skip("only for a process that another test starts")
	case "fill":
		fillDisk(t, dir)
	case "merge on a full disk":
		limitFiles(t, 1000)
		err := MergeLedgers(dir)
		advised(t, "merging", err, "there is no room left to write it")
		if !pipeline.NoRoom(err) {
			t.Errorf("it is not told for a full disk: %v", err)
		}
	case "merge":
		if err := MergeLedgers(dir); err != nil {
			t.Fatal(err)
		}
	}
}

// limitFiles lets no file become longer than a number of bytes: a write past it comes short, as on a full disk.
func limitFiles(t *testing.T, bytes uint64) {
	t.Helper()
	var limit syscall.Rlimit
	if err := syscall.Getrlimit(syscall.RLIMIT_FSIZE, &limit); err != nil {
		t.Fatal(err)
	}
	limit.Cur = min(bytes, limit.Max)
	if err := syscall.Setrlimit(syscall.RLIMIT_FSIZE, &limit); err != nil {
		t.Fatal(err)
	}
}

// fillDisk adds lines under limits that end in each part of a line.
func fillDisk(t *testing.T, dir string) {
	l, _, err := OpenLedger(dir, "")
	if err != nil {
		t.Fatal(err)
	}
	line := ledgerLine("north", 1)
	length := uint64(len(encoded(t, line)))
	held := uint64(0)
	for _, room := range []uint64{0, 1, length / 2, length - 1, length, length + 1, 3*length - 1} {
		limitFiles(t, held*length+room)
		for n := uint64(0); ; n++ {
			err := l.Append(line)
			if err == nil {
				held++
				continue
			}
			advised(t, "adding", err, filepath.Join(dir, "ledger.jsonl")+": there is no room left to write it")
			if !pipeline.NoRoom(err) {
				t.Errorf("it is not told for a full disk: %v", err)
			}
			if n != room/length {
				t.Errorf("%d bytes: %d lines were taken", room, n)
			}
			break
		}
		if got := laid(t, dir)["ledger.jsonl"]; uint64(len(got)) != held*length || !strings.HasSuffix("\n"+got, "\n") {
			t.Errorf("%d bytes: half a line is left", room)
		}
	}
	limitFiles(t, 1<<40)
	if err := errors.Join(l.Append(ledgerLine("south", 2)), l.Close()); err != nil {
		t.Errorf("with room again: %v", err)
	}
}

func TestFullDiskUnderTheLedger(t *testing.T) {
	dir := t.TempDir()
	c, said := ledgerChild(t, "fill", dir)
	if err := c.Wait(); err != nil {
		t.Fatalf("%v:\n%s", err, said)
	}
	lines, err := ReadLedgers(dir)
	if err != nil {
		t.Fatal(err)
	}
	want := []Line{ledgerLine("north", 1), ledgerLine("north", 1), ledgerLine("north", 1), ledgerLine("north", 1), ledgerLine("south", 2)}
	sameLines(t, "what had room", lines, want)
}

func TestFullDiskUnderAMerge(t *testing.T) {
	files, merged := partsToMerge(t)
	dir := t.TempDir()
	lay(t, dir, files)
	c, said := ledgerChild(t, "merge on a full disk", dir)
	if err := c.Wait(); err != nil {
		t.Fatalf("%v:\n%s", err, said)
	}
	now := laid(t, dir)
	for name, want := range files {
		if now[name] != string(want) {
			t.Errorf("%s was changed", name)
		}
		delete(now, name)
	}
	for name := range now {
		t.Errorf("%s is left behind", name)
	}
	merges(t, "with room again", files, merged)
}

// TestMergeIsKilled kills a merge as soon as one of its steps shows in the folder, and then has another do the rest.
func TestMergeIsKilled(t *testing.T) {
	const parts, each = 4, 300
	files := map[string][]byte{}
	all := ""
	for part := range parts + 1 {
		var text bytes.Buffer
		for n := range each {
			text.Write(encoded(t, ledgerLine(fmt.Sprintf("%d-%d", part, n), n)))
		}
		name := fmt.Sprintf("ledger.part-%d-of-%d.jsonl", part, parts)
		if part == 0 {
			name = ledgerName
		}
		files[name] = text.Bytes()
		all += text.String()
	}
	size := func(path string) int64 {
		info, err := os.Stat(path)
		if err != nil {
			return -1
		}
		return info.Size()
	}
	killed := 0
	for name, shows := range map[string]func(dir string) bool{
		"begun":       func(dir string) bool { return size(filepath.Join(dir, "ledger.jsonl.partial")) >= 0 },
		"written":     func(dir string) bool { return size(filepath.Join(dir, "ledger.jsonl.partial")) == int64(len(all)) },
		"replaced":    func(dir string) bool { return size(filepath.Join(dir, ledgerName)) == int64(len(all)) },
		"one removed": func(dir string) bool { return size(filepath.Join(dir, "ledger.part-1-of-4.jsonl")) < 0 },
	} {
		dir := t.TempDir()
		lay(t, dir, files)
		c, said := ledgerChild(t, "merge", dir)
		for end := time.Now().Add(20 * time.Second); !shows(dir) && time.Now().Before(end); {
			time.Sleep(20 * time.Microsecond)
		}
		_ = c.Process.Kill()
		err := c.Wait()
		var exit *exec.ExitError
		if errors.As(err, &exit) && exit.Sys().(syscall.WaitStatus).Signal() == syscall.SIGKILL {
			killed++
		} else if err != nil {
			t.Fatalf("%s: %v:\n%s", name, err, said)
		}
		lines, err := ReadLedgers(dir)
		if err != nil {
			t.Fatal(err)
		}
		if known := Latest(lines); len(known) != (parts+1)*each {
			t.Errorf("%s: %d regions are left", name, len(known))
		}
		if err := MergeLedgers(dir); err != nil {
			t.Fatal(err)
		}
		if got := laid(t, dir); len(got) != 1 || got[ledgerName] != all {
			t.Errorf("%s: %d files are left", name, len(got))
		}
	}
	if killed == 0 {
		t.Error("none was killed")
	}
}
