package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"os"
	"path/filepath"
	"reflect"
	"strings"
	"testing"

	"drumlin/cmd/internal/batch"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// record is what the functions behind the commands were asked to do.
type record struct {
	settings []plan.Settings
	dirs     []string
	reuse    []pipeline.ReuseRequest
	folders  []string
	forced   []bool
}

// faked is a program whose functions only note what they are asked for and return err.
func faked(err error) (p program, got *record, stdout, stderr *bytes.Buffer) {
	got, stdout, stderr = &record{}, &bytes.Buffer{}, &bytes.Buffer{}
	p = program{stdin: strings.NewReader(""), stdout: stdout, stderr: stderr, work: work{
		run: func(_ context.Context, s plan.Settings, dir string, ev pipeline.Events) (summary.Document, error) {
			ev.Stage("fit", 1, 2)
			got.settings, got.dirs = append(got.settings, s), append(got.dirs, dir)
			return summary.Document{}, err
		},
		reuse: func(_ context.Context, r pipeline.ReuseRequest, ev pipeline.Events) error {
			ev.Stage("predict", 1, 2)
			got.reuse = append(got.reuse, r)
			return err
		},
		batch: func(context.Context, *batch.Batch, string, batch.Options, batch.Events) (batch.Report, error) {
			return batch.Report{}, err
		},
		folder: func(_ context.Context, dir string, force bool, fill func(string) error) error {
			got.folders, got.forced = append(got.folders, dir), append(got.forced, force)
			partial := dir + ".partial"
			if err := os.Mkdir(partial, 0o777); err != nil {
				return err
			}
			return fill(partial)
		},
	}}
	return p, got, stdout, stderr
}

func line(args ...string) []string { return append([]string{"drumlin"}, args...) }

