package inspect

import (
	"encoding/json"
	"fmt"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"drumlin/io/observe"
	"drumlin/io/plan"
)

// examined is the report of a table that is given as text, with words that are said of it.
func examined(t *testing.T, text string, said ...string) Report {
	t.Helper()
	s := plan.Settings{Observations: new("obs.csv")}
	for i := 0; i < len(said); i += 2 {
		w, _ := plan.Lookup(said[i])
		if err := w.Set(&s, said[i+1]); err != nil {
			t.Fatal(err)
		}
	}
	want, err := Request(s)
	if err != nil {
		t.Fatal(err)
	}
	survey, err := observe.ReadSurvey(strings.NewReader(text), "obs.csv", want)
	if err != nil {
		t.Fatal(err)
	}
	return Examine(survey, s)
}

// table writes a header and rows below it, each by its number.
func table(header string, rows int, row func(i int) string) string {
	var b strings.Builder
	b.WriteString(header + "\n")
	for i := range rows {
		b.WriteString(row(i) + "\n")
	}
	return b.String()
}

// scattered is a place in a square of 1 by 1, by a rule that repeats none (van der Corput's in bases 2 and 3).
func scattered(i int) (x, y float64) { return radical(i+1, 2), radical(i+1, 3) }

func radical(i, base int) (v float64) {
	for f := 1 / float64(base); i > 0; i /= base {
		v += f * float64(i%base)
		f /= float64(base)
	}
	return v
}

// placed is a table of places in a plane some hundred metres wide, with more columns.
func placed(header string, rows int, rest func(i int) string) string {
	return table("x,y,"+header, rows, func(i int) string {
		x, y := scattered(i)
		return fmt.Sprintf("%.1f,%.1f,%s", 1000+900*x, 2000+900*y, rest(i))
	})
}

func sentences(r Report, level Level) (codes []string, text string) {
	for _, f := range r.Findings {
		if f.Level == level {
			codes = append(codes, f.Code)
			text += f.Sentence + "\n"
		}
	}
	return codes, text
}

// at is a table of rows at places that are shrunk or stretched and moved.
func at(header string, x0, y0, width float64, decimals int) string {
	return table(header+",v", 40, func(i int) string {
		x, y := scattered(i)
		return fmt.Sprintf("%.*f,%.*f,%d.5", decimals, x0+width*x, decimals, y0+width*y, i%7)
	})
}

func TestSystems(t *testing.T) {
	for _, tt := range []struct {
		name, text string
		said       []string
		look       []string
		likely     string
		command    string // what it says of the coordinates
	}{
		{"degrees by name", at("lon,lat", 12, -30, 2, 4), nil, nil, "longitude and latitude in degrees", ""},
		{"degrees, swapped", at("lon,lat", 8, 100, 2, 4), nil, []string{"swapped-axes"}, "latitude and longitude in degrees, swapped", "--x lat --y lon --crs EPSG:4326 "},
		{"no degrees", at("lon,lat", 5e5, 4e6, 2e4, 0), nil, []string{"no-degrees"}, "no degrees", ""},
		{"degrees as x and y", at("x,y", 12, -30, 2, 4), nil, []string{"system"}, "degrees", "--crs EPSG:4326 "},
		{"degrees as x and y, swapped", at("x,y", 12, 130, 2, 4), nil, []string{"swapped-axes"}, "degrees, swapped", "--x y --y x --crs EPSG:4326 "},
		{"rows and columns of a field", at("x,y", 0, 0, 60, 0), nil, nil, "an unknown plane", ""},
		{"UTM", at("easting,northing", 5e5, 4e6, 2e4, 0), nil, nil, "metres of a plane such as a UTM zone or a national grid", ""},
		{"UTM, swapped", at("easting,northing", 4e6, 5e5, 2e4, 0), nil, []string{"swapped-axes"}, "metres of a plane, swapped", "--x northing --y easting "},
		{"kilometres", at("utm_x_km,utm_y_km", 500, 4000, 20, 2), nil, []string{"coordinates-guessed", "unit"}, "kilometres", "--x utm_x_km --y utm_y_km "},
		{"as said", at("a,b", 5e5, 4e6, 2e4, 0), []string{"x", "a", "y", "b", "crs", "EPSG:32633"}, nil, "EPSG:32633", "--x a --y b --crs EPSG:32633 "},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := examined(t, tt.text, tt.said...)
			look, text := sentences(r, Look)
			if !slices.Equal(look, tt.look) || r.Coordinates.Likely != tt.likely {
				t.Errorf("likely %q; to look at:\n%s", r.Coordinates.Likely, text)
			}
			if want := "drumlin map obs.csv --response v " + tt.command + "--out map-v"; r.Proposal.Command != want {
				t.Errorf("got  %s\nwant %s", r.Proposal.Command, want)
			}
		})
	}
}

