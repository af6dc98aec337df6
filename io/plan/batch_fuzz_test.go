package plan

import (
	"fmt"
	"maps"
	"reflect"
	"slices"
	"strconv"
	"strings"
	"testing"
	"unicode/utf8"

	"github.com/pelletier/go-toml/v2"
)

// FuzzReadBatch holds every plan that is read to go-toml's own decoding of it, and every refusal to being one readable
// line with a place that is there.
func FuzzReadBatch(f *testing.F) {
	f.Add("[defaults]\nresponse = \"cases\"\npeople = 'n'\nsmoothness = \"pooled\"\nwrite = [\"csv\", \"pictures\"]\n[regions]\nfiles = ['a', \"b\"]\nmargin = \"10 km\"\n[region.North]\ntitle = \"x\"")
	f.Add("[regions]\nfile = \"a\"\nsplit_by = \"b\"\nmargin = 5e2\n[pictures]\nscale = \"own\"\n")
	f.Add("[pictures]\nbreaks = [0, 5.5, 1_0]\n[region.\"Upper Vale\"]\nobservations = 'a'\nmax_knots = 0x10\nreference = 2.5\nstrict = true")
	f.Add("[region.A]\nmax-knots = 3")
	f.Add("a = {b = [1, {c = 2025-01-01}]}")
	f.Add("[[region.A.b]]\n\"\\u00e9\" = '''x\n'''")
	f.Add("\xef\xbb\xbf[region.A]\r\nresponse = ")
	f.Fuzz(func(t *testing.T, text string) {
		b, err := ReadBatch([]byte(text), "plan.toml")
		if err != nil {
			checkPlanError(t, text, err)
			return
		}
		checkBatch(t, text, b)
	})
}

func checkPlanError(t *testing.T, text string, err error) {
	e, ok := err.(*PlanError)
	if !ok {
		t.Fatalf("%T: %v", err, err)
	}
	for _, said := range []string{e.Error(), e.Hint()} {
		if strings.ContainsAny(said, "\n\r\x00") || utf8.ValidString(text) && !utf8.ValidString(said) {
			t.Errorf("refused with %q", said)
		}
	}
	lines := strings.Split(strings.TrimPrefix(text, "\xef\xbb\xbf"), "\n")
	if e.Line < 1 || e.Line > len(lines) || e.Column < 1 || e.Column > utf8.RuneCountInString(lines[e.Line-1])+1 {
		t.Errorf("%v: %d lines", e, len(lines))
	}
}

func checkBatch(t *testing.T, text string, b *Batch) {
	var whole map[string]any
	if err := toml.Unmarshal([]byte(strings.TrimPrefix(text, "\xef\xbb\xbf")), &whole); err != nil {
		t.Fatalf("no TOML: %v", err)
	}
	defaults, _ := whole["defaults"].(map[string]any)
	if b.Pooled {
		delete(defaults, "smoothness")
	}
	if got := b.Defaults; !reflect.DeepEqual(got, saidIn(t, defaults)) {
		t.Errorf("defaults: %v", got.Effective())
	}
	regions, _ := whole["region"].(map[string]any)
	if len(regions) != len(b.Named) {
		t.Errorf("%d regions, want %d", len(b.Named), len(regions))
	}
	for _, n := range b.Named {
		if !reflect.DeepEqual(n.Settings, saidIn(t, regions[n.Name].(map[string]any))) {
			t.Errorf("%q: %v", n.Name, n.Settings.Effective())
		}
		if _, err := b.Region(n.Name, "table.csv", "plans"); err != nil {
			checkPlanError(t, text, err)
		}
	}
	if k := len(b.Breaks); k > 0 && (k < 2 || k > 12 || !slices.IsSorted(b.Breaks) || b.Own) || b.Margin < 0 || (b.File == "") != (b.SplitBy == "") {
		t.Errorf("got %+v", b)
	}
}

// saidIn says what a decoded table has, word by word.
func saidIn(t *testing.T, table map[string]any) Settings {
	var s Settings
	for _, key := range slices.Sorted(maps.Keys(table)) {
		w, ok := Lookup(strings.ReplaceAll(key, "_", "-"))
		if !ok {
			t.Fatalf("%q is taken for a word", key)
		}
		for _, value := range flagValues(w, table[key]) {
			if err := w.Set(&s, value); err != nil {
				t.Fatal(err)
			}
		}
	}
	return s
}

// flagValues is a decoded value as it would be said with flags, one after another.
func flagValues(w Word, v any) []string {
	switch v := v.(type) {
	case []any:
		var list []string
		for _, one := range v {
			list = append(list, one.(string))
		}
		if !w.Repeat {
			return []string{strings.Join(list, ",")}
		}
		return list
	case float64:
		return []string{strconv.FormatFloat(v, 'g', -1, 64)}
	}
	return []string{fmt.Sprint(v)}
}
