package inspect

import (
	"encoding/json"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path/filepath"
	"reflect"
	"slices"
	"strings"
	"testing"

	"drumlin/io/observe"
	"drumlin/io/plan"
)

// square is a polygon in WKT around a scattered place, in a field some hundred metres wide.
func square(i int) string {
	x, y := scattered(i)
	x, y = 1000+900*x, 2000+900*y
	return fmt.Sprintf(`"POLYGON ((%.1f %.1f, %.1f %.1f, %.1f %.1f, %.1f %.1f))"`, x, y, x+20, y, x+20, y+20, x, y)
}

// pointIn is a point in WKT in a square that is shrunk or stretched and moved.
func pointIn(i int, srid string, x0, y0, width float64) string {
	x, y := scattered(i)
	return fmt.Sprintf("%sPOINT (%.4f %.4f)", srid, x0+width*x, y0+width*y)
}

// shaped is a table of 40 rows with geometries in the column g.
func shaped(header string, row func(i int) string) string { return table("g,"+header, 40, row) }

// features is GeoJSON with one feature a line, of geometries and properties by their number.
func features(n int, feature func(i int) (geometry, properties string)) string {
	var b strings.Builder
	for i := range n {
		geometry, properties := feature(i)
		fmt.Fprintf(&b, `{"type":"Feature","geometry":%s,"properties":%s}`+"\n", geometry, properties)
	}
	return b.String()
}

// featurePoint is a point of GeoJSON in a square that is shrunk or stretched and moved.
func featurePoint(i int, x0, y0, width float64) string {
	x, y := scattered(i)
	return fmt.Sprintf(`{"type":"Point","coordinates":[%.4f,%.4f]}`, x0+width*x, y0+width*y)
}

// featureSquare is a square of GeoJSON around it.
func featureSquare(i int) string {
	x, y := scattered(i)
	x, y = 10+x, 50+y
	return fmt.Sprintf(`{"type":"Polygon","coordinates":[[[%.3f,%.3f],[%.3f,%.3f],[%.3f,%.3f],[%.3f,%.3f]]]}`, x, y, x+0.01, y, x+0.01, y+0.01, x, y)
}

