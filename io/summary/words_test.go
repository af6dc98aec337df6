package summary_test

import (
	"errors"
	"fmt"
	"math"
	"strings"
	"testing"
	"unicode/utf8"

	"drumlin/io/summary"
)

const (
	columns = 96
	lines   = 20 // two more where a check stops the run and zones have a note
)

func told(t *testing.T, d summary.Document) string {
	t.Helper()
	var b strings.Builder
	if err := d.Words(&b); err != nil {
		t.Fatal(err)
	}
	return b.String()
}

// fits demands the shape of the telling: a word in front or blanks, no line beyond the columns unless it is one word.
func fits(t *testing.T, text string, most int) {
	t.Helper()
	if !strings.HasSuffix(text, "\n") || strings.Contains(text, "\n\n") {
		t.Errorf("lines do not end as they should: %q", text)
	}
	all := strings.Split(strings.TrimSuffix(text, "\n"), "\n")
	if len(all) > most {
		t.Errorf("%d lines:\n%s", len(all), text)
	}
	for _, l := range all {
		if utf8.RuneCountInString(l) > columns && strings.ContainsAny(strings.TrimLeft(l[min(9, len(l)):], " "), " ") {
			t.Errorf("a line of %d columns: %q", utf8.RuneCountInString(l), l)
		}
		if strings.TrimRight(l, " ") != l {
			t.Errorf("blanks at the end of %q", l)
		}
		if front := l[:min(9, len(l))]; front != strings.Repeat(" ", 9) && !(strings.HasSuffix(front, " ") && front == strings.ToLower(front)) {
			t.Errorf("no word in front of %q", l)
		}
	}
}

func TestWords(t *testing.T) {
	for name, d := range map[string]summary.Document{
		"measurements": measurements(), "counts": counts(), "stopped": stopped(), "places": places(), "regression": regression(), "plane": plane(),
		"chosen": chosen(), "levels": levels(), "nothing": nothing(),
	} {
		t.Run(name, func(t *testing.T) {
			text := told(t, d)
			golden(t, name+".txt", text)
			fits(t, text, lines+2)
		})
	}
}

// What must not be missing from the telling, whatever its wording.
func TestWordsSayWhatCounts(t *testing.T) {
	for name, test := range map[string]struct {
		document summary.Document
		want     []string
	}{
		"measurements": {measurements(), []string{"wells.csv", "64 of 64 rows", "63 distinct", "gaussian", "identity", "5.5" /* root of 30.25 */, "11.8",
			"restricted likelihood", "81.2 %", "3.25", "61.1", "22.1", "95 %", "2.44", "out/nitrate", "surface.csv", "summary.json"}},
		"counts": {counts(), []string{"284 of 300", "7 not a number", "area", "plot_ha", "ha", "32.8", "199", "-0.00886 (-0.0138 to -0.00394)", "log scale",
			"90 %", "23.8 %", "250", "stems per ha", "Zone A: 89227 in all (82170 to 96890", "more in zones.csv", "1 more in summary.json"}},
		"stopped":    {stopped(), []string{"stop     the scatter", "2.19", "look     the search", "trials", "examined", "nowhere", "60", "no totals"}},
		"places":     {places(), []string{"3 places", "33.3 %", "of your places", "50", "weights, column w"}},
		"regression": {regression(), []string{"1 distinct place;", "none", "9 degrees of freedom", "and 2 more", "soil = kind 3 (commonest)", "standard deviation unknown"}},
		"plane":      {plane(), []string{"plane", "a given number", "dispersion 30.2"}},
		"chosen": {chosen(), []string{"negative-binomial with log link", "counts divided by effort, column nights", "chosen over poisson", "theta 2.38",
			"slope (soil=clay) a curve of 3.25 degrees of freedom", "slope (soil=peat) a curve of 1 degree of freedom", "observer in 6 levels that scatter by 0.312",
			"soil=peat 0.75 (0.25 to 1.25); the map is adjusted to slope = 12.3 (mean), soil = peat level"}},
		"levels": {levels(), []string{"amounts divided by effort, column hours", "power at its bound, 1.99, where it is as good as gamma", "dispersion 0.0859",
			"thin-plate for each level of year on 63 knots, 11.8 degrees of freedom used in all", "effects the map is adjusted to year = 2021 level"}},
		"nothing": {nothing(), []string{"site in 9 levels that do not differ", "chosen over negative-binomial: the negative-binomial went back to the poisson", "vanished: no variation between places was found"}},
	} {
		text := strings.Join(strings.Fields(told(t, test.document)), " ")
		for _, w := range test.want {
			if !strings.Contains(text, strings.Join(strings.Fields(w), " ")) {
				t.Errorf("%s: nothing of %q in\n%s", name, w, text)
			}
		}
	}
}

