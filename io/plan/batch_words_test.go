package plan

import (
	"reflect"
	"strconv"
	"strings"
	"testing"
)

// asTOML is a value as it is written in a plan, in every form that the word takes.
func asTOML(w Word, value string) []string {
	var forms []string
	if w.takes&asNumber != 0 {
		if _, err := parseNumber(value); err == nil {
			forms = append(forms, value)
		}
	}
	if w.takes&asTruth != 0 {
		forms = append(forms, value)
	}
	if w.takes&asText != 0 {
		forms = append(forms, strconv.Quote(value), "'"+value+"'")
	}
	if w.takes&asList != 0 {
		list := []string{value}
		if !w.Repeat {
			list = strings.Split(value, ",")
		}
		for i := range list {
			list[i] = strconv.Quote(list[i])
		}
		forms = append(forms, "["+strings.Join(list, ", ")+"]")
	}
	return forms
}

// TestKeysAreFlags: every word comes to the same settings as a flag and as a key, under [defaults] and for a region.
func TestKeysAreFlags(t *testing.T) {
	for _, w := range Words() {
		if w.RunOnly {
			continue
		}
		var want Settings
		if err := w.Set(&want, sample[w.Name]); err != nil {
			t.Fatal(err)
		}
		forms := asTOML(w, sample[w.Name])
		if len(forms) == 0 {
			t.Errorf("%s takes no form", w.Name)
		}
		for _, value := range forms {
			line := w.Key() + " = " + value + "\n"
			b := read(t, source+"[region.A]\n"+line)
			if !reflect.DeepEqual(b.Named[0].Settings, want) {
				t.Errorf("%s: got %v, want %v", line, b.Named[0].Settings.Effective(), want.Effective())
			}
			if w.Name == "observations" {
				continue
			}
			if b := read(t, source+"[defaults]\n"+line); !reflect.DeepEqual(b.Defaults, want) {
				t.Errorf("%s: got %v, want %v", line, b.Defaults.Effective(), want.Effective())
			}
		}
	}
}

// TestRepeatedKeys: a list in a plan is a flag said several times.
func TestRepeatedKeys(t *testing.T) {
	for _, w := range Words() {
		if !w.Repeat {
			continue
		}
		second := strings.ReplaceAll(sample[w.Name], "depth", "height") + " too"
		var want Settings
		for _, value := range []string{sample[w.Name], second} {
			if err := w.Set(&want, value); err != nil {
				t.Fatal(err)
			}
		}
		b := read(t, source+"[defaults]\n"+w.Key()+" = ["+strconv.Quote(sample[w.Name])+", "+strconv.Quote(second)+"]")
		if !reflect.DeepEqual(b.Defaults, want) {
			t.Errorf("%s: got %v, want %v", w.Name, b.Defaults.Effective(), want.Effective())
		}
	}
}

// TestFormsOfWords: each word says how it is written, and refuses what is written otherwise.
func TestFormsOfWords(t *testing.T) {
	written := map[form]string{asText: "'x'", asNumber: "1", asTruth: "false", asList: "['x']"}
	for _, w := range Words() {
		want := asText
		switch w.Name {
		case "strict", "decimal-comma", "shrink", "test-variation", "force", "quiet":
			want = asTruth
		case "shape", "cell-size", "cells-across", "threshold", "per", "confidence", "seed", "workers":
			want = asNumber
		case "max-knots", "smoothness", "reference", "width", "detection", "exposure-cv", "isolines-at":
			want = asNumber | asText
		case "missing", "join", "layer", "linear", "curve", "curve-per", "category", "group", "also", "hold", "write":
			want = asList | asText
		}
		if w.takes != want {
			t.Errorf("%s takes %v, want %v", w.Name, w.takes, want)
		}
		for f, value := range written {
			_, err := ReadBatch([]byte("[region.A]\n"+w.Key()+" = "+value), "plan.toml")
			refused := err != nil && strings.Contains(err.Error(), ": "+w.Key()+": takes "+w.takes.String()+", not ")
			if !w.RunOnly && refused != (w.takes&f == 0) {
				t.Errorf("%s = %s: %v", w.Key(), value, err)
			}
		}
	}
}

// TestHyphensAreRecognised: a flag in place of a key is told the key.
func TestHyphensAreRecognised(t *testing.T) {
	for _, w := range Words() {
		if !strings.Contains(w.Name, "-") {
			continue
		}
		_, err := ReadBatch([]byte("[defaults]\n"+w.Name+" = 1"), "plan.toml")
		refusal(t, err, "plan.toml: line 2, column 1: "+w.Name+": is no word of [defaults]", "did you mean "+w.Key()+"?")
	}
}

// TestNumbersAreRead: each way in which TOML writes a number.
func TestNumbersAreRead(t *testing.T) {
	for written, want := range map[string]float64{
		"0": 0, "-0": 0, "+7": 7, "1_000": 1000, "0xFF": 255, "0o17": 15, "0b101": 5, "-12": -12, "3.5": 3.5, "+1e3": 1000, "-2E-2": -0.02,
		"1_0.2_5": 10.25, "6.02e+23": 6.02e23, "9223372036854775807": 9223372036854775807,
	} {
		b := read(t, source+"[defaults]\nthreshold = "+written)
		if got := *b.Defaults.Threshold; got != want {
			t.Errorf("%s: got %g, want %g", written, got, want)
		}
	}
	if b := read(t, source+"[defaults]\nseed = 0x7fff_ffff_ffff_ffff"); *b.Defaults.Seed != 1<<63-1 {
		t.Errorf("got %d", *b.Defaults.Seed)
	}
}

func TestMargins(t *testing.T) {
	for written, want := range map[string]float64{
		`"10 km"`: 10000, `"10km"`: 10000, `" 0.5  km "`: 500, `"500 m"`: 500, `"500m"`: 500, `"500"`: 500, "500": 500, "2.5": 2.5, `"1e3 m"`: 1000,
	} {
		if got := read(t, source+"margin = "+written).Margin; got != want {
			t.Errorf("%s: got %g, want %g", written, got, want)
		}
	}
	for _, written := range []string{`"km"`, `"m"`, `""`, `"5 mm"`, `"5 k m"`, `"five km"`, `"5 KM"`, "nan", "-0.0"} {
		if _, err := ReadBatch([]byte(source+"margin = "+written), "plan.toml"); err == nil || !strings.Contains(err.Error(), "line 3, column 10: margin: ") {
			t.Errorf("%s: %v", written, err)
		}
	}
}