func TestGeometrySentences(t *testing.T) {
	rest := func(i int) string { return fmt.Sprintf(",%d.5", i%7) }
	plain := func(i int) string { return pointIn(i, "", 1000, 2000, 900) + rest(i) }
	but := func(at int, value string) string { // a table of points with another value in one row
		return shaped("v", func(i int) string {
			if i == at {
				return value + rest(i)
			}
			return plain(i)
		})
	}
	points := func(x0, y0, width float64) string {
		return features(40, func(i int) (string, string) { return featurePoint(i, x0, y0, width), fmt.Sprintf(`{"v":%d.5}`, i%7) })
	}
	foreign := func(code, text string) string {
		return fmt.Sprintf(`{"crs":{"type":"name","properties":{"name":%q}},`, code) + text[1:]
	}
	withSRID := func(srid string, x0, y0, width float64) string {
		return shaped("v", func(i int) string { return pointIn(i, srid, x0, y0, width) + rest(i) })
	}
	for _, tt := range []struct {
		name, text, said, code string
		level                  Level
		sentence               string
	}{
		{"polygons", shaped("v", func(i int) string { return square(i) + rest(i) }), "", "geometries", Clear, "g has 40 polygons, with 160 positions in all"},
		{"points", shaped("v", plain), "", "geometries", Clear, "g has 40 points"},
		{"a guess", shaped("v", plain), "", "geometry-guessed", Look, "no coordinate columns are recognised; g has geometries, which are likely the places"},
		{"one unreadable", but(4, "POINT (1)"), "", "unreadable-geometries", Look,
			`1 geometry of g cannot be read, in row 5 (line 6): character 9: a number was expected, and ")" stands there; map would set the row aside`},
		{"some unreadable", but(4, "POINT (1)") + "POINT (,1\n", "", "unreadable-geometries", Look,
			`2 geometries of g cannot be read, the first in row 5 (line 6): character 9: a number was expected, and ")" stands there; map would set such rows aside`},
		{"one missing", but(6, "NA"), "", "missing-geometries", Look, "1 row has no geometry, row 7; map would set it aside"},
		{"some missing", but(6, "POINT EMPTY") + ",1\n", "", "missing-geometries", Look, "2 rows have no geometry, the first being row 7; map would set such rows aside"},
		{"none that can be used", "g,v\nPOINT (1,2\nPOINT (2,3\n", "geometry=g", "no-places", Look, "no geometry can be used, so it is not told where any row is"},
		{"mixed kinds", but(3, `"LINESTRING (1 2, 3 4)"`), "", "mixed-geometries", Look, "points and lines are mixed, which may be a mistake; map would take each for what it is"},
		{"heights", but(3, "POINT Z (1100 2100 7)"), "", "heights", Clear, "1 point has a third coordinate, which map has as the column z, such as for --linear z"},
		{"hidden heights", strings.Replace(but(3, "POINT Z (1100 2100 7)"), "v", "z", 1), "geometry=g", "heights", Clear, "1 point has a third coordinate, which the column z hides: it is another"},
		{"two columns", "g,h,v\nPOINT (1 2),POINT (3 4),5\n", "", "no-coordinates", Look, "no coordinate columns are recognised; g and h have geometries: name one of them with --geometry"},
		{"beside coordinates", placed("g", 40, func(i int) string { return pointIn(i, "", 0, 0, 1) }), "", "geometry-column", Clear,
			"g has 40 points, which --geometry g would take for the places instead of x and y"},
		{"properties that are coordinates", features(40, func(i int) (string, string) {
			return featureSquare(i), fmt.Sprintf(`{"lon":%d.5,"lat":%d.25,"v":1.5}`, i, i%9)
		}), "", "coordinates", Clear,
			"lon and lat are coordinates by their names; the geometries are taken in their place"},
		{"a file of places", features(40, func(i int) (string, string) { return featureSquare(i), fmt.Sprintf(`{"district":"D%d"}`, i) }), "", "places-only", Clear,
			"nothing in it can be mapped, so these may be the places of another table: map takes them with --places and --key COLUMN=district, COLUMN being what that table calls them"},
		{"far off", but(3, "POINT (150000 2500)"), "", "far-off", Look, "x 150000 lies far from all others, of which nine in ten are between 1028.12 and 1843.75"},
		{"a heap at 0, 0", but(3, "POINT (0 0)") + "POINT (0 0),3.5\n", "", "zero-place", Look, "2 rows stand at exactly 0, 0, which is likely a missing place"},

		{"degrees of GeoJSON", points(12, -30, 2), "", "system", Clear,
			"longitude from 12.0312 to 13.9375, latitude from -29.9753 to -28.0741: degrees by the rule of GeoJSON (RFC 7946)"},
		{"degrees of GeoJSON, swapped", points(8, 100, 50), "", "swapped-axes", Look,
			"longitude from 8.7812 to 56.4375, latitude from 100.617 to 148.148: latitudes end at 90, and these go beyond; latitude likely stands before longitude"},
		{"metres in GeoJSON", points(5e5, 4e6, 2e4), "", "no-degrees", Look,
			"longitude from 500312 to 519375, latitude from 4000247 to 4019259: these are no degrees, and should be by the rule of GeoJSON (RFC 7946)"},
		{"a latitude that is none", features(40, func(i int) (string, string) { return featurePoint(i, 12, 40+60*float64(i/39), 2), `{"v":1}` }), "", "no-degrees", Look,
			"longitude from 12.0312 to 13.9375, latitude from 40.0247 to 100.988: degrees end at 360 and 90, and a few of these go beyond"},
		{"GeoJSON in a plane", foreign("urn:ogc:def:crs:EPSG::32633", points(5e5, 4e6, 2e4)), "", "foreign-system", Look,
			`x from 500312 to 519375, y from 4000247 to 4019259: the file says that they are in "EPSG:32633", and GeoJSON is in longitude and latitude (RFC 7946); map takes them only if --crs EPSG:32633 says so`},
		{"GeoJSON in an unknown system", foreign("EPSG:1234", points(5e5, 4e6, 2e4)), "", "foreign-system", Look,
			`x from 500312 to 519375, y from 4000247 to 4019259: the file says that they are in "EPSG:1234", and GeoJSON is in longitude and latitude (RFC 7946); map needs --crs to say what they are, and does not know that name`},
		{"degrees of an unknown system", foreign("EPSG:1234", points(12, -30, 2)), "", "foreign-system", Look,
			`x from 12.0312 to 13.9375, y from -29.9753 to -28.0741: the file says that they are in "EPSG:1234", and GeoJSON is in longitude and latitude (RFC 7946); these are likely degrees, which map takes only if --crs EPSG:4326 says so`},
		{"GeoJSON as said", foreign("EPSG:32633", points(5e5, 4e6, 2e4)), "crs=EPSG:32633", "system", Clear, "x from 500312 to 519375, y from 4000247 to 4019259: taken as EPSG:32633, as said"},

		{"degrees by SRID", withSRID("SRID=4326;", 12, -30, 2), "", "system", Clear, "longitude from 12.0312 to 13.9375, latitude from -29.9753 to -28.0741: degrees by their SRID, EPSG:4326"},
		{"metres by SRID", withSRID("SRID=32633;", 5e5, 4e6, 2e4), "", "system", Clear, "x from 500312 to 519375, y from 4000247 to 4019259: metres of EPSG:32633, as their SRID says"},
		{"degrees with the SRID of metres", withSRID("SRID=32633;", 12, -30, 2), "", "system", Look,
			"x from 12.0312 to 13.9375, y from -29.9753 to -28.0741: these look like degrees and not like metres of EPSG:32633, as their SRID says; map refuses them"},
		{"an unknown SRID", withSRID("SRID=1234;", 5e5, 4e6, 2e4), "", "system", Look, "x from 500312 to 519375, y from 4000247 to 4019259: their SRID says EPSG:1234, which is not known here"},
		{"degrees of an unknown SRID", withSRID("SRID=1234;", 12, -30, 2), "", "system", Look,
			"x from 12.0312 to 13.9375, y from -29.9753 to -28.0741: likely degrees; their SRID says EPSG:1234, which is not known here, and --crs EPSG:4326 takes them for WGS 84"},
		{"SRIDs that differ", withSRID("SRID=32633;", 5e5, 4e6, 2e4) + "SRID=32634;POINT (500001 4000001),1\n", "", "mixed-systems", Look,
			"1 geometry has another SRID than the first, or none, such as row 41; map takes one reference system, and refuses others"},
		{"another SRID than said", withSRID("SRID=32633;", 5e5, 4e6, 2e4), "crs=EPSG:32634", "system", Look,
			"the geometries say by their SRID that they are in EPSG:32633, and --crs says EPSG:32634; map refuses that"},
		{"likely degrees", withSRID("", 12, -30, 2), "", "system", Look,
			"x from 12.0312 to 13.9375, y from -29.9753 to -28.0741: likely degrees, which are taken for metres unless --crs EPSG:4326 says what they are"},
		{"likely degrees, swapped", withSRID("", 12, 130, 2), "", "swapped-axes", Look,
			"x from 12.0312 to 13.9375, y from 130.025 to 131.926: these would fit degrees with latitude before longitude; if they are, put longitude first and say --crs EPSG:4326"},
		{"UTM", withSRID("", 5e5, 4e6, 2e4), "", "system", Clear,
			"x from 500312 to 519375, y from 4000247 to 4019259: likely metres of a UTM zone or a national grid; the numbers do not tell which, and without --crs they are local metres"},
		{"UTM, swapped", withSRID("", 4e6, 5e5, 2e4), "", "swapped-axes", Look,
			"x from 4000312 to 4019375, y from 500247 to 519259: these would fit a UTM zone with northing before easting"},
		{"a field of whole metres", shaped("v", func(i int) string {
			return fmt.Sprintf(`"POLYGON ((%[1]d %[2]d, %[3]d %[2]d, %[3]d %[4]d, %[1]d %[2]d))",1.5`, i%8, i/8, i%8+1, i/8+1)
		}), "", "system", Clear, "x from 0 to 8, y from 0 to 5: an unknown plane; without --crs they are local metres"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			var said []string
			if tt.said != "" {
				said = strings.Split(tt.said, "=")
			}
			r := examined(t, tt.text, said...)
			if !slices.ContainsFunc(r.Findings, func(f Finding) bool { return f.Code == tt.code && f.Level == tt.level && f.Sentence == tt.sentence }) {
				_, looks := sentences(r, Look)
				_, clears := sentences(r, Clear)
				t.Errorf("no %s %q among\n%s\n%s", tt.code, tt.sentence, looks, clears)
			}
		})
	}
}

