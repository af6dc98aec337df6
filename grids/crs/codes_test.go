package crs

import (
	"math"
	"strings"
	"testing"
)

// Source: testdata/SOURCE.md. Every code offered has three points or more.
func TestCodesAgainstPoints(t *testing.T) {
	seen := map[string]int{}
	worst, worstBack := 0.0, 0.0
	for _, row := range readRows(t, "testdata/points.csv") {
		s := must(t, "EPSG:"+row[0])
		lon, lat := number(t, row[1]), number(t, row[2])
		x, y := s.Forward(lon, lat)
		d := math.Hypot(x-number(t, row[3]), y-number(t, row[4]))
		lon2, lat2 := s.Inverse(x, y)
		back := math.Hypot(math.Remainder(lon2-lon, 360)*math.Cos(lat*math.Pi/180), lat2-lat)
		worst, worstBack = math.Max(worst, d), math.Max(worstBack, back)
		if !(d < 1e-3) {
			t.Errorf("%v: got %.4f %.4f, %.2g m off", row, x, y, d)
		}
		if !(back < 1e-9) {
			t.Errorf("%v: back at %v %v", row, lon2, lat2)
		}
		seen["EPSG:"+row[0]]++
	}
	t.Logf("worst: %.2g m, and back %.2g degrees", worst, worstBack)
	for _, c := range Codes() {
		if code := "EPSG:" + plainNumber(float64(c.EPSG)); seen[code] < 3 {
			t.Errorf("%s has %d points", code, seen[code])
		}
	}
}

func TestCodesAreSortedAndWhole(t *testing.T) {
	last := 0
	for _, c := range Codes() {
		if c.EPSG <= last {
			t.Errorf("EPSG:%d follows EPSG:%d", c.EPSG, last)
		}
		last = c.EPSG
		if c.Name == "" || c.Area == "" || strings.Contains(c.Name+c.Area, "%!") {
			t.Errorf("EPSG:%d: %q, %q", c.EPSG, c.Name, c.Area)
		}
		code := "EPSG:" + plainNumber(float64(c.EPSG))
		if s := must(t, code); s.Code() != code || !s.Geographic() {
			t.Errorf("%s says it is %s", code, s.Code())
		}
	}
	if utm, err := NewUTM(33, true); err != nil || utm != must(t, "EPSG:32733") {
		t.Errorf("NewUTM and the table differ: %v", err)
	}
}

// A code that is not offered: what the hint says.
func TestHints(t *testing.T) {
	for code, want := range map[string]string{
		"EPSG:25893":         "EPSG:25833",
		"EPSG:23032":         "--crs-list",
		"EPSG:2263":          "metres",
		"EPSG:4314":          "EPSG:4514",
		"utm33":              "EPSG:32633",
		"EPSG:4326":          "equal-area",
		"transverse-mercato": "longitude and latitude",
	} {
		_, err := Parse(code)
		coded, ok := err.(*CodeError)
		if !ok || !strings.Contains(coded.Hint(), want) {
			t.Errorf("%s: %v, hint %q lacks %q", code, err, coded.Hint(), want)
		}
	}
}