// A run with much to tell stays short: zones give way, lists are cut, and each cut says how much is left out.
func TestMuchToTell(t *testing.T) {
	d := counts()
	d.Input.Name = "observations-of-the-whole-northern-district.csv"
	for k := range 40 {
		d.Coefficients = append(d.Coefficients, summary.Coefficient{Name: fmt.Sprintf("land use=kind %d of forest", k)})
	}
	for k := range d.Zones.Lines[:5] {
		d.Zones.Lines[k] = "A zone with a long name such as the parts of a large district may have: " + d.Zones.Lines[k]
	}
	d.Zones.Count = 300
	d.Checks = append(d.Checks, stopped().Checks...)
	text := told(t, d)
	fits(t, text, 28)
	if !strings.Contains(text, "zone     and 298 more in zones.csv") || strings.Contains(text, "and 2 more in zones.csv") {
		t.Errorf("zones that give way are not counted:\n%s", text)
	}
	if !strings.Contains(strings.Join(strings.Fields(text), " "), "and 35 more") {
		t.Errorf("coefficients are not counted:\n%s", text)
	}
}

// Names come from the user's files: they can neither break the layout nor steer the terminal.
func TestNamesAreHarmless(t *testing.T) {
	d := counts()
	d.Input.Name = "plots\x1b[2J\x1b]0;title\x07.csv"
	d.Zones.Lines[0] = "A\nB\tC\r\nD\u202e\x00: 5"
	d.Estimates.Unit = strings.Repeat("x", 200)
	text := told(t, d)
	fits(t, text, lines+3)
	if strings.ContainsAny(text, "\x1b\x07\r\t\x00\u202e\u00a0") {
		t.Errorf("something could steer a terminal: %q", text)
	}
	if !strings.Contains(text, "zone     A B C D") {
		t.Errorf("a name with line breaks: %q", text)
	}
}

func TestFiguresStayWithTheirUnits(t *testing.T) {
	for n := range 120 {
		d := measurements()
		d.Input.Name = strings.Repeat("x", n)
		d.Checks = nil
		d.Input.Coordinates = strings.Repeat("y", n)
		for _, l := range strings.Split(told(t, d), "\n") {
			if l = strings.TrimSpace(l); strings.HasPrefix(l, "%") || strings.HasPrefix(l, "m ") || strings.HasPrefix(l, "m;") {
				t.Fatalf("a unit stands alone: %q", l)
			}
		}
	}
}

func TestWordsOfAnEmptyDocument(t *testing.T) {
	fits(t, told(t, summary.Document{}), lines)
}

type fullDisk struct{}

var errFull = errors.New("no space left")

func (fullDisk) Write([]byte) (int, error) { return 0, errFull }

func TestErrorsOfTheWriter(t *testing.T) {
	if err := measurements().Words(fullDisk{}); !errors.Is(err, errFull) {
		t.Errorf("words: %v", err)
	}
	if err := measurements().WriteJSON(fullDisk{}); !errors.Is(err, errFull) {
		t.Errorf("JSON: %v", err)
	}
}

func TestShort(t *testing.T) {
	for _, test := range []struct {
		v    float64
		want string
	}{
		{0, "0"}, {math.Copysign(0, -1), "0"}, {1, "1"}, {10, "10"}, {100, "100"}, {-1, "-1"},
		{0.9996, "1"}, {0.9994, "0.999"}, {9.996, "10"}, {9.994, "9.99"}, {99.96, "100"}, {99.94, "99.9"}, {999.6, "1000"}, {999.4, "999"},
		{1234.5, "1234"}, {50.717, "50.7"}, {2.5, "2.5"}, {2.50001, "2.5"}, {-0.00886, "-0.00886"}, {-123.456, "-123"},
		{0.001, "0.001"}, {0.0012345, "0.00123"}, {0.00099951, "0.001"}, {0.000123456, "0.000123"}, {1.23456e-7, "1.23e-07"}, {-5e-324, "-4.94e-324"},
		{89227.16, "89227"}, {999999.6, "1000000"}, {1e6, "1000000"}, {-1234567.8, "-1234568"}, {999999999.4, "999999999"}, {1e9, "1e+09"}, {1.7976e308, "1.8e+308"},
		{math.NaN(), "unknown"}, {math.Inf(1), "unknown"}, {math.Inf(-1), "unknown"},
	} {
		if got := summary.Short(summary.Number(test.v)); got != test.want {
			t.Errorf("Short(%v) = %q, want %q", test.v, got, test.want)
		}
	}
}