func TestGeometryProposals(t *testing.T) {
	counts := func(i int) string { return fmt.Sprintf(`"cases":%d,"people":%d`, i%9, 9000+37*i) }
	for _, tt := range []struct {
		name, text, command string
		open                []string
	}{
		{"points of GeoJSON", features(40, func(i int) (string, string) { return featurePoint(i, 12, 4, 2), "{" + counts(i) + "}" }),
			"--response cases --people people --per 10000", nil},
		{"areas with names", features(40, func(i int) (string, string) {
			return featureSquare(i), fmt.Sprintf(`{"code":%d,"note":"n%d","name":"N%d",%s}`, 100+i, i, i, counts(i))
		}), "--response cases --key name --people people --per 10000", nil},
		{"areas with names that are numbers", features(40, func(i int) (string, string) {
			return featureSquare(i), fmt.Sprintf(`{"code":%d,%s,"name":"N%d"}`, 100+i, counts(i), i%9)
		}), "--response cases --key code --people people --per 10000", nil},
		{"names that cannot be said", features(40, func(i int) (string, string) {
			return featureSquare(i), fmt.Sprintf(`{"name=":"N%d",%s,"who":"W%d"}`, i, counts(i), i)
		}), "--response cases --key who --people people --per 10000", nil},
		{"names with blanks", features(40, func(i int) (string, string) {
			return featureSquare(i), fmt.Sprintf(`{"the district's name":"N%d","number of cases":%d,"people":%d}`, i, i%9, 9000+37*i)
		}), `--response 'number of cases' --key 'the district'\''s name' --people people --per 10000`, nil},
		{"coordinates that explain", features(40, func(i int) (string, string) {
			return featureSquare(i), fmt.Sprintf(`{"lon":%d.5,"lat":%d.5,"lead":%d.5}`, 10+i%7, 50+i%3, i%11)
		}), "--response lead", nil},
		{"heights", features(40, func(i int) (string, string) {
			return strings.Replace(featurePoint(i, 12, 4, 2), "]", fmt.Sprintf(",%d.5]", i), 1), fmt.Sprintf(`{"lead":%d.5}`, i%11)
		}), "--response lead", nil},
		{"lines with what was walked", shaped("transect,walked_km,seen", func(i int) string {
			x, y := scattered(i)
			return fmt.Sprintf(`"LINESTRING (%.0f %.0f, %.0f %.0f)",T%d,%d.5,%d`, 1e4*x, 1e4*y, 1e4*x+300, 1e4*y+90, i, 1+i%4, i%6)
		}), "--response seen --geometry g --key transect --effort walked_km", nil},
		{"likely degrees", shaped("lead", func(i int) string { return pointIn(i, "", 12, -30, 2) + fmt.Sprintf(",%d.5", i%11) }),
			"--response lead --geometry g --crs EPSG:4326", nil},
		{"a name that needs quotes", table("-my plot,lead", 40, func(i int) string { return square(i) + fmt.Sprintf(",%d.5", i%11) }),
			"--response lead '--geometry=-my plot'", nil},
		{"an unknown SRID", shaped("lead", func(i int) string { return pointIn(i, "SRID=1234;", 5e5, 4e6, 2e4) + fmt.Sprintf(",%d.5", i%11) }),
			"--response lead --geometry g", []string{"their reference system is not known here: bring the geometries into longitude and latitude or a UTM zone"}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := examined(t, tt.text)
			if r.Proposal == nil || !strings.HasPrefix(r.Proposal.Command, "drumlin map obs.csv "+tt.command+" --out map-") {
				t.Fatalf("got %+v", r.Proposal)
			}
			if !slices.Equal(r.Proposal.Open, tt.open) || strings.Contains(strings.Join(r.Proposal.Choices, " "), "do not go together") {
				t.Errorf("choices %q, open %q", r.Proposal.Choices, r.Proposal.Open)
			}
		})
	}
}