func TestSpacing(t *testing.T) {
	r := examined(t, table("x,y,v", 30, func(i int) string { return fmt.Sprintf("%d,%d,1.5", 7*(i%6), 7*(i/6)) }))
	if *r.Coordinates.Spacing != 7 || r.Coordinates.Places != 30 {
		t.Errorf("got %v of %d places", *r.Coordinates.Spacing, r.Coordinates.Places)
	}
	// A hundredth of a degree of latitude at the equator is 1105.7 m (WGS 84, from memory).
	r = examined(t, table("lon,lat,v", 30, func(i int) string { return fmt.Sprintf("%.2f,%.2f,1.5", 10+0.02*float64(i%6), 0.01*float64(i/6)) }))
	if d := *r.Coordinates.Spacing; d < 1105 || d > 1106.5 {
		t.Errorf("got %v m", d)
	}
}

func TestLooks(t *testing.T) {
	plain := func(i int) string { return fmt.Sprintf("%d.5", i%7) }
	for _, tt := range []struct{ name, text, code, sentence string }{
		{"a heap at 0, 0", placed("v", 40, plain) + "0,0,1.5\n0,0,2.5\n", "zero-place", "2 rows stand at exactly 0, 0, which is likely a missing place"},
		{"one row at 0, 0 in degrees", at("lon,lat", -5, -5, 10, 4) + "0,0,1.5\n", "zero-place", "1 row stands at exactly 0, 0, which is likely a missing place"},
		{"a heap at one place", placed("v", 40, plain) + strings.Repeat("1500,2500,1.5\n", 12), "heap", "12 rows stand at the one place 1500, 2500, and 1 at most places"},
		{"far off", placed("v", 40, plain) + "150000,2500,1.5\n", "far-off", "x 150000 lies far from all others, of which nine in ten are between 1056.2 and 1843.8"},
		{"repeated rows", placed("v", 40, plain) + "1450.0,2300.0,0.5\n", "repeated-rows", "1 row repeats another in every column, such as row 41 that of row 1; copies make a map surer than it should be"},
		{"no places", placed("v", 40, plain) + ",5,1.5\n7,x,2.5\n", "missing-coordinates", "2 rows have no place; the first is row 41"},
		{"few places", placed("v", 4, plain), "places", "4 distinct places, each about"},
		{"no coordinates", table("a,b", 30, func(i int) string { return fmt.Sprintf("%d.5,2.5", i) }), "no-coordinates", "no coordinate columns are recognised; name them with --x and --y"},
		{"two pairs", table("x,y,easting,northing,v", 30, func(i int) string { return fmt.Sprintf("%d,%d,%d,%d,1.5", i, i%7, i, i%7) }),
			"coordinates-guessed", "columns easting/northing and x/y could both be the coordinates; easting and northing are a guess by their names"},
		{"a decimal comma", placed("v", 40, func(i int) string { return fmt.Sprintf(`"%d,5"`, i%7) }), "not-numbers",
			`40 of 40 values of v are no numbers, the first "0,5" in row 1 (line 2); 40 with a decimal comma, which --decimal-comma allows`},
		{"one that is no number", placed("v", 39, plain) + "1,2,lost\n", "not-numbers", `1 of 40 values of v is no number: "lost" in row 40 (line 41)`},
		{"a mark", placed("v", 39, plain) + "1200,2200,-999\n", "missing-mark", "v goes down to -999, likely a mark"},
		{"empty", placed("v,w,u", 40, func(i int) string { return plain(i) + ",," }), "empty-columns", "no value at all in w and u"},
		{"constant", placed("v,w", 40, func(i int) string { return plain(i) + ",2023" }), "constant-columns", "the same value in every row of w (2023)"},
		{"no name", placed("v,", 40, func(i int) string { return plain(i) + ",a" + plain(i) }), "unnamed-columns", "column 4 without a name"},
		{"spellings", placed("v,soil", 40, func(i int) string { return plain(i) + []string{",Clay", ",clay", ",sand"}[i%3] }), "spellings", `soil has both "Clay" and "clay", which count as two`},
		{"dates", placed("v,day", 40, func(i int) string { return plain(i) + fmt.Sprintf(",%d/%d/2023", i%12+1, i%5+1) }), "dates", "whether day or month comes first cannot be told"},
		{"a rate", placed("deaths,residents,r", 40, func(i int) string {
			c, n := i%9, 400+37*i
			return fmt.Sprintf("%d,%d,%.2f", c, n, 1e4*float64(c)/float64(n))
		}), "rate", "r is likely deaths per 10000 of residents"},
		{"above the trials", placed("positive,examined", 40, func(i int) string { return fmt.Sprintf("%d,%d", i%9+20*(i/39), 10+i%4) }), "above-trials", "positive is above examined in 1 row;"},
		{"a negative count", placed("cases,residents", 40, func(i int) string { return fmt.Sprintf("%d,%d", i%9-9*(i/39), 100+i) }), "negative-count", "1 value of cases is negative"},
		{"nobody", placed("cases,residents", 40, func(i int) string { return fmt.Sprintf("%d,%d", i%9, 100*min(i, 1)) }), "no-denominator", "1 value of residents is not above 0"},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := examined(t, tt.text)
			for _, f := range r.Findings {
				if f.Code == tt.code && f.Level == Look && strings.Contains(f.Sentence, tt.sentence) {
					return
				}
			}
			_, text := sentences(r, Look)
			t.Errorf("no %s %q among\n%s", tt.code, tt.sentence, text)
		})
	}
}