func TestMapHandsOverTheSettings(t *testing.T) {
	p, got, _, stderr := faked(nil)
	code := p.run(t.Context(), line("map", "--response", "stems, counted", "wells.csv", "--threshold", "-3", "--linear=a,b",
		"--linear", "c", "--hold", "a,b=-1.5", "--hold=c=mean", "--strict", "--out", "maps", "--workers", "2"))
	if code != exitDone || stderr.Len() > 0 {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	s := got.settings[0]
	if *s.Observations != "wells.csv" || *s.Response != "stems, counted" || *s.Threshold != -3 || !*s.Strict || *s.Workers != 2 {
		t.Errorf("got %v", s.Effective())
	}
	if want := []string{"a,b", "c"}; !reflect.DeepEqual(s.Linear, want) {
		t.Errorf("linear: %q", s.Linear)
	}
	if want := []plan.Hold{{Name: "a,b", Value: "-1.5"}, {Name: "c", Value: "mean"}}; !reflect.DeepEqual(s.Hold, want) {
		t.Errorf("hold: %v", s.Hold)
	}
	if got.dirs[0] != "maps" {
		t.Errorf("out: %q", got.dirs)
	}
	// The settings come resolved: with the defaults and the choices that need no data.
	if !s.MaxKnots.Auto || *s.Distribution != plan.Gaussian || s.Said("distribution") {
		t.Errorf("got %v", s.Effective())
	}
}

// TestEveryWordIsAFlag: whatever plan lists can be said to map.
func TestEveryWordIsAFlag(t *testing.T) {
	var r mapRequest
	c := r.command()
	for _, w := range plan.Words() {
		o, ok := named(c.options, w.Name)
		if w.Name == "observations" {
			if ok {
				t.Error("the observations are an argument and a flag")
			}
			continue
		}
		if !ok || o.arg != w.Arg || o.repeat != w.Repeat || o.help != w.Help {
			t.Errorf("%s: %+v", w.Name, o)
		}
	}
	if len(c.options) != len(plan.Words()) { // one less for the observations, one more for --out
		t.Errorf("%d flags for %d words", len(c.options), len(plan.Words()))
	}
}

func TestReuseHandsOverTheRequest(t *testing.T) {
	p, got, stdout, stderr := faked(nil)
	code := p.run(t.Context(), line("reuse", "--at", "new.csv", "--force", "old.surface", "--out=new-levels.csv", "--workers", "3"))
	want := pipeline.ReuseRequest{Saved: "old.surface", At: "new.csv", Out: "new-levels.csv", Force: true, Workers: 3}
	if code != exitDone || stderr.Len() > 0 || len(got.reuse) != 1 || got.reuse[0] != want {
		t.Fatalf("exit %d, %+v: %s", code, got.reuse, stderr)
	}
	if stdout.String() != "Predicted at the places of new.csv; the table is new-levels.csv\n" {
		t.Errorf("said %q", stdout)
	}
	p, got, stdout, _ = faked(nil)
	if code := p.run(t.Context(), line("reuse", "old.surface", "--at", "new.csv", "--out", "o.csv", "--quiet")); code != exitDone || stdout.Len() > 0 {
		t.Errorf("exit %d, said %q", code, stdout)
	}
	if r := got.reuse[0]; r.Force || r.Workers < 1 {
		t.Errorf("got %+v", r)
	}
}

func TestDemoRunsItsCommands(t *testing.T) {
	p, got, stdout, stderr := faked(nil)
	out := filepath.Join(t.TempDir(), "show")
	if code := p.run(t.Context(), line("demo", "--out", out, "--force", "--workers", "1")); code != exitDone || stderr.Len() > 0 {
		t.Fatalf("exit %d: %s", code, stderr)
	}
	if !reflect.DeepEqual(got.folders, []string{out}) || !got.forced[0] {
		t.Errorf("folders %q, forced %v", got.folders, got.forced)
	}
	if len(got.settings) != 3 {
		t.Fatalf("%d maps", len(got.settings))
	}
	for i, s := range got.settings {
		if filepath.Dir(got.dirs[i]) != out+".partial" || *s.Workers != 1 || *s.Quiet {
			t.Errorf("map %d goes to %q with %d workers", i, got.dirs[i], *s.Workers)
		}
		for _, name := range s.Files() {
			if _, err := os.Stat(name); err != nil {
				t.Error(err)
			}
		}
	}
	if !strings.Contains(stdout.String(), "drumlin map data/villages.csv") || !strings.Contains(stdout.String(), out) {
		t.Errorf("said %q", stdout)
	}

	p, _, stdout, _ = faked(nil)
	if code := p.run(t.Context(), line("demo", "--out", filepath.Join(t.TempDir(), "still"), "--quiet")); code != exitDone || stdout.Len() > 0 {
		t.Errorf("exit %d, said %q", code, stdout)
	}
}

func TestDemoSaysNothingAfterAFailure(t *testing.T) {
	p, got, stdout, stderr := faked(errors.New("no room"))
	code := p.run(t.Context(), line("demo", "--out", filepath.Join(t.TempDir(), "show")))
	if code != exitRequest || stdout.Len() > 0 || stderr.String() != "drumlin: no room\n" || len(got.settings) != 1 {
		t.Errorf("exit %d after %d maps, said %q and %q", code, len(got.settings), stdout, stderr)
	}
}

type hopeless struct{}

func (hopeless) Error() string   { return "depth repeats height" }
func (hopeless) FitFailed() bool { return true }
func (hopeless) Hint() string    { return "leave one out" }

type unfit struct{ hopeless }

func (unfit) FitFailed() bool { return false }

type bare struct{ error }

func (bare) Hint() string    { return "" }
func (b bare) Unwrap() error { return b.error }

func TestErrorsAndExitCodes(t *testing.T) {
	tests := []struct {
		name   string
		err    error
		code   int
		stderr string
	}{
		{"done", nil, 0, ""},
		{"any error", errors.New("wells.csv: row 412: no"), 2, "drumlin: wells.csv: row 412: no\n"},
		{"a fit", hopeless{}, 4, "drumlin: depth repeats height\nhint: leave one out\n"},
		{"a wrapped fit", fmt.Errorf("wells.csv: %w", hopeless{}), 4, "drumlin: wells.csv: depth repeats height\nhint: leave one out\n"},
		{"not a fit after all", unfit{}, 2, "drumlin: depth repeats height\nhint: leave one out\n"},
		{"a hint under an empty one", bare{hopeless{}}, 4, "drumlin: depth repeats height\nhint: leave one out\n"},
		{"interrupted", fmt.Errorf("fit: %w", context.Canceled), 130, "drumlin: interrupted\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			p, _, _, stderr := faked(test.err)
			code := p.run(t.Context(), line("map", "wells.csv", "--response", "zn", "--out", "maps"))
			if code != test.code || stderr.String() != test.stderr {
				t.Errorf("exit %d, %q", code, stderr)
			}
		})
	}
}

