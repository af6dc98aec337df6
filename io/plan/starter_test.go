package plan

import (
	"reflect"
	"strconv"
	"strings"
	"testing"
)

func starter(t *testing.T, s Starter) string {
	t.Helper()
	var b strings.Builder
	if err := WriteStarter(&b, s); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// proposed are settings with values of every form, and a name that has to be escaped.
func proposed(t *testing.T) Settings {
	t.Helper()
	var s Settings
	for _, said := range []struct{ name, value string }{
		{"response", `cases "new" \ old` + "\t\u00e9"}, {"people", "residents"}, {"per", "100000"}, {"max-knots", "80"}, {"strict", "true"},
		{"linear", "a"}, {"linear", "b=c"}, {"seed", "7"}, {"curve-per", "depth=soil"}, {"smoothness", "0.25"},
	} {
		w, _ := Lookup(said.name)
		if err := w.Set(&s, said.value); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

// TestStarterIsRead: a starter says what is proposed and nothing else, whatever it is.
func TestStarterIsRead(t *testing.T) {
	for _, tt := range []struct {
		name    string
		starter Starter
	}{
		{"nothing proposed", Starter{File: "plots.csv"}},
		{"a region by itself", Starter{File: `data\[1]*?.csv`, Settings: proposed(t), Notes: []string{"a\nb \x1a\x1b\x7f", strings.Repeat("long ", 60)}}},
		{"regions by a column", Starter{File: "all.csv", SplitBy: `the "district"`, Settings: proposed(t)}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			b := read(t, starter(t, tt.starter))
			if !reflect.DeepEqual(b.Defaults, tt.starter.Settings) {
				t.Errorf("defaults are %v, not %v", b.Defaults.Effective(), tt.starter.Settings.Effective())
			}
			want := []string{escapePattern(tt.starter.File)}
			file := ""
			if tt.starter.SplitBy != "" {
				want, file = nil, tt.starter.File
			}
			if !reflect.DeepEqual(b.Patterns, want) || b.File != file || b.SplitBy != tt.starter.SplitBy {
				t.Errorf("regions come from %q, %q, %q", b.Patterns, b.File, b.SplitBy)
			}
			if len(b.Named) > 0 || b.Margin != 0 || b.Breaks != nil || b.Own || b.Pooled {
				t.Error("more is said than was proposed")
			}
		})
	}
}

// TestStarterHasEveryWord: each word stands there once with its help and default, and can be said by taking the # away,
// with the value that is shown and with another.
func TestStarterHasEveryWord(t *testing.T) {
	text := starter(t, Starter{File: "plots.csv"})
	flowing := strings.Join(strings.Fields(strings.ReplaceAll(text, "\n#", "\n")), " ")
	for _, w := range Words() {
		line := ""
		for l := range strings.Lines(text) {
			if strings.HasPrefix(l, "# "+w.Key()+" = ") {
				if line != "" && w.Name != "title" {
					t.Errorf("%s stands there twice", w.Name)
				}
				line = strings.TrimSuffix(l, "\n")
				if w.Name == "title" {
					break // again in the example of a region
				}
			}
		}
		if w.RunOnly {
			if line != "" {
				t.Errorf("%s is how to run and stands there", w.Name)
			}
			continue
		}
		if line == "" {
			t.Errorf("%s is not there", w.Name)
			continue
		}
		if w.Name == "observations" {
			continue // of the example of a region
		}
		help := strings.Join(strings.Fields(InPlan(w.Help)), " ")
		if !strings.Contains(flowing, help[1:]+".") || w.Default() != "" && !strings.Contains(flowing, help[1:]+". Default: "+w.Default()+".") {
			t.Errorf("%s: its help or its default is not there", w.Name)
		}
		if b := read(t, strings.Replace(text, line, line[2:], 1)); !b.Defaults.Said(w.Name) {
			t.Errorf("%s is not said by %s", w.Name, line[2:])
		}
		var want Settings
		if err := w.Set(&want, sample[w.Name]); err != nil {
			t.Fatal(err)
		}
		for _, value := range asTOML(w, sample[w.Name]) {
			if b := read(t, strings.Replace(text, line, w.Key()+" = "+value, 1)); !reflect.DeepEqual(b.Defaults, want) {
				t.Errorf("%s = %s is read as %v", w.Key(), value, b.Defaults.Effective())
			}
		}
	}
}

// TestStarterSections: the keys of the other sections and the example of a region can be said as they are shown.
func TestStarterSections(t *testing.T) {
	text := starter(t, Starter{File: "all.csv", SplitBy: "district"})
	for _, line := range []string{"margin = \"10 km\"", "scale = \"shared\"", "breaks = [0, 5, 10, 20]", "[region.NAME]\n# observations = \"FILE\"\n# title = \"TEXT\""} {
		if strings.Count(text, "# "+line+"\n") != 1 {
			t.Errorf("%s does not stand there once", line)
		}
		text = strings.Replace(text, "# "+line, strings.ReplaceAll(line, "\n# ", "\n"), 1)
	}
	b := read(t, text)
	if b.Margin != 10_000 || len(b.Breaks) != 4 || len(b.Named) != 1 || *b.Named[0].Settings.Title != "TEXT" || *b.Named[0].Settings.Observations != "FILE" {
		t.Errorf("read as %+v", b)
	}
	for i, line := range strings.Split(text, "\n") {
		if len(line) > 112 {
			t.Errorf("line %d has %s bytes", i+1, strconv.Itoa(len(line)))
		}
	}
}