// TestGeometryChoices: areas are summed over, and mapped themselves.
func TestGeometryChoices(t *testing.T) {
	r := examined(t, features(40, func(i int) (string, string) {
		return featureSquare(i), fmt.Sprintf(`{"name":"N%d","lead":%d.5}`, i, i%11)
	}))
	want := []string{
		"each area by points inside it; places.csv and places.png set what was observed on each beside what the map says, each named by name",
		"a lattice of 100 cells along the longer side of the union of the areas",
		"a thin-plate surface with 50 knots, doubled while the fit still moves, its smoothness chosen by the data",
	}
	if got := r.Proposal.Choices[2:]; !slices.Equal(got, want) {
		t.Errorf("got %q", got)
	}
	r = examined(t, shaped("v", func(i int) string {
		return []string{square(i), `"LINESTRING (1 1, 2 2)"`, `"MULTIPOINT (1 1, 2 2)"`}[i%3] + fmt.Sprintf(",%d.5", i%11)
	}))
	if got := r.Proposal.Choices[2]; got != "each group of points by all of them, each line by points along it and each area by points inside it; "+
		"places.csv and places.png set what was observed on each beside what the map says, each named by the number of its row" {
		t.Errorf("got %q", got)
	}
}

// TestGeometryInJSON: the keys are there whatever the table is.
func TestGeometryInJSON(t *testing.T) {
	text := features(3, func(i int) (string, string) {
		return []string{`{"type":"Point","coordinates":[1,2,3]}`, "null", `{"type":"LineString","coordinates":[[0,0]]}`}[i], `{"v":1}`
	})
	for _, tt := range []struct{ name, text, features, geometry, found string }{
		{"features", text, "true", `{"column":"","kinds":[{"kind":"Point","rows":1}],"positions":1,"heights":1,"missing":1,"unreadable":1,"first_unreadable_row":3,` +
			`"reason":"geometry cannot be read: has 1 position, and a line needs 2 or more","crs":""}`, "features"},
		{"a column", "g,v\nSRID=4326;POINT (1 2),3\n", "false", `{"column":"g","kinds":[{"kind":"Point","rows":1}],"positions":1,"heights":0,"missing":0,"unreadable":0,` +
			`"first_unreadable_row":0,"reason":"","crs":"EPSG:4326"}`, "guessed"},
		{"coordinates", "x,y,v\n1,2,3\n", "false", "null", "by name"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := examined(t, tt.text)
			var b strings.Builder
			if err := r.JSON(&b); err != nil {
				t.Fatal(err)
			}
			var got, want map[string]any
			if err := json.Unmarshal([]byte(b.String()), &got); err != nil {
				t.Fatal(err)
			}
			if err := json.Unmarshal([]byte(`{"features":`+tt.features+`,"geometry":`+tt.geometry+`}`), &want); err != nil {
				t.Fatal(err)
			}
			for key, v := range want {
				if !reflect.DeepEqual(got[key], v) {
					t.Errorf("%s: got %v, want %v", key, got[key], v)
				}
			}
			c := got["coordinates"].(map[string]any)
			if x := c["x"] == ""; c["found"] != tt.found || x != (tt.geometry != "null") {
				t.Errorf("got %v", c)
			}
		})
	}
}

