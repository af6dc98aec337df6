package plan

import (
	"reflect"
	"slices"
	"strings"
	"testing"
	"unicode"
)

// sample is a value that can be said for each word, chosen so that it is no default.
var sample = map[string]string{
	"observations": "plots.csv", "response": "stems", "x": "east", "y": "north", "crs": "EPSG:32633",
	"people": "persons", "area": "ground", "area-unit": "km2", "effort": "hours", "expected": "e", "trials": "tested",
	"weight": "w", "distribution": "poisson", "link": "log", "extra-variation": "scale", "shape": "1.5",
	"surface": "none", "max-knots": "35", "smoothness-uncertainty": "on", "surface-per": "year", "surface-smoothness": "own",
	"shrink": "true", "curve": "slope", "curve-per": "depth=soil", "group": "observer", "test-variation": "true",
	"also":       "distribution=gamma; link=log",
	"smoothness": "0.25", "linear": "depth, in cm", "category": "soil", "cell-size": "12.5", "cells-across": "7",
	"at": "places.csv", "within": "edge.geojson", "zones": "zones.geojson", "zone-name": "name",
	"hold": "depth, in cm=-3.5", "threshold": "-3", "per": "100000", "unit-label": "stems per ha",
	"confidence": "0.9", "reference": "overall", "title": "Stems", "seed": "42", "workers": "3",
	"write": "csv,saved", "strict": "true", "separator": "pipe", "decimal-comma": "true", "missing": "-99", "below-limit": "half", "geometry": "geom", "places": "p.geojson", "join": "people.csv", "key": "district=name",
	"layer": "depth=depth.tif", "isolines": "bands", "isolines-at": "1,2.5,10", "absent": "zero", "sum-by": "district", "length": "walked", "length-unit": "km", "width": "40", "detection": "seen", "exposure-cv": "0.15", "exposure-strata": "stratum", "force": "true", "quiet": "true",
}

// snake turns the name of a field into a key: MaxKnots to max_knots, CRS to crs.
func snake(field string) string {
	var b strings.Builder
	letters := []rune(field)
	for i, r := range letters {
		if unicode.IsUpper(r) && i > 0 && unicode.IsLower(letters[i-1]) {
			b.WriteByte('_')
		}
		b.WriteRune(unicode.ToLower(r))
	}
	return b.String()
}

// TestOneWordPerField holds the list and the struct together: each field is set by the word of its name and by no
// other, and there is no word without a field.
func TestOneWordPerField(t *testing.T) {
	fields := map[string]string{}
	for f := range reflect.TypeFor[Settings]().Fields() {
		if f.IsExported() {
			fields[snake(f.Name)] = f.Name
		}
	}
	if len(fields) != len(Words()) {
		t.Errorf("%d fields and %d words", len(fields), len(Words()))
	}
	for _, w := range Words() {
		if w.Key() != strings.ReplaceAll(w.Name, "-", "_") {
			t.Errorf("key of %s is %s", w.Name, w.Key())
		}
		name, ok := fields[w.Key()]
		if !ok {
			t.Errorf("%s has no field", w.Name)
			continue
		}
		var s Settings
		if err := w.Set(&s, sample[w.Name]); err != nil {
			t.Errorf("%s: %v", w.Name, err)
		}
		v := reflect.ValueOf(s)
		for f := range v.Type().Fields() {
			if set := !v.FieldByIndex(f.Index).IsZero(); set != (f.Name == name) {
				t.Errorf("%s: field %s set: %v", w.Name, f.Name, set)
			}
		}
	}
}

