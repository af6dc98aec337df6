package main

import (
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"os/exec"
	"path/filepath"
	"regexp"
	"strconv"
	"strings"
	"testing"

	"github.com/rogpeppe/go-internal/testscript"
)

var update = flag.Bool("update", false, "rewrite what the scripts compare with")

func TestMain(m *testing.M) {
	testscript.Main(m, map[string]func(){"drumlin": main, "figures": figures})
}

// observed are the open data sets that the scripts find in the folder $DATA; see testdata/README.md at the top.
var observed = []string{"meuse.csv", "nc_sids.csv", "nc_sids_counties.geojson", "burkina_faso_malaria.csv", "rongelap_radiation.csv", "beet_webworms.csv"}

// TestScripts runs the program as a person would. Each script keeps one promise.
func TestScripts(t *testing.T) {
	testscript.Run(t, testscript.Params{
		Dir:                 "testdata/script",
		RequireExplicitExec: true,
		RequireUniqueNames:  true,
		UpdateScripts:       *update,
		Setup:               bringData,
		Condition: func(name string) (bool, error) {
			if name == "root" {
				return os.Getuid() == 0, nil
			}
			return false, fmt.Errorf("unknown condition %q", name)
		},
		Cmds: map[string]func(*testscript.TestScript, bool, []string){
			"exitcode": exitcode, "refuses": refuses, "declines": declines, "same": same, "absent": absent,
		},
	})
}

// bringData copies the open data sets into the script's folder, and tells where the awkward files are.
func bringData(env *testscript.Env) error {
	awkward, err := filepath.Abs("../../testdata/awkward")
	if err != nil {
		return err
	}
	env.Setenv("AWKWARD", awkward)
	folder := filepath.Join(env.WorkDir, "observed")
	env.Setenv("DATA", folder)
	if err := os.Mkdir(folder, 0o755); err != nil {
		return err
	}
	for _, name := range observed {
		raw, err := os.ReadFile(filepath.Join("../../testdata", name))
		if err != nil {
			return err
		}
		if err := os.WriteFile(filepath.Join(folder, name), raw, 0o644); err != nil {
			return err
		}
	}
	return nil
}

// exitcode runs drumlin and demands the exit code: exitcode CODE ARGUMENT...
func exitcode(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 1 {
		ts.Fatalf("usage: exitcode CODE ARGUMENT...")
	}
	code := 0
	if err := ts.Exec("drumlin", args[1:]...); err != nil {
		var exit *exec.ExitError
		if !errors.As(err, &exit) {
			ts.Fatalf("%v", err)
		}
		code = exit.ExitCode()
	}
	if strconv.Itoa(code) != args[0] {
		ts.Fatalf("exit code %d, want %s", code, args[0])
	}
}

// message is what a refusal looks like: a line that says what is wrong, and one that says what to do if there is more to
// say than the first says already.
var message = regexp.MustCompile(`^drumlin: [^\n]+[^\n.]\n(hint: [^\n]+[^\n.]\n)?$`)

// insides are words of the machine that a person can do nothing with.
var insides = regexp.MustCompile(`panic|goroutine|runtime|strconv|\bopen /|lstat|mkdir|\bEOF\b|%!|\.partial|0x[0-9a-f]+|NaN|e[+-][0-9]{2}`)

// refuses runs a map command with --out added and demands the exit code, a message and advice that match the pattern,
// nothing on standard output, and that nothing was written: refuses CODE PATTERN ARGUMENT...
func refuses(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 3 {
		ts.Fatalf("usage: refuses CODE PATTERN ARGUMENT...")
	}
	refused(ts, args[0], args[1], append([]string{"map", "--out", "deep/refused"}, args[2:]...))
}

// declines is refuses for a batch command, whose arguments are all given: declines CODE PATTERN ARGUMENT...
func declines(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) < 3 {
		ts.Fatalf("usage: declines CODE PATTERN ARGUMENT...")
	}
	refused(ts, args[0], args[1], append([]string{"batch"}, args[2:]...))
}

