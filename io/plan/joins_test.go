package plan

import "testing"

// said makes settings of words and values in turn.
func saidWords(t *testing.T, pairs ...string) Settings {
	t.Helper()
	s := Settings{Observations: new("o.csv"), Response: new("n")}
	for i := 0; i < len(pairs); i += 2 {
		w, ok := Lookup(pairs[i])
		if !ok {
			t.Fatalf("no word %s", pairs[i])
		}
		if err := w.Set(&s, pairs[i+1]); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

// TestJoinsSumsAndStrips: what does not go together is refused by name, and what does passes.
func TestJoinsSumsAndStrips(t *testing.T) {
	for _, c := range []struct {
		name, want string
		words      []string
	}{
		{"places and key", "", []string{"people", "p", "places", "d.geojson", "key", "district=name", "absent", "zero"}},
		{"places without a key", "key: nothing says which column of the observations finds its place in --places", []string{"places", "d.geojson"}},
		{"join without a key", "key: nothing says which column of the observations finds its place in --join", []string{"join", "p.csv"}},
		{"key alone", "", []string{"key", "district"}},
		{"key alone with a property", `key: there is no file to find "name" in`, []string{"key", "district=name"}},
		{"absent without places", "absent: without places none can be without a row", []string{"absent", "zero"}},
		{"zero measured", "absent: nothing measured is not a measurement of 0", []string{"places", "d.geojson", "key", "k", "absent", "zero"}},
		{"missing measured", "", []string{"places", "d.geojson", "key", "k", "absent", "missing"}},
		{"key is the response", `key: column "n" is already the response`, []string{"key", "n"}},
		{"sum of counts", "", []string{"people", "p", "sum-by", "k"}},
		{"sum of measurements", "sum-by: measurements (gaussian) do not add up", []string{"sum-by", "k"}},
		{"sum with weights", "sum-by: the weights of rows that are added up have no meaning", []string{"distribution", "tweedie", "weight", "w", "sum-by", "k"}},
		{"sum by the response", `sum-by: column "n" is already the response`, []string{"people", "p", "sum-by", "n"}},
		{"geometry beside x", "geometry: x and y are named as well; a row has one place", []string{"x", "a", "y", "b", "geometry", "g"}},

		{"strips", "", []string{"length", "walked_km", "width", "100"}},
		{"strips with a column", "", []string{"length", "walked", "length-unit", "m", "width", "wide_m", "detection", "0.7"}},
		{"length alone", "length: a length makes no area without a width", []string{"length", "walked_km"}},
		{"width alone", "width: a width makes no area without a length", []string{"width", "100"}},
		{"unit alone", "length-unit: no length is named", []string{"length-unit", "km"}},
		{"unit unknown", `length: the unit of column "walked" is not given`, []string{"length", "walked", "width", "100"}},
		{"unit against the name", `length-unit: the name of column "walked_km" says km, not m`, []string{"length", "walked_km", "length-unit", "m", "width", "9"}},
		{"area unit against the name", `area-unit: the name of column "a_ha" says ha, not m2`, []string{"area", "a_ha", "area-unit", "m2"}},
		{"area unit of strips", "", []string{"length", "walked_km", "width", "9", "area-unit", "m2"}},
		{"width in km", `width: the name of column "wide_km" says kilometres, and a width is in metres`, []string{"length", "walked_km", "width", "wide_km"}},
		{"area and length", "length: area is named as well; a count has one denominator", []string{"area", "a_ha", "length", "walked_km", "width", "9"}},
		{"length and people", "length: people is named as well; a count has one denominator", []string{"people", "p", "length", "walked_km", "width", "9"}},
		{"detection of people", "detection: it multiplies the area searched, and no area is named", []string{"people", "p", "detection", "0.5"}},
		{"detection of an area", "", []string{"area", "a_ha", "detection", "seen"}},
		{"cv of nothing", "exposure-cv: it is the uncertainty of a denominator, and none is named", []string{"exposure-cv", "0.1"}},
		{"cv of effort by strata", "", []string{"effort", "e", "exposure-cv", "0.1", "exposure-strata", "s"}},
		{"strata alone", "exposure-strata: there is no factor for rows to share", []string{"effort", "e", "exposure-strata", "s"}},
		{"one column twice", `detection: column "seen" is already width`, []string{"length", "walked_km", "width", "seen", "detection", "seen"}},
		{"cv in the denominator", `exposure-cv: column "e" is already the denominator`, []string{"effort", "e", "exposure-cv", "e"}},
	} {
		got := ""
		if err := saidWords(t, c.words...).Validate(); err != nil {
			got = err.Error()
		}
		if got != c.want {
			t.Errorf("%s:\n got %q\nwant %q", c.name, got, c.want)
		}
	}
}

// TestUnitsOfStrips: the unit of densities follows that of the length unless it is said.
func TestUnitsOfStrips(t *testing.T) {
	for _, c := range []struct{ length, unit, area, wantUnit, wantArea string }{
		{"walked_km", "", "", Kilometres, SquareKilometres},
		{"Length (m)", "", "", Metres, Hectares},
		{"walked", "km", "ha", Kilometres, Hectares},
	} {
		words := []string{"length", c.length, "width", "20"}
		if c.unit != "" {
			words = append(words, "length-unit", c.unit, "area-unit", c.area)
		}
		s, err := saidWords(t, words...).Resolve()
		if err != nil {
			t.Fatal(err)
		}
		if *s.LengthUnit != c.wantUnit || *s.AreaUnit != c.wantArea || *s.Distribution != Poisson {
			t.Errorf("%s: %s, %s, %s", c.length, *s.LengthUnit, *s.AreaUnit, *s.Distribution)
		}
	}
}

// TestAmounts: what is a number is held to its range, anything else is the name of a column.
func TestAmounts(t *testing.T) {
	for value, want := range map[string]string{
		"0.8": "", "1": "", "seen": "", "1.2": `detection: "1.2" is more than 1`, "0": `detection: "0" is not above 0`,
		"-1": `detection: "-1" is not above 0`, "0,8": `detection: "0,8" is not a number`, "NaN": `detection: "NaN" is not a finite number`, " ": `detection: " " nothing is given`,
	} {
		w, _ := Lookup("detection")
		var s Settings
		got := ""
		if err := w.Set(&s, value); err != nil {
			got = err.Error()
		} else if (s.Detection.Column == "") != (value != "seen") {
			t.Errorf("%s: %+v", value, *s.Detection)
		}
		if got != want {
			t.Errorf("%s: %q, want %q", value, got, want)
		}
	}
}

// TestPerCentIsTold: a share above its bound is likely in per cent.
func TestPerCentIsTold(t *testing.T) {
	w, _ := Lookup("exposure-cv")
	err := w.Set(&Settings{}, "15")
	if e, ok := err.(*Error); !ok || e.Error() != `exposure-cv: "15" is more than 2` || e.Hint() != "for 15 per cent write 0.15" {
		t.Errorf("%v", err)
	}
}

// TestPathsOfLists: every file of a list is moved to a folder and told by its base name.
func TestPathsOfLists(t *testing.T) {
	s := saidWords(t, "join", "a/people.csv", "join", "/b/more.csv", "key", "k").RelativeTo("/plan")
	if got := s.Files(); len(got) != 3 || got[1] != "/plan/a/people.csv" || got[2] != "/b/more.csv" {
		t.Errorf("files %q", got)
	}
	for _, e := range s.Effective() {
		if list, ok := e.Value.([]string); e.Key == "join" && (!ok || list[0] != "people.csv" || list[1] != "more.csv") {
			t.Errorf("recorded as %v", e.Value)
		}
	}
	if got := s.Files(); got[1] != "/plan/a/people.csv" {
		t.Errorf("telling the base names changed the paths: %q", got)
	}
}