func TestWordsAreComplete(t *testing.T) {
	seen := map[string]bool{}
	for _, w := range Words() {
		if seen[w.Name] || w.Group == "" || w.Help == "" || strings.HasSuffix(w.Help, ".") {
			t.Errorf("%s: said twice, without a group, or with a help that is empty or ends in a stop", w.Name)
		}
		seen[w.Name] = true
		if _, ok := sample[w.Name]; !ok {
			t.Errorf("%s has no sample", w.Name)
		}
		if w.Flag() != (w.Name == "strict" || w.Name == "decimal-comma" || w.Name == "shrink" || w.Name == "test-variation" || w.Name == "force" || w.Name == "quiet") {
			t.Errorf("%s: stands alone: %v", w.Name, w.Flag())
		}
	}
	if Words()[0].Name = "changed"; words[0].Name != "observations" {
		t.Error("Words hands out the list itself")
	}
}

// TestGroupsStandTogether: the help shows each heading once.
func TestGroupsStandTogether(t *testing.T) {
	var order []string
	for _, w := range Words() {
		if len(order) == 0 || order[len(order)-1] != w.Group {
			order = append(order, w.Group)
		}
	}
	sorted := slices.Clone(order)
	slices.Sort(sorted)
	if len(slices.Compact(sorted)) != len(order) {
		t.Errorf("a group is split: %q", order)
	}
}

// TestChoicesAreNamed: every choice that a word accepts from a fixed set stands in its help. The sets are spelled out
// here again from the design rather than read from the code.
func TestChoicesAreNamed(t *testing.T) {
	for name, choices := range map[string][]string{
		"area-unit":              {"m2", "ha", "km2"},
		"distribution":           {"gaussian", "gamma", "tweedie", "poisson", "negative-binomial", "binomial", "beta-binomial"},
		"isolines":               {"lines", "bands"},
		"length-unit":            {"m", "km"},
		"absent":                 {"zero", "missing"},
		"link":                   {"identity", "log", "logit", "complementary-log-log"},
		"extra-variation":        {"auto", "scale", "none"},
		"smoothness-uncertainty": {"auto", "on", "off"},
		"surface-smoothness":     {"shared", "own"},
		"max-knots":              {"auto"},
		"surface":                {"thin-plate", "none"},
		"smoothness":             {"reml", "gcv"},
		"write":                  {"csv", "geojson", "tif", "pictures", "saved"},
		"hold":                   {"d=mean", "d=commonest"},
		"reference":              {"overall"},
	} {
		w, ok := Lookup(name)
		if !ok {
			t.Fatalf("no word %s", name)
		}
		for _, choice := range choices {
			if err := w.Set(&Settings{}, choice); err != nil {
				t.Errorf("%s: %v", name, err)
			}
			shown := choice[strings.Index(choice, "=")+1:]
			if !strings.Contains(w.Help+" "+w.Default(), shown) {
				t.Errorf("%s: the help does not name %s", name, shown)
			}
		}
		// A refusal lists the choices too, so the two lists cannot drift apart unseen.
		err := w.Set(&Settings{}, "no such thing")
		if err == nil {
			t.Errorf("%s accepts anything", name)
			continue
		}
		if _, listed, ok := strings.Cut(err.Error(), "is not one of "); ok {
			for choice := range strings.SplitSeq(listed, ", ") {
				if !slices.Contains(choices, choice) || !strings.Contains(w.Help, choice) {
					t.Errorf("%s: choice %q is accepted and not in the help or in this test", name, choice)
				}
			}
		}
	}
}

// TestRoundTrip: what is said comes out of Effective in a form that can be said again, to the same settings.
func TestRoundTrip(t *testing.T) {
	for _, w := range Words() {
		var first, second Settings
		if err := w.Set(&first, sample[w.Name]); err != nil {
			t.Fatal(err)
		}
		list := first.Effective()
		if w.RunOnly {
			if len(list) != 0 {
				t.Errorf("%s is run only and recorded: %v", w.Name, list)
			}
			continue
		}
		if len(list) != 1 || list[0].Key != w.Key() || list[0].Chosen || list[0].Why != "" {
			t.Errorf("%s: recorded as %+v", w.Name, list)
			continue
		}
		if err := w.Set(&second, spoken(list[0].Value)); err != nil {
			t.Errorf("%s: %v", w.Name, err)
		}
		if !reflect.DeepEqual(first, second) {
			t.Errorf("%s: %v came back as %v", w.Name, first.Effective(), second.Effective())
		}
	}
}