func refused(ts *testscript.TestScript, code, pattern string, command []string) {
	before := listing(ts)
	exitcode(ts, false, append([]string{code}, command...))
	said := ts.ReadFile("stderr")
	switch {
	case ts.ReadFile("stdout") != "":
		ts.Fatalf("something is on standard output")
	case !message.MatchString(said):
		ts.Fatalf("this is not a line of message and one of advice")
	case insides.MatchString(said):
		ts.Fatalf("the message speaks of %q", insides.FindString(said))
	case !regexp.MustCompile(pattern).MatchString(said):
		ts.Fatalf("the message does not match %q", pattern)
	}
	if after := listing(ts); after != before {
		ts.Fatalf("something was written:\n%s", after)
	}
}

// listing lists all files of the script's folder.
func listing(ts *testscript.TestScript) string {
	var b strings.Builder
	err := filepath.WalkDir(ts.Getenv("WORK"), func(path string, d os.DirEntry, err error) error {
		if err != nil {
			return err
		}
		fmt.Fprintln(&b, path)
		return nil
	})
	ts.Check(err)
	return b.String()
}

// same demands that two folders hold the same files with the same bytes: same DIR DIR
func same(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 2 {
		ts.Fatalf("usage: same DIR DIR")
	}
	a, b := bytesIn(ts, args[0]), bytesIn(ts, args[1])
	if len(a) == 0 || len(a) != len(b) {
		ts.Fatalf("%d files and %d", len(a), len(b))
	}
	for name, text := range a {
		if other, ok := b[name]; !ok || other != text {
			ts.Fatalf("%s is not the same in both", name)
		}
	}
}

func bytesIn(ts *testscript.TestScript, dir string) map[string]string {
	files := map[string]string{}
	root := ts.MkAbs(dir)
	err := filepath.WalkDir(root, func(path string, d os.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		raw, err := os.ReadFile(path)
		files[strings.TrimPrefix(path, root)] = string(raw)
		return err
	})
	ts.Check(err)
	return files
}

// absent demands that an output is not there, nor anything on the way to it: absent PATH
func absent(ts *testscript.TestScript, neg bool, args []string) {
	if neg || len(args) != 1 {
		ts.Fatalf("usage: absent PATH")
	}
	for _, suffix := range []string{"", ".partial", ".partial.lock", ".replaced"} {
		if _, err := os.Lstat(ts.MkAbs(args[0] + suffix)); err == nil {
			ts.Fatalf("%s is there", args[0]+suffix)
		}
	}
}

// figures prints values of a summary.json, numbers in three significant digits: figures FILE PATH... A part of a path is
// a key, or the name of an entry of a list.
func figures() {
	raw, err := os.ReadFile(os.Args[1])
	if err == nil {
		var document any
		if err = json.Unmarshal(raw, &document); err == nil {
			for _, path := range os.Args[2:] {
				fmt.Println(path, rounded(follow(document, strings.Split(path, "."))))
			}
			return
		}
	}
	fmt.Fprintln(os.Stderr, err)
	os.Exit(1)
}

func follow(at any, path []string) any {
	if len(path) == 0 {
		return at
	}
	switch v := at.(type) {
	case map[string]any:
		return follow(v[path[0]], path[1:])
	case []any:
		for _, entry := range v {
			if m, ok := entry.(map[string]any); ok && m["name"] == path[0] {
				return follow(entry, path[1:])
			}
		}
	}
	return "is not there"
}

func rounded(v any) string {
	switch v := v.(type) {
	case float64:
		if v == math.Trunc(v) && math.Abs(v) < 1e6 {
			return strconv.FormatFloat(v, 'f', 0, 64)
		}
		return strconv.FormatFloat(v, 'g', 3, 64)
	case string:
		return v
	}
	text, _ := json.Marshal(v)
	return string(text)
}
