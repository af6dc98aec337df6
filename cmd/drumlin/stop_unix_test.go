//go:build unix

package main

import (
	"bytes"
	"errors"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// longRun starts a map that takes a second or more, in a folder of its own.
func longRun(t *testing.T, dir string) *exec.Cmd {
	t.Helper()
	data, err := filepath.Abs("../../testdata/meuse.csv")
	if err != nil {
		t.Fatal(err)
	}
	c := exec.Command("drumlin", "map", data, "--response", "zinc", "--threshold", "500", "--max-knots", "60", "--cells-across", "500", "--out", "maps/out")
	c.Dir = dir
	c.Stderr = &bytes.Buffer{}
	if err := c.Start(); err != nil {
		t.Fatal(err)
	}
	return c
}

// await waits until a file of the run is there.
func await(t *testing.T, c *exec.Cmd, name string) {
	t.Helper()
	path := filepath.Join(c.Dir, "maps", name)
	for range 6000 {
		if _, err := os.Stat(path); err == nil {
			return
		}
		time.Sleep(5 * time.Millisecond)
	}
	c.Process.Kill()
	c.Wait()
	t.Fatalf("%s did not appear within 30 s", name)
}

// moments of a run, by the file that has just been begun.
var moments = []string{"out.partial", "out.partial/surface.csv", "out.partial/surface.geojson", "out.partial/map.png"}

// TestStopped: an interrupt or a request to end leaves nothing, at once and wherever the run stands.
func TestStopped(t *testing.T) {
	if testing.Short() {
		t.Skip("takes some seconds")
	}
	for k, moment := range moments {
		dir := t.TempDir()
		c := longRun(t, dir)
		await(t, c, moment)
		signal := []os.Signal{os.Interrupt, syscall.SIGTERM}[k%2]
		at := time.Now()
		if err := c.Process.Signal(signal); err != nil {
			t.Fatal(err)
		}
		err := c.Wait()
		took := time.Since(at)
		var exit *exec.ExitError
		if !errors.As(err, &exit) || exit.ExitCode() != exitInterrupted {
			t.Errorf("%v at %s: %v", signal, moment, err)
		}
		if took > 2*time.Second {
			t.Errorf("%v at %s: it took %v to end", signal, moment, took)
		}
		if said := c.Stderr.(*bytes.Buffer).String(); said != "drumlin: interrupted\n" {
			t.Errorf("%v at %s: said %q", signal, moment, said)
		}
		nothingIn(t, dir)
	}
}

func nothingIn(t *testing.T, dir string) {
	t.Helper()
	left, err := filepath.Glob(filepath.Join(dir, "*"))
	if err != nil {
		t.Fatal(err)
	}
	if len(left) > 0 {
		more, _ := filepath.Glob(filepath.Join(dir, "*", "*"))
		t.Errorf("left behind: %s", strings.Join(append(left, more...), " "))
	}
}

// TestKilled: what a killed run leaves is cleared by the next one, and is never taken for a result.
func TestKilled(t *testing.T) {
	if testing.Short() {
		t.Skip("takes some seconds")
	}
	dir := t.TempDir()
	for _, moment := range moments {
		c := longRun(t, dir)
		await(t, c, moment)
		if err := c.Process.Kill(); err != nil {
			t.Fatal(err)
		}
		if err := c.Wait(); err == nil {
			t.Fatalf("at %s it was over already", moment)
		}
		if _, err := os.Stat(filepath.Join(dir, "maps", "out")); err == nil {
			t.Errorf("killed at %s, and the folder is there", moment)
		}
	}
	data, _ := filepath.Abs("../../testdata/meuse.csv")
	again := exec.Command("drumlin", "map", data, "--response", "zinc", "--cells-across", "20", "--write", "csv", "--out", "maps/out", "--quiet")
	again.Dir = dir
	if out, err := again.CombinedOutput(); err != nil || len(out) > 0 {
		t.Fatalf("%v: %s", err, out)
	}
	names, _ := filepath.Glob(filepath.Join(dir, "maps", "*"))
	inside, _ := filepath.Glob(filepath.Join(dir, "maps", "out", "*"))
	if len(names) != 1 || len(inside) != 3 {
		t.Errorf("after the next run there are %v with %v", names, inside)
	}
}

// TestTwoAtOnce: the second of two runs into one folder is refused before it does any work, and the first is not
// disturbed.
func TestTwoAtOnce(t *testing.T) {
	if testing.Short() {
		t.Skip("takes some seconds")
	}
	dir := t.TempDir()
	first := longRun(t, dir)
	await(t, first, "out.partial")
	second := longRun(t, dir)
	err := second.Wait()
	var exit *exec.ExitError
	if !errors.As(err, &exit) || exit.ExitCode() != exitRequest {
		t.Errorf("the second: %v", err)
	}
	if said := second.Stderr.(*bytes.Buffer).String(); said != "drumlin: another drumlin is writing maps/out\nhint: wait for it, or name another output\n" {
		t.Errorf("the second said %q", said)
	}
	if err := first.Wait(); err != nil {
		t.Fatalf("the first: %v: %s", err, first.Stderr)
	}
	names, _ := filepath.Glob(filepath.Join(dir, "maps", "*"))
	inside, _ := filepath.Glob(filepath.Join(dir, "maps", "out", "*"))
	if len(names) != 1 || len(inside) != 10 {
		t.Errorf("there are %v with %v", names, inside)
	}
}