// TestNothingToLookAt: an ordinary table gives no alarm.
func TestNothingToLookAt(t *testing.T) {
	r := examined(t, placed("id,nitrate,soil", 60, func(i int) string {
		return fmt.Sprintf("%d,%d.%d,%s", i+1, i%13, i%10, []string{"clay", "sand"}[i*i%7%2])
	}))
	if look, text := sentences(r, Look); len(look) > 0 {
		t.Error(text)
	}
	if len(r.Candidates) != 1 || len(r.Regions) != 0 || len(r.Undecided) != 0 {
		t.Errorf("candidates %v, regions %v, undecided %v", r.Candidates, r.Regions, r.Undecided)
	}
}

func TestCandidates(t *testing.T) {
	for _, tt := range []struct{ name, text, command string }{
		{"people", placed("pop,cases", 40, func(i int) string { return fmt.Sprintf("%d,%d", 9000+37*i, i%9) }), "--response cases --people pop --per 10000"},
		{"trials", placed("tested,infected", 40, func(i int) string { return fmt.Sprintf("%d,%d", 20+i%9, i%9) }), "--response infected --trials tested"},
		{"area with a unit", placed("larvae,plot_m2", 40, func(i int) string { return fmt.Sprintf("%d,%d.5", i%9, 1+i%3) }), "--response larvae --area plot_m2"},
		{"effort", placed("nightsOut,hours,caught", 40, func(i int) string { return fmt.Sprintf("1,%d,%d", 1+i%9, i%5) }), "--response caught --effort hours"},
		{"expected", placed("observed,expected", 40, func(i int) string { return fmt.Sprintf("%d,%d.25", i%9, 3+i%5) }), "--response observed --expected expected"},
		{"a count alone", placed("nests", 40, func(i int) string { return fmt.Sprint(i % 23 % 12) }), "--response nests --distribution poisson --extra-variation auto"},
		{"a pair by its numbers", placed("b1,d1,b2,d2", 40, func(i int) string { return fmt.Sprintf("%d,%d,%d,%d", 9000+37*i, i%9, 9900+53*i, 1+i%8) }), "--response d1 --people b1 --per 10000"},
		{"a measurement", placed("elevation,lead", 40, func(i int) string { return fmt.Sprintf("%d.2,%d.7", 100+i, i%9) }), "--response lead"},
		{"zinc above copper", placed("copper,zinc", 40, func(i int) string { return fmt.Sprintf("%d,%d", 20+i%19, 200+i%31) }), "--response copper"},
		{"quotes", placed("it's here,$x", 40, func(i int) string { return fmt.Sprintf("%d.5,", i%9) }), `--response 'it'\''s here'`},
		{"a hyphen", placed("-v", 40, func(i int) string { return fmt.Sprintf("%d.5", i%9) }), `--response=-v`},
	} {
		t.Run(tt.name, func(t *testing.T) {
			r := examined(t, tt.text)
			if r.Proposal == nil || !strings.HasPrefix(r.Proposal.Command, "drumlin map obs.csv "+tt.command+" --out map-") {
				t.Fatalf("got %+v", r.Proposal)
			}
			if len(r.Proposal.Open) > 0 || strings.Contains(strings.Join(r.Proposal.Choices, " "), "do not go together") {
				t.Errorf("choices %q, open %q", r.Proposal.Choices, r.Proposal.Open)
			}
		})
	}
}