func TestRepeatAddsAndTheRestReplace(t *testing.T) {
	for _, w := range Words() {
		var s Settings
		for range 2 {
			if err := w.Set(&s, sample[w.Name]); err != nil {
				t.Fatal(err)
			}
		}
		n := 1
		if list, ok := w.value(&s).([]string); ok && w.Name != "write" {
			n = len(list)
		}
		if (n == 2) != w.Repeat {
			t.Errorf("%s said twice is there %d times", w.Name, n)
		}
	}
}

// TestSetSharesNothing: adding to the list of a copy leaves the original alone.
func TestSetSharesNothing(t *testing.T) {
	w, _ := Lookup("linear")
	var s Settings
	for _, c := range []string{"a", "b", "c"} {
		if err := w.Set(&s, c); err != nil {
			t.Fatal(err)
		}
	}
	one, two := s, s
	_ = w.Set(&one, "one")
	_ = w.Set(&two, "two")
	if one.Linear[3] != "one" || two.Linear[3] != "two" || len(s.Linear) != 3 {
		t.Errorf("got %v, %v and %v", s.Linear, one.Linear, two.Linear)
	}
}

func TestValuesRefused(t *testing.T) {
	tests := []struct{ word, value, message, hint string }{
		{"response", " ", `response: " " nothing is given`, ""},
		{"threshold", "abc", `threshold: "abc" is not a number`, ""},
		{"threshold", "3,5", `threshold: "3,5" is not a number`, "write a decimal point, not a comma"},
		{"threshold", "NaN", `threshold: "NaN" is not a finite number`, ""},
		{"threshold", "1e999", `threshold: "1e999" is not a number`, ""},
		{"per", "0", `per: "0" is not above 0`, ""},
		{"cell-size", "-5", `cell-size: "-5" is not above 0`, ""},
		{"confidence", "95", `confidence: "95" is not between 0 and 1`, "for 95 per cent write 0.95"},
		{"confidence", "1", `confidence: "1" is not between 0 and 1`, ""},
		{"confidence", "0", `confidence: "0" is not between 0 and 1`, ""},
		{"max-knots", "2", `max-knots: "2" is less than 4`, ""},
		{"max-knots", "20.5", `max-knots: "20.5" is neither auto nor a whole number`, "leave out --max-knots to let the fit decide"},
		{"max-knots", "automatic", `max-knots: "automatic" is neither auto nor a whole number`, "leave out --max-knots to let the fit decide"},
		{"max-knots", "-4", `max-knots: "-4" is less than 4`, ""},
		{"extra-variation", "quasi", `extra-variation: "quasi" is not one of auto, scale, none`, ""},
		{"extra-variation", "scaled", `extra-variation: "scaled" is not one of auto, scale, none`, "did you mean scale?"},
		{"shape", "0", `shape: "0" is not above 0`, ""},
		{"shape", "auto", `shape: "auto" is not a number`, ""},
		{"smoothness-uncertainty", "yes", `smoothness-uncertainty: "yes" is not one of auto, on, off`, ""},
		{"surface-smoothness", "each", `surface-smoothness: "each" is not one of shared, own`, ""},
		{"surface-per", " ", `surface-per: " " nothing is given`, ""},
		{"curve-per", "depth", `curve-per: "depth" is not of the form CURVE=CATEGORY`, "for example depth=soil, for a curve of depth on each soil"},
		{"curve-per", "=soil", `curve-per: "=soil" is not of the form CURVE=CATEGORY`, "for example depth=soil, for a curve of depth on each soil"},
		{"curve-per", "depth= ", `curve-per: "depth= " is not of the form CURVE=CATEGORY`, "for example depth=soil, for a curve of depth on each soil"},
		{"link", "cloglog", `link: "cloglog" is not one of identity, log, logit, complementary-log-log`, ""},
		{"shrink", "maybe", `shrink: "maybe" is neither true nor false`, ""},
		{"workers", "0", `workers: "0" is less than 1`, ""},
		{"seed", "-1", `seed: "-1" is not a whole number of 0 or more`, ""},
		{"smoothness", "-1", `smoothness: "-1" is neither reml nor gcv nor a number of 0 or more`, "leave out --smoothness to let the data choose"},
		{"reference", "0", `reference: "0" is neither overall nor a number above 0`, ""},
		{"distribution", "guassian", `distribution: "guassian" is not one of gaussian, gamma, tweedie, poisson, negative-binomial, binomial, beta-binomial`, "did you mean gaussian?"},
		{"link", "", `link: is not one of identity, log, logit, complementary-log-log`, ""},
		{"write", "csv,png", `write: "png" is not one of csv, geojson, tif, pictures, saved`, ""},
		{"hold", "depth", `hold: "depth" is not of the form NAME=VALUE`, "for example depth=3.5, depth=mean or soil=commonest"},
		{"hold", "=3", `hold: "=3" is not of the form NAME=VALUE`, "for example depth=3.5, depth=mean or soil=commonest"},
		{"also", "surfase=none", `also: "surfase" is no word in which a model can differ`, "did you mean surface?"},
		{"also", "surface=none; title=x", `also: "title" is no word in which a model can differ`, "it may differ in distribution, link, shape, " +
			"extra-variation, surface, surface-per, surface-smoothness, shrink, max-knots, smoothness, smoothness-uncertainty, linear, curve, curve-per, category, group"},
		{"strict", "perhaps", `strict: "perhaps" is neither true nor false`, ""},
	}
	for _, test := range tests {
		w, _ := Lookup(test.word)
		var s Settings
		err := w.Set(&s, test.value)
		e, ok := err.(*Error)
		if !ok {
			t.Errorf("%s %q: %v", test.word, test.value, err)
			continue
		}
		if e.Error() != test.message || e.Hint() != test.hint {
			t.Errorf("%s %q: got %q, hint %q", test.word, test.value, e.Error(), e.Hint())
		}
		if !reflect.DeepEqual(s, Settings{}) {
			t.Errorf("%s %q: refused and set all the same", test.word, test.value)
		}
	}
}