// TestRegionsOfGeometries: where the rows of a survey are is known if each has a place of its own, or by coordinates among
// the properties.
func TestRegionsOfGeometries(t *testing.T) {
	half := func(i int) string {
		if x, _ := scattered(i); x > 0.5 {
			return "east"
		}
		return "west"
	}
	each := features(80, func(i int) (string, string) {
		return featureSquare(i), fmt.Sprintf(`{"half":%q,"v":%d.5}`, half(i), i%9)
	})
	again := func(more string) string {
		return features(80, func(i int) (string, string) {
			i /= 2
			x, y := scattered(i)
			return featureSquare(i), fmt.Sprintf(`{"half":%q,"v":%d.5`+more+`}`, append([]any{half(i), i % 9}, []any{x, y}[:strings.Count(more, "%")]...)...)
		})
	}
	for _, tt := range []struct {
		name, text string
		want       []string
	}{
		{"each its own", each, []string{"half"}},
		{"shared", again(""), []string{}},
		{"shared, with coordinates", again(`,"lon":%f,"lat":%f`), []string{"half"}},
	} {
		t.Run(tt.name, func(t *testing.T) {
			if r := examined(t, tt.text); !slices.Equal(r.Regions, tt.want) {
				t.Errorf("got %q", r.Regions)
			}
		})
	}
}