// TestUsage pins what is said of a request that cannot be carried out: on standard error, once, without the help, with
// exit code 2, and before any work is done.
func TestUsage(t *testing.T) {
	tests := []struct {
		name   string
		args   string // split at blanks
		stderr string
	}{
		{"unknown flag", "map w.csv --treshold 3 --out o", "unknown flag --treshold\nhint: did you mean --threshold?"},
		{"unknown flag with a value", "map w.csv --treshold=3", "unknown flag --treshold\nhint: did you mean --threshold?"},
		{"unknown flag like none", "map w.csv --banana 3", "unknown flag --banana\nhint: drumlin map --help lists the flags"},
		{"one hyphen", "map w.csv -response zn", "unknown flag -response\nhint: did you mean --response?"},
		{"a number as a flag", "map -3", "unknown flag -3\nhint: drumlin map --help lists the flags"},
		{"the flag of another command", "reuse s --at a --out o --per 3", "unknown flag --per\nhint: drumlin reuse --help lists the flags"},
		{"no value at the end", "map w.csv --response", "--response needs a value\nhint: write --response COLUMN"},
		{"no value before a flag", "map w.csv --response --out o", "--response needs a value\nhint: write --response COLUMN, or --response=COLUMN if it begins with a hyphen"},
		{"no value before the end of flags", "map --response -- w.csv", "--response needs a value\nhint: write --response COLUMN"},
		{"given twice", "map w.csv --response zn --response=cd", "--response is given twice\nhint: keep one of the two"},
		{"no observations", "map --response zn --out o", "map needs a file of observations\nhint: drumlin map OBS --response COLUMN --out DIR [flags]"},
		{"two files", "map w.csv v.csv --response zn --out o", "unexpected argument \"v.csv\": a file of observations is \"w.csv\" already\n" +
			"hint: quote a value that has spaces in it; the form is drumlin map OBS --response COLUMN --out DIR [flags]"},
		{"no out", "map w.csv --response zn", "map needs --out: the folder to write; it appears whole or not at all\nhint: add --out DIR"},
		{"empty out", "map w.csv --response zn --out=", "--out: nothing is given"},
		{"no response", "map w.csv --out o", "response: the column with the response is not named\nhint: add --response COLUMN"},
		{"a bad value", "map w.csv --response zn --out o --per none", "per: \"none\" is not a number"},
		{"a bad value beside a missing file", "map --response zn --per 1,5", "per: \"1,5\" is not a number\nhint: write a decimal point, not a comma"},
		{"words that clash", "map w.csv --response zn --out o --people p --area a_ha", "area: people is named as well; a count has one denominator\nhint: keep the one the counts are to be divided by"},
		{"a flag that is neither on nor off", "map w.csv --response zn --out o --strict=5", "strict: \"5\" is neither true nor false"},
		{"out is the input", "map w.csv --response zn --out ./w.csv", "--out ./w.csv is also an input\nhint: choose another name for the output"},
		{"out holds the input", "map data/w.csv --response zn --out data --force", "--out data holds the input data/w.csv\nhint: choose another folder"},
		{"out is where we are", "map ../w.csv --response zn --out . --force", "--out . is the current folder or one above it\nhint: name a folder of its own for the output"},
		{"demo where we are", "demo --out .. --force", "--out .. is the current folder or one above it\nhint: name a folder of its own for the output"},
		{"unknown command", "mpa w.csv", "unknown command \"mpa\"\nhint: did you mean drumlin map?"},
		{"command like none", "kriging w.csv", "unknown command \"kriging\"\nhint: the commands are map, batch, inspect, reuse, demo"},
		{"flag before the command", "--quiet map w.csv", "unknown flag --quiet before a command\nhint: flags stand after the command; drumlin --help lists the commands"},
		{"help for nothing there is", "help maps", "unknown command \"maps\"\nhint: did you mean drumlin map?"},
		{"help for two", "help map reuse", "help takes one command, not 2\nhint: for example drumlin help map"},
		{"no saved surface", "reuse --at a.csv --out o.csv", "reuse needs a saved surface\nhint: drumlin reuse SAVED --at FILE --out FILE [flags]"},
		{"no places", "reuse s.surface --out o.csv", "reuse needs --at: the table of places to predict at\nhint: add --at FILE"},
		{"no table", "reuse s.surface --at a.csv", "reuse needs --out: the table to write; it appears whole or not at all\nhint: add --out FILE"},
		{"table over places", "reuse s.surface --at a.csv --out a.csv --force", "--out a.csv is also an input\nhint: choose another name for the output"},
		{"table over surface", "reuse s.surface --at a.csv --out s.surface --force", "--out s.surface is also an input\nhint: choose another name for the output"},
		{"demo of something", "demo w.csv --out o", "unexpected argument \"w.csv\"\nhint: the form is drumlin demo --out DIR [flags]"},
		{"demo to nowhere", "demo", "demo needs --out: the folder to write; it appears whole or not at all\nhint: add --out DIR"},
	}
	seen := map[string]bool{}
	for _, test := range tests {
		if seen[test.name] {
			t.Errorf("two cases named %q", test.name)
		}
		seen[test.name] = true
		t.Run(test.name, func(t *testing.T) {
			p, got, stdout, stderr := faked(nil)
			code := p.run(t.Context(), line(strings.Fields(test.args)...))
			if code != exitRequest || stdout.Len() > 0 {
				t.Errorf("exit %d, standard output %q", code, stdout)
			}
			if want := "drumlin: " + test.stderr + "\n"; stderr.String() != want {
				t.Errorf("got  %q\nwant %q", stderr, want)
			}
			if len(got.settings)+len(got.reuse)+len(got.folders) > 0 {
				t.Error("some work was begun all the same")
			}
		})
	}
}