func TestSmoothnessOfZeroIsSaid(t *testing.T) {
	w, _ := Lookup("smoothness")
	var s Settings
	if err := w.Set(&s, "0"); err != nil || *s.Smoothness != (Smoothness{By: ByNumber}) {
		t.Errorf("got %v, %v", s.Smoothness, err)
	}
	if out := s.Over(Defaults()); *out.Smoothness != *s.Smoothness {
		t.Errorf("the default got over it: %v", *out.Smoothness)
	}
}

func TestNearest(t *testing.T) {
	tests := []struct {
		word, want string
		ok         bool
	}{
		{"treshold", "threshold", true},
		{"thresohld", "threshold", true}, // two neighbours swapped
		{"THRESHOLD", "threshold", true},
		{"celsize", "cell-size", true},
		{"banana", "", false},
		{"", "", false},
	}
	var names []string
	for _, w := range Words() {
		names = append(names, w.Name)
	}
	for _, test := range tests {
		got, ok := Nearest(test.word, names)
		if ok != test.ok || (ok && got != test.want) {
			t.Errorf("%q: got %q, %v", test.word, got, ok)
		}
	}
	if _, ok := Nearest("x", nil); ok {
		t.Error("something is near among nothing")
	}
}

// TestEdits uses pairs that can be counted by hand.
func TestEdits(t *testing.T) {
	for _, test := range []struct {
		a, b string
		want int
	}{
		{"", "", 0}, {"", "abc", 3}, {"abc", "", 3}, {"kitten", "sitting", 3}, {"ab", "ba", 1}, {"größe", "grösse", 2},
	} {
		if got := edits(test.a, test.b); got != test.want {
			t.Errorf("%q to %q: %d, want %d", test.a, test.b, got, test.want)
		}
	}
}