// TestHeader: features have properties, and no separator.
func TestHeader(t *testing.T) {
	for _, tt := range []struct{ text, want string }{
		{features(2, func(int) (string, string) { return `{"type":"Point","coordinates":[1,2]}`, `{"v":1,"w":2}` }), "obs.csv: 2 features, 2 properties, GeoJSON\n"},
		{features(1, func(int) (string, string) { return `{"type":"Point","coordinates":[1,2]}`, `null` }), "obs.csv: 1 feature, 0 properties, GeoJSON\n"},
		{`{"crs":{"properties":{"name":"urn:ogc:def:crs:EPSG::32633"}},"type":"Point","coordinates":[500000,2]}`, "obs.csv: 1 feature, 0 properties, GeoJSON, reference system EPSG:32633\n"},
		{"x;y\n1;2\n", "obs.csv: 1 row, 2 columns, separated by semicolon\n"},
	} {
		var b strings.Builder
		if err := examined(t, tt.text).Words(&b); err != nil || !strings.HasPrefix(b.String(), tt.want) {
			t.Errorf("got %s, want %s", b.String(), tt.want)
		}
	}
}

// TestAwkwardFiles: whatever is odd about a file, there is a report of it or a reason against it.
func TestAwkwardFiles(t *testing.T) {
	read := 0
	err := filepath.WalkDir("../../../testdata/awkward", func(path string, d fs.DirEntry, err error) error {
		if err != nil || d.IsDir() {
			return err
		}
		text, err := os.ReadFile(path)
		if err != nil {
			return err
		}
		for _, geometry := range []string{"", "geom", "shape"} {
			said := plan.Settings{Observations: &path}
			if geometry != "" {
				said.Geometry = &geometry
			}
			want, err := Request(said)
			if err != nil {
				return err
			}
			survey, err := observe.ReadSurvey(strings.NewReader(string(text)), path, want)
			if refused, ok := errors.AsType[*observe.Error](err); ok && refused.What != "" {
				continue
			}
			if err != nil {
				t.Errorf("%s: %v", path, err)
				continue
			}
			read++
			checkReport(t, Examine(survey, said))
		}
		return nil
	})
	if err != nil || read < 50 {
		t.Errorf("%d read, %v", read, err)
	}
}