// TestAreaWithoutUnit: what cannot be known is not made up.
func TestAreaWithoutUnit(t *testing.T) {
	r := examined(t, placed("plants,area", 40, func(i int) string { return fmt.Sprintf("%d,%d.5", i%9, 1+i%3) }))
	if r.Proposal.Command != "drumlin map obs.csv --response plants --area area --out map-plants" || len(r.Proposal.Open) != 1 ||
		!strings.HasPrefix(r.Proposal.Choices[0], "distribution poisson") || strings.Contains(strings.Join(r.Proposal.Choices, " "), "area unit") {
		t.Errorf("got %+v", r.Proposal)
	}
}

func TestRegions(t *testing.T) {
	r := examined(t, placed("v,half,soil", 80, func(i int) string {
		x, _ := scattered(i)
		half := "west"
		if x > 0.5 {
			half = "east"
		}
		return fmt.Sprintf("%d.5,%s,%s", i%9, half, []string{"clay", "sand"}[i*i%7%2])
	}))
	if !slices.Equal(r.Regions, []string{"half"}) || r.Starter().SplitBy != "half" {
		t.Errorf("got %q", r.Regions)
	}
}

func TestGuessCoordinates(t *testing.T) {
	for _, tt := range []struct{ names, x, y string }{
		{"utm_x utm_y", "utm_x", "utm_y"}, {"XCoord YCoord", "XCoord", "YCoord"}, {"Lat Long", "Long", "Lat"}, {"x_m y_m v", "x_m", "y_m"},
		{"row col y", "col", "row"}, {"start.east start.north end.east end.north", "start.east", "start.north"},
		{"x_a y_b", "", ""}, {"x", "", ""}, {"max may", "", ""}, {"", "", ""},
	} {
		if x, y := GuessCoordinates(strings.Fields(tt.names)); x != tt.x || y != tt.y {
			t.Errorf("%s: got %q and %q", tt.names, x, y)
		}
	}
}

// TestRequestRefusesUnknownSystem names the flag.
func TestRequestRefusesUnknownSystem(t *testing.T) {
	if _, err := Request(plan.Settings{CRS: new("EPSG:0")}); err == nil || !strings.HasPrefix(err.Error(), "--crs: ") {
		t.Errorf("got %v", err)
	}
}

// TestFormatIsSaid: what is said of the format is heeded, and proposed again.
func TestFormatIsSaid(t *testing.T) {
	text := table("x|y|v", 30, func(i int) string { return fmt.Sprintf("%d,5|%d,25|%d", i, i*i%17, []int{i % 7, -99}[i/29]) })
	r := examined(t, text, "separator", "pipe", "decimal-comma", "true", "missing", "-99")
	if c := r.Columns[2]; *c.Least != 0 || c.Missing != 1 || *r.Columns[0].Most != 29.5 {
		t.Errorf("got %+v", r.Columns)
	}
	if want := "drumlin map obs.csv --response v --crs EPSG:4326 --separator pipe --decimal-comma --missing=-99 --distribution poisson " +
		"--extra-variation auto --out map-v"; r.Proposal.Command != want {
		t.Errorf("got  %s\nwant %s", r.Proposal.Command, want)
	}
}