func TestKeepApartSeesThroughLinks(t *testing.T) {
	dir := t.TempDir()
	if err := os.Mkdir(filepath.Join(dir, "data"), 0o777); err != nil {
		t.Fatal(err)
	}
	if err := os.Symlink("data", filepath.Join(dir, "link")); err != nil {
		t.Skip(err)
	}
	t.Chdir(dir)
	if err := keepApart("link", "data/w.csv"); err == nil {
		t.Error("a link to the folder of the input is taken for another folder")
	}
	if err := keepApart("link/new", "data/w.csv"); err != nil {
		t.Error(err)
	}
	if err := keepApart("data-2", "data/w.csv"); err != nil {
		t.Error(err)
	}
	if err := keepApart("..data", "w.csv"); err != nil {
		t.Error(err)
	}
}

type brokenPipe struct{}

func (brokenPipe) Write([]byte) (int, error) { return 0, errors.New("nobody listens") }

func TestStandardOutputThatFails(t *testing.T) {
	p, _, _, stderr := faked(nil)
	p.stdout = brokenPipe{}
	if code := p.run(t.Context(), line("reuse", "s", "--at", "a", "--out", "o")); code != exitRequest {
		t.Errorf("exit %d", code)
	}
	if stderr.String() != "drumlin: standard output: nobody listens\n" {
		t.Errorf("said %q", stderr)
	}
}
