package pipeline

import (
	"fmt"
	"math/rand/v2"
	"path/filepath"
	"strings"
	"testing"
)

// checkOn maps a table and returns the level and the sentence of a check.
func checkOn(t *testing.T, name, table string, words ...string) (level, sentence string) {
	t.Helper()
	dir := mapped(t, write(t, "obs.csv", table), append(words, "write=csv", "cells-across=10", "max-knots=12")...)
	for _, c := range readSummary(t, dir)["checks"].([]any) {
		if c := c.(map[string]any); c["name"] == name {
			return c["level"].(string), c["sentence"].(string)
		}
	}
	t.Fatalf("there is no check %q", name)
	return "", ""
}

// TestInputChecks: each remarks on what is likely a mistake, by row, and is clear without it.
func TestInputChecks(t *testing.T) {
	random := rand.New(rand.NewPCG(8, 8))
	rows := func(scale, x0 float64, digits int) string {
		var b strings.Builder
		for range 40 {
			fmt.Fprintf(&b, "%.*f,%.*f,%.2f\n", digits, x0+scale*random.Float64(), digits, x0+scale*random.Float64(), 10+random.NormFloat64())
		}
		return b.String()
	}
	plane := rows(1000, 5000, 1)
	repeated := strings.Join(strings.SplitAfter(plane, "\n")[:4], "")
	for _, c := range []struct{ name, check, rows, level, want string }{
		{"a plane", "coordinates", plane, "clear", ""},
		{"degrees", "coordinates", rows(3, 12, 5), "look", "the coordinates were taken for metres, and they look like degrees"},
		{"a small field in metres", "coordinates", rows(80, 0, 1), "clear", ""},
		{"around the origin", "coordinates", rows(1000, -500, 1) + "0,0,9\n", "clear", ""},
		{"nothing repeated", "repeated rows", plane, "clear", ""},
		{"four repeated", "repeated rows", plane + repeated, "look", "4 rows repeat another in place and values, such as row 41 that of row 1"},
		{"one repeated", "repeated rows", plane + strings.SplitAfter(plane, "\n")[0], "clear", ""},
	} {
		level, sentence := checkOn(t, c.check, "x,y,z\n"+c.rows, "response=z")
		if level != c.level || !strings.HasPrefix(sentence, c.want) {
			t.Errorf("%s: %s, %q", c.name, level, sentence)
		}
	}
	level, sentence := checkOn(t, "coordinates", "x,y,z\n"+plane+"0,0,9\n0,0,11\n", "response=z", "within="+write(t, "w.geojson",
		rectangles([]string{"ground"}, [4]float64{5000, 5000, 6000, 6000})))
	if want := "2 rows, the first of them row 41, lie at exactly 0, 0 and far from all others"; level != "look" || !strings.HasPrefix(sentence, want) {
		t.Errorf("a missing place: %s, %q", level, sentence)
	}
}

// TestLengthsOfStrips are held against the lines that they were drawn as.
func TestLengthsOfStrips(t *testing.T) {
	random := rand.New(rand.NewPCG(9, 9))
	var b strings.Builder
	b.WriteString("geom,seen,walked\n")
	for range 30 {
		x, y := 10000*random.Float64(), 10000*random.Float64()
		fmt.Fprintf(&b, "\"LINESTRING (%.0f %.0f, %.0f %.0f)\",%d,800\n", x, y, x+480, y+640, poisson(random, 4))
	}
	for unit, want := range map[string]string{
		"m": "strips are about as long as they were drawn", "km": "by column walked strips are 1000 times as long as they were drawn (median): check its unit, km",
	} {
		level, sentence := checkOn(t, "lengths", b.String(), "response=seen", "geometry=geom", "length=walked", "length-unit="+unit, "width=50")
		if (level == "look") != (unit == "km") || sentence != want {
			t.Errorf("%s: %s, %q", unit, level, sentence)
		}
	}
}

// TestNoCellsForARowAtZero: a missing place that stretches the study area is named where no lattice can be had.
func TestNoCellsForARowAtZero(t *testing.T) {
	table := "x,y,z\n0,0,3\n"
	for i := range 20 {
		table += fmt.Sprintf("%d,%d,%d\n", 500000+10*(i%5), 5000000+10*(i/5), i%7)
	}
	_, err := Run(t.Context(), settings(t, write(t, "obs.csv", table), "response=z", "cells-across=20"), filepath.Join(t.TempDir(), "out"), silent{})
	if err == nil || !strings.Contains(err.Error(), "row 1 lies at exactly 0, 0, far from all others") {
		t.Errorf("the row is not named: %v", err)
	}
}