// TestReportIsWhole: the JSON can be read back, with the keys that are documented, and the words fit a screen.
func TestReportIsWhole(t *testing.T) {
	for _, name := range []string{"meuse.csv", "nc_sids.csv", "beet_webworms.csv", "burkina_faso_malaria.csv", "rongelap_radiation.csv", "nc_sids_counties.geojson"} {
		text, err := os.ReadFile(filepath.Join("../../../testdata", name))
		if err != nil {
			t.Fatal(err)
		}
		r := examined(t, string(text))
		var b, words strings.Builder
		if err := r.JSON(&b); err != nil {
			t.Fatal(err)
		}
		var back map[string]any
		if err := json.Unmarshal([]byte(b.String()), &back); err != nil {
			t.Fatal(err)
		}
		for _, key := range []string{"file", "rows", "separator", "encoding", "rows_compared", "columns", "features", "geometry", "coordinates", "findings", "regions", "candidates", "proposal", "undecided"} {
			if _, there := back[key]; !there {
				t.Errorf("%s: no %s", name, key)
			}
		}
		if err := r.Words(&words); err != nil {
			t.Fatal(err)
		}
		if lines := strings.Count(words.String(), "\n"); lines > 55 {
			t.Errorf("%s: %d lines", name, lines)
		}
		var starter strings.Builder
		if err := plan.WriteStarter(&starter, r.Starter()); err != nil {
			t.Fatal(err)
		}
		b2, err := plan.ReadBatch([]byte(starter.String()), "plan.toml")
		if err != nil {
			t.Fatal(err)
		}
		if _, err := b2.Region("a", name, "."); err != nil {
			t.Errorf("%s: its plan is refused: %v", name, err)
		}
	}
}

// TestLongReportFolds: many columns and findings stay within bounds.
func TestLongReportFolds(t *testing.T) {
	var header, row []string
	for i := range 60 {
		header = append(header, fmt.Sprintf("a%d", i))
		row = append(row, fmt.Sprintf("%d.5", i))
	}
	r := examined(t, placed(strings.Join(header, ","), 40, func(i int) string { return fmt.Sprintf("%d-", i) + strings.Join(row, ",x")[1:] }))
	var words strings.Builder
	if err := r.Words(&words); err != nil {
		t.Fatal(err)
	}
	if !strings.Contains(words.String(), "  and 46 more columns, which --json lists\n") || strings.Count(words.String(), "\n") > 50 {
		t.Error(words.String())
	}
}

// FuzzExamine: whatever stands in a table, there is a report of it, and its plan is one.
func FuzzExamine(f *testing.F) {
	f.Add("x,y,cases,pop\n1,2,3,40\n0,0,-999,5\n")
	f.Add("lon,lat,v,\n1e300,-1e300,<5,a\n200,95,1e308,b\n")
	f.Add("-x,-y,a'b,a1\n1,2,3,4\n5,6,7,8\n")
	f.Add("-g,a=b,v\nPOINT (1 2),p,3\n\"POLYGON ((0 0, 1 0, 1 1, 0 0))\",q,4\nPOINT(,r,5\n")
	f.Add("g,h\nSRID=4326;POINT (1 2),POINT (3 4)\nSRID=1;POINT EMPTY,NA\n")
	f.Add(`{"type":"Point","coordinates":[1e9,2,3]}{"type":"Feature","id":1,"geometry":null,"properties":{"z":"<1","lon":2,"lat":1}}`)
	f.Fuzz(func(t *testing.T, text string) {
		survey, err := observe.ReadSurvey(strings.NewReader(text), "f", observe.SurveyRequest{Guess: GuessCoordinates})
		if err != nil {
			return
		}
		checkReport(t, Examine(survey, plan.Settings{Observations: new("f.csv")}))
	})
}

// checkReport demands that a report can be written in every form, and that its plan is one.
func checkReport(t *testing.T, r Report) {
	t.Helper()
	var out, starter strings.Builder
	if err := r.JSON(&out); err != nil {
		t.Fatal(err)
	}
	if err := r.Words(&out); err != nil {
		t.Fatal(err)
	}
	if err := plan.WriteStarter(&starter, r.Starter()); err != nil {
		t.Fatal(err)
	}
	if _, err := plan.ReadBatch([]byte(starter.String()), "plan.toml"); err != nil {
		t.Fatalf("%s: %v", r.File, err)
	}
}
