//go:build unix

package main

import (
	"bytes"
	"crypto/sha256"
	"errors"
	"fmt"
	"io/fs"
	"math"
	"math/rand/v2"
	"os"
	"os/exec"
	"path/filepath"
	"strings"
	"syscall"
	"testing"
	"time"
)

// vales writes n tables of counts on plots, of 30 to 130 rows, and a plan that maps them without pictures. Every 50th
// region is too small to map, so that failures are among what has to come out the same.
func vales(t *testing.T, n int) (plan string) {
	t.Helper()
	dir := t.TempDir()
	if err := os.Mkdir(filepath.Join(dir, "data"), 0o755); err != nil {
		t.Fatal(err)
	}
	random := rand.New(rand.NewPCG(4, 200))
	for r := range n {
		var b strings.Builder
		b.WriteString("x,y,stems,plot_ha\n")
		rows := 30 + random.IntN(100)
		if r%50 == 49 {
			rows = 2
		}
		for range rows {
			x, y := 5000*random.Float64(), 4000*random.Float64()
			level := math.Exp(1 + math.Sin(x/900+float64(r)) + math.Cos(y/700))
			fmt.Fprintf(&b, "%.1f,%.1f,%d,0.5\n", x, y, int(level*(0.5+random.Float64())))
		}
		if err := os.WriteFile(filepath.Join(dir, "data", fmt.Sprintf("vale-%03d.csv", r)), []byte(b.String()), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	plan = filepath.Join(dir, "plan.toml")
	text := "[defaults]\nresponse = \"stems\"\narea = \"plot_ha\"\nmax_knots = 40\ncells_across = 25\nwrite = [\"csv\", \"saved\"]\n" +
		"[regions]\nfiles = \"data/*.csv\"\n"
	if err := os.WriteFile(plan, []byte(text), 0o644); err != nil {
		t.Fatal(err)
	}
	return plan
}

// ended runs a batch to its end and demands the exit code.
func ended(t *testing.T, code int, args ...string) (stdout, stderr string) {
	t.Helper()
	c := exec.Command("drumlin", append([]string{"batch"}, args...)...)
	var out, told bytes.Buffer
	c.Stdout, c.Stderr = &out, &told
	err := c.Run()
	got := 0
	var exit *exec.ExitError
	if errors.As(err, &exit) {
		got = exit.ExitCode()
	} else if err != nil {
		t.Fatal(err)
	}
	if got != code {
		t.Fatalf("batch %s ended with %d, want %d\n%s%s", strings.Join(args, " "), got, code, out.String(), told.String())
	}
	return out.String(), told.String()
}

// results are the checksums of all files of a batch that are to be the same every time: all but the ledger, which tells
// times, and job files and locks.
func results(t *testing.T, dir string) map[string]string {
	t.Helper()
	sums := map[string]string{}
	err := filepath.WalkDir(dir, func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		name, err := filepath.Rel(dir, path)
		if err != nil {
			return err
		}
		if strings.HasPrefix(name, "ledger.") || strings.HasPrefix(name, "batch.") {
			return nil
		}
		text, err := os.ReadFile(path)
		sums[name] = fmt.Sprintf("%x", sha256.Sum256(text))
		return err
	})
	if err != nil {
		t.Fatal(err)
	}
	return sums
}

func sameResults(t *testing.T, what string, want, got map[string]string) {
	t.Helper()
	for name, sum := range want {
		if got[name] == "" {
			t.Errorf("%s: %s is missing", what, name)
		} else if got[name] != sum {
			t.Errorf("%s: %s differs", what, name)
		}
	}
	for name := range got {
		if want[name] == "" {
			t.Errorf("%s: %s should not be there", what, name)
		}
	}
}

// TestBatchKilled kills a batch of 200 regions twenty times, at moments spread over the run, and starts it again: in the
// end everything is as after one undisturbed run, after one with a single worker, and after four parts that were gathered.
func TestBatchKilled(t *testing.T) {
	regions, kills := 200, 20
	if testing.Short() {
		regions, kills = 60, 4
	}
	plan := vales(t, regions)
	out := t.TempDir()
	calm := filepath.Join(out, "calm")
	at := time.Now()
	ended(t, exitRegions, plan, "--out", calm, "--quiet")
	whole := time.Since(at)
	want := results(t, calm)
	if n := len(want); n < 4*(regions-regions/50) {
		t.Fatalf("only %d files came of it", n)
	}

	shaken := filepath.Join(out, "shaken")
	random := rand.New(rand.NewPCG(9, 9))
	killed := 0
	for k := range 10 * kills {
		if killed == kills {
			break
		}
		c := exec.Command("drumlin", "batch", plan, "--out", shaken, "--quiet")
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		// Each start gets a twentieth of the whole run, more or less, and so the kills are spread over it.
		time.Sleep(time.Duration(float64(whole) / float64(kills) * (0.3 + 1.2*random.Float64())))
		c.Process.Signal(syscall.SIGKILL)
		if err := c.Wait(); err != nil && strings.Contains(err.Error(), "killed") {
			killed++
		} else if k == 0 {
			t.Fatalf("the batch was over before it could be killed: %v", err)
		}
		for name, sum := range results(t, shaken) {
			if strings.Contains(name, ".partial") || strings.HasSuffix(name, ".lock") {
				continue // cleared by the next start
			}
			if want[name] != "" && want[name] != sum && name != "regions.csv" && name != "mosaic.csv" {
				t.Fatalf("after %d kills %s is not what it should be", killed, name)
			}
		}
	}
	if killed < kills {
		t.Logf("the batch was done after %d kills of %d", killed, kills)
	}
	if killed < kills/2 {
		t.Errorf("only %d kills hit the running batch", killed)
	}
	ended(t, exitRegions, plan, "--out", shaken, "--quiet")
	sameResults(t, "killed and started again", want, results(t, shaken))

	single := filepath.Join(out, "single")
	ended(t, exitRegions, plan, "--out", single, "--workers", "1", "--quiet")
	sameResults(t, "one worker", want, results(t, single))

	parts := filepath.Join(out, "parts")
	for _, k := range []int{3, 1, 4, 2} {
		c := exec.Command("drumlin", "batch", plan, "--out", parts, "--part", fmt.Sprintf("%d/4", k), "--quiet")
		if text, err := c.CombinedOutput(); err != nil {
			var exit *exec.ExitError
			if !errors.As(err, &exit) || exit.ExitCode() != exitRegions {
				t.Fatalf("part %d: %v: %s", k, err, text)
			}
		}
	}
	ended(t, exitRegions, plan, "--out", parts, "--gather", "--quiet")
	sameResults(t, "four parts gathered", want, results(t, parts))
}

// TestBatchStopped: an interrupt ends a batch within two seconds, what is done stays done, and the next run goes on.
func TestBatchStopped(t *testing.T) {
	plan := vales(t, 60)
	out := filepath.Join(t.TempDir(), "maps")
	for _, signal := range []os.Signal{os.Interrupt, syscall.SIGTERM} {
		c := exec.Command("drumlin", "batch", plan, "--out", out, "--workers", "1")
		var told bytes.Buffer
		c.Stderr = &told
		if err := c.Start(); err != nil {
			t.Fatal(err)
		}
		before := folders(t, out)
		for range 2000 {
			if time.Sleep(5 * time.Millisecond); folders(t, out) > before+2 {
				break
			}
		}
		at := time.Now()
		if err := c.Process.Signal(signal); err != nil {
			t.Fatal(err)
		}
		err := c.Wait()
		var exit *exec.ExitError
		if !errors.As(err, &exit) || exit.ExitCode() != exitInterrupted || time.Since(at) > 2*time.Second {
			t.Errorf("%v: %v after %v", signal, err, time.Since(at))
		}
		if !strings.HasSuffix(told.String(), "drumlin: interrupted\n") {
			t.Errorf("%v: it said %q", signal, told.String())
		}
		ledger, err := os.ReadFile(filepath.Join(out, "ledger.jsonl"))
		if err != nil {
			t.Fatal(err)
		}
		fresh := strings.Count(string(ledger), `"status":"done"`) + strings.Count(string(ledger), `"status":"look"`)
		if n := folders(t, out); fresh != n {
			t.Errorf("%v: the ledger tells of %d folders, and there are %d", signal, fresh, n)
		}
		if partial, _ := filepath.Glob(filepath.Join(out, "*.partial")); len(partial) > 0 {
			t.Errorf("%v: left behind: %v", signal, partial)
		}
	}
	said, _ := ended(t, exitRegions, plan, "--out", out)
	if !strings.Contains(said, "unchanged since an earlier run") || !strings.Contains(said, "regions  60: 59 done") {
		t.Errorf("the last run said %q", said)
	}
}

func folders(t *testing.T, dir string) int {
	t.Helper()
	found, err := filepath.Glob(filepath.Join(dir, "*", "summary.json"))
	if err != nil {
		t.Fatal(err)
	}
	n := 0
	for _, f := range found {
		if !strings.Contains(f, ".partial") {
			n++
		}
	}
	return n
}

// TestBatchTwice: a second run into the same folder is refused with the name of the first, and so are a gathering while a
// part runs and a part of another division; two parts of one division go together.
func TestBatchTwice(t *testing.T) {
	plan := vales(t, 60)
	out := filepath.Join(t.TempDir(), "maps")
	first := exec.Command("drumlin", "batch", plan, "--out", out, "--part", "1/2", "--workers", "1", "--quiet")
	if err := first.Start(); err != nil {
		t.Fatal(err)
	}
	for range 2000 {
		if time.Sleep(5 * time.Millisecond); folders(t, out) > 0 {
			break
		}
	}
	host, _ := os.Hostname()
	holder := fmt.Sprintf("part 1/2, process %d on %s", first.Process.Pid, host)
	for _, args := range [][]string{{}, {"--gather"}, {"--part", "1/2"}, {"--part", "2/3"}} {
		_, told := ended(t, exitRequest, append([]string{plan, "--out", out, "--quiet"}, args...)...)
		if !strings.Contains(told, holder) || !strings.Contains(told, "hint: wait for it") {
			t.Errorf("%v: refused with %q, which does not name %q", args, told, holder)
		}
	}
	second := exec.Command("drumlin", "batch", plan, "--out", out, "--part", "2/2", "--quiet")
	for _, c := range []*exec.Cmd{second, first} {
		var err error
		if c == second {
			err = c.Run()
		} else {
			err = c.Wait()
		}
		var exit *exec.ExitError
		if err != nil && (!errors.As(err, &exit) || exit.ExitCode() != exitRegions) {
			t.Errorf("%v: %v", c.Args, err)
		}
	}
	if left, _ := filepath.Glob(filepath.Join(out, "batch.part-*")); len(left) > 0 {
		t.Errorf("left behind: %v", left)
	}
}
