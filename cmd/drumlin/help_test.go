package main

import (
	"bytes"
	"os"
	"strings"
	"testing"
	"unicode/utf8"

	"drumlin/io/plan"
)

func TestHelpFitsTheScreen(t *testing.T) {
	for _, args := range [][]string{{}, {"--help"}, {"-h"}, {"help"}, {"map", "--help"}, {"help", "map"}, {"reuse", "-h"}, {"demo", "x", "--help"}} {
		p, _, stdout, stderr := faked(nil)
		if code := p.run(t.Context(), line(args...)); code != exitDone || stderr.Len() > 0 {
			t.Fatalf("%q: exit %d, %s", args, code, stderr)
		}
		if stdout.Len() == 0 || !strings.HasSuffix(stdout.String(), "\n") {
			t.Errorf("%q: %q", args, stdout)
		}
		for text := range strings.Lines(stdout.String()) {
			text = strings.TrimSuffix(text, "\n")
			if utf8.RuneCountInString(text) > helpWidth || strings.TrimRight(text, " ") != text || strings.Contains(text, "\t") {
				t.Errorf("%q: line %q", args, text)
			}
		}
	}
}

// TestMapHelpIsComplete: every flag once at the beginning of a line, every group, every default, and an example that
// is a command the program takes.
func TestMapHelpIsComplete(t *testing.T) {
	p, _, stdout, _ := faked(nil)
	p.run(t.Context(), line("map", "--help"))
	text := stdout.String()
	for _, w := range plan.Words() {
		if w.Name == "observations" {
			continue
		}
		term := strings.TrimSpace("\n  --" + w.Name + " " + w.Arg)
		if strings.Count(text, "\n  "+term+" ")+strings.Count(text, "\n  "+term+"\n") != 1 {
			t.Errorf("--%s is not there once", w.Name)
		}
		if d := w.Default(); d != "" && !strings.Contains(strings.Join(strings.Fields(text), " "), "(default "+d+")") {
			t.Errorf("--%s: the default %s is missing", w.Name, d)
		}
		if strings.Count(text, "\n"+w.Group+"\n") != 1 {
			t.Errorf("heading %q is not there once", w.Group)
		}
	}
}

// TestExamplesRun types the examples of the help.
func TestExamplesRun(t *testing.T) {
	p, _, _, _ := faked(nil)
	typed := 0
	for _, c := range p.commands() {
		for text := range strings.Lines(strings.ReplaceAll(c.example, "\\\n", " ")) {
			text, _, _ = strings.Cut(text, " > ") // what a shell does with the output
			words := strings.Fields(text)
			if len(words) == 0 || words[0] != "drumlin" {
				continue
			}
			typed++
			t.Chdir(t.TempDir())
			smallPlan(t)
			p, _, _, stderr := faked(nil)
			if code := p.run(t.Context(), words); code != exitDone {
				t.Errorf("%s: exit %d, %s", text, code, stderr)
			}
		}
	}
	if typed < 4 {
		t.Errorf("%d examples", typed)
	}
}

// smallPlan writes the plan that the examples speak of to the folder at hand.
func smallPlan(t *testing.T) {
	t.Helper()
	for name, text := range map[string]string{
		"plan.toml": "[defaults]\nresponse = \"stems\"\n[regions]\nfiles = \"vale.csv\"\n",
		"vale.csv":  "x,y,stems\n1,2,3\n",
		"plots.csv": "x,y,stems\n1,2,3\n4,5,6\n",
	} {
		if err := os.WriteFile(name, []byte(text), 0o644); err != nil {
			t.Fatal(err)
		}
	}
}

// TestExitCodesAreListed holds the help together with what the design promises about exit codes.
func TestExitCodesAreListed(t *testing.T) {
	p, _, stdout, _ := faked(nil)
	p.run(t.Context(), line("--help"))
	_, codes, _ := strings.Cut(stdout.String(), "Exit codes\n")
	for _, code := range []string{"0", "2", "3", "4", "130"} {
		if !strings.Contains(codes, "\n  "+code+" ") && !strings.HasPrefix(codes, "  "+code+" ") {
			t.Errorf("%s is missing from %q", code, codes)
		}
	}
}

func TestWrap(t *testing.T) {
	tests := []struct {
		name, text    string
		indent, width int
		want          string
	}{
		{"nothing", "", 2, 10, "\n"},
		{"one line", "a few words", 2, 20, "  a few words\n"},
		{"just fits", "abcd efg", 2, 10, "  abcd efg\n"},
		{"one letter too many", "abcd efgh", 2, 10, "  abcd\n  efgh\n"},
		{"a word too long", "a abcdefghijklmno b", 2, 10, "  a\n  abcdefghijklmno\n  b\n"},
		{"letters, not bytes", "ßßßß ßßß", 2, 10, "  ßßßß ßßß\n"},
		{"at the margin", "aa bb", 0, 3, "aa\nbb\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if got := wrap(test.text, test.indent, test.width); got != test.want {
				t.Errorf("got %q", got)
			}
		})
	}
}

func TestEntry(t *testing.T) {
	var b bytes.Buffer
	entry(&b, "--per N", "rates")
	entry(&b, "--a-very-long-flag COLUMN", "what it means")
	want := "  --per N                 rates\n  --a-very-long-flag COLUMN\n                          what it means\n"
	if b.String() != want {
		t.Errorf("got %q", b.String())
	}
}
