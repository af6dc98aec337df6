package summary_test

import (
	"bytes"
	"encoding/json"
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"drumlin/io/summary"
)

func asJSON(t *testing.T, d summary.Document) string {
	t.Helper()
	var b bytes.Buffer
	if err := d.WriteJSON(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

func TestJSON(t *testing.T) {
	golden(t, "measurements.json", asJSON(t, measurements()))
	golden(t, "counts.json", asJSON(t, counts()))
	golden(t, "chosen.json", asJSON(t, chosen()))
}

// keys returns the keys of an object in the order in which they stand.
func keys(t *testing.T, object json.RawMessage) (list []string) {
	t.Helper()
	d := json.NewDecoder(bytes.NewReader(object))
	if open, err := d.Token(); err != nil || open != json.Delim('{') {
		t.Fatalf("no object: %s", object)
	}
	for d.More() {
		key, err := d.Token()
		if err != nil {
			t.Fatal(err)
		}
		var value json.RawMessage
		if err := d.Decode(&value); err != nil {
			t.Fatal(err)
		}
		list = append(list, key.(string))
	}
	return list
}

// The names and their order are those that the program promises; others may stand between them, none may be missing.
func TestKeysInOrder(t *testing.T) {
	raw := json.RawMessage(asJSON(t, counts()))
	var parts map[string]json.RawMessage
	if err := json.Unmarshal(raw, &parts); err != nil {
		t.Fatal(err)
	}
	for part, want := range map[string]string{
		"":      "version input settings fit coefficients effects checks cautions rehearsal validation outputs",
		"input": "name sha256 rows used set_aside",
		"fit": "converged iterations projected_gradient criterion criterion_value lambda degrees_of_freedom knots dispersion shape " +
			"extra_variation knot_path smoothness_uncertainty deviance deviance_share log_likelihood aic aic_corrected",
	} {
		object := raw
		if part != "" {
			object = parts[part]
		}
		got := keys(t, object)
		var promised []string
		for _, k := range got {
			if slices.Contains(strings.Fields(want), k) {
				promised = append(promised, k)
			}
		}
		if strings.Join(promised, " ") != want {
			t.Errorf("%q has keys %v, and among them should be, in this order, %v", part, got, want)
		}
	}
	var coefficients []json.RawMessage
	if err := json.Unmarshal(parts["coefficients"], &coefficients); err != nil {
		t.Fatal(err)
	}
	if got := strings.Join(keys(t, coefficients[0]), " "); got != "name estimate standard_error lower upper" {
		t.Errorf("a coefficient has %s", got)
	}
	for list, want := range map[string]string{
		"effects":       "name role per held held_value range degrees_of_freedom standard_deviation overlap",
		"fit.knot_path": "knots degrees_of_freedom rms_change largest_change",
	} {
		if got := strings.Join(keys(t, firstOf(t, asJSON(t, chosen()), list)), " "); got != want {
			t.Errorf("an entry of %s has %s", list, got)
		}
	}
	// Settings stand in their own order, not in that of the alphabet.
	if got := strings.Join(keys(t, parts["settings"]), " "); got != "response area area_unit linear" {
		t.Errorf("settings are %s", got)
	}
}

// firstOf returns the first entry of a list, found by keys that are joined with stops.
func firstOf(t *testing.T, text, path string) json.RawMessage {
	t.Helper()
	at := json.RawMessage(text)
	for key := range strings.SplitSeq(path, ".") {
		var parts map[string]json.RawMessage
		if err := json.Unmarshal(at, &parts); err != nil {
			t.Fatal(err)
		}
		at = parts[key]
	}
	var list []json.RawMessage
	if err := json.Unmarshal(at, &list); err != nil || len(list) == 0 {
		t.Fatalf("%s: no list with entries: %v", path, err)
	}
	return list[0]
}

func TestNumbers(t *testing.T) {
	for _, test := range []struct {
		v    float64
		want string
	}{
		{math.NaN(), "null"}, {math.Inf(1), "null"}, {math.Inf(-1), "null"}, {0, "0"}, {0.1, "0.1"},
		{1.0 / 3, "0.3333333333333333"}, {1e-9, "1e-9"}, {123456789.125, "123456789.125"}, {math.MaxFloat64, "1.7976931348623157e+308"},
	} {
		got, err := json.Marshal(summary.Number(test.v))
		if err != nil || string(got) != test.want {
			t.Errorf("%v is %s (%v), want %s", test.v, got, err, test.want)
		}
	}
}

func TestNumbersReadBack(t *testing.T) {
	for _, v := range []float64{0, 0.1, -1.0 / 3, 1e-9, 123456789.125, math.MaxFloat64, math.SmallestNonzeroFloat64, math.NaN(), math.Inf(1), math.Inf(-1)} {
		type pair struct{ A, B summary.Number }
		text, err := json.Marshal(pair{summary.Number(v), 7})
		if err != nil {
			t.Fatal(err)
		}
		got := pair{A: 5}
		if err := json.Unmarshal(text, &got); err != nil {
			t.Fatal(err)
		}
		want := v
		if math.IsInf(v, 0) {
			want = math.NaN()
		}
		if a := float64(got.A); a != want && !(math.IsNaN(a) && math.IsNaN(want)) || got.B != 7 {
			t.Errorf("%v comes back as %v beside %v", v, got.A, got.B)
		}
	}
	for _, text := range []string{`"5"`, `true`, `[1]`, `{}`, `1e999`, ``} {
		n := summary.Number(3)
		if err := json.Unmarshal([]byte(text), &n); err == nil {
			t.Errorf("%s is taken for %v", text, n)
		}
	}
}

func TestNothingIsNullButWhatIsNotThere(t *testing.T) {
	var got map[string]any
	if err := json.Unmarshal([]byte(asJSON(t, summary.Document{})), &got); err != nil {
		t.Fatal(err)
	}
	for key, value := range got {
		absent := key == "zones" || key == "rehearsal" || key == "validation"
		if (value == nil) != absent {
			t.Errorf("%q of an empty document is %v", key, value)
		}
	}
	for _, key := range []string{"lambda", "degrees_of_freedom", "knot_path"} {
		if got["fit"].(map[string]any)[key] == nil {
			t.Errorf("%q is null", key)
		}
	}
	if got["input"].(map[string]any)["set_aside"] == nil {
		t.Error("set_aside is null")
	}
}

func TestFolderAndLinesStayOut(t *testing.T) {
	if text := asJSON(t, counts()); strings.Contains(text, "out/nitrate") || strings.Contains(text, "in all") {
		t.Error("summary.json depends on where it is written, or repeats the words")
	}
}

func TestSettingsThatCannotBeWritten(t *testing.T) {
	d := summary.Document{Settings: summary.Settings{{Key: "per", Value: math.NaN()}}}
	var unsupported *json.UnsupportedValueError
	if err := d.WriteJSON(&bytes.Buffer{}); !errors.As(err, &unsupported) {
		t.Errorf("a setting that is not a number: %v", err)
	}
}

func TestWorst(t *testing.T) {
	for want, checks := range map[summary.Level][]summary.Level{
		summary.Clear: {summary.Clear, summary.Clear},
		summary.Look:  {summary.Look, summary.Clear},
		summary.Stop:  {summary.Stop, summary.Look, summary.Clear},
	} {
		var d summary.Document
		for _, l := range checks {
			d.Checks = append(d.Checks, summary.Check{Level: l})
		}
		if got := d.Worst(); got != want {
			t.Errorf("%v: %s", checks, got)
		}
		slices.Reverse(d.Checks)
		if got := d.Worst(); got != want {
			t.Errorf("%v reversed: %s", checks, got)
		}
	}
	if got := (summary.Document{}).Worst(); got != summary.Clear {
		t.Errorf("no checks: %s", got)
	}
}

// TestReadBack: what summary.json says of a run can be read back, numbers to the last digit.
func TestReadBack(t *testing.T) {
	of := counts()
	of.Region = &summary.Region{Name: "North", Fingerprint: "5e", Response: "cases", MarginRows: 3, Per: 1000, Total: summary.Number(math.NaN()), Mean: 0.1}
	for _, d := range []summary.Document{measurements(), of, stopped(), places(), regression(), chosen(), levels(), nothing()} {
		text := asJSON(t, d)
		var back summary.Document
		if err := json.Unmarshal([]byte(text), &back); err != nil {
			t.Fatal(err)
		}
		if again := asJSON(t, back); again != text {
			t.Errorf("read back and written again it is\n%s\nnot\n%s", again, text)
		}
	}
}
