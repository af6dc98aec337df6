package observe

import (
	"errors"
	"math"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

var pointHex = "0101000020E6100000000000000000F03F0000000000000040" // SRID=4326;POINT (1 2), by hand after OGC 06-103r4

func TestSurveyFeatures(t *testing.T) {
	s := survey(t, strings.Join([]string{
		feature(at("1,2,3"), `{"n":1,"when":"2024-02-29"}`), feature(square, `{"n":2.5}`), feature("null", `{"n":"x"}`),
		feature(`{"type":"LineString","coordinates":[[0,0]]}`, `{"when":null}`), feature(at("1,2,3"), `{"n":1,"when":"2024-02-29"}`), feature(at("1,2"), `{"n":1,"when":"2024-02-29"}`),
	}, "\n"), SurveyRequest{})
	want := &SurveyShapes{Kinds: []ShapeCount{{"Point", 3}, {"Polygon", 1}}, Least: [2]float64{0, 0}, Most: [2]float64{2, 2}, Positions: 8, Heights: 2, Missing: 1, Bad: 1,
		Line: 4, Row: 4, Reason: "geometry cannot be read: has 1 position, and a line needs 2 or more"}
	if diff := cmp.Diff(want, s.Shapes); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	places := SurveyPlaces{X: []float64{1, 1}, Y: []float64{2, 1}, Rows: []int{3, 1}, Without: 2, Row: 3}
	if diff := cmp.Diff(places, s.Places) + cmp.Diff(RepeatedRows{Rows: 1, Row: 5, Original: 1}, s.Repeated); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if !s.Features || s.GeometryName != "geometry" || s.Separator != "" || s.Encoding != "UTF-8" || !s.Degrees || s.Unrecognised != nil || s.Guessed || s.Rows != 6 {
		t.Errorf("got %+v", s)
	}
	var kinds []string
	for _, c := range s.Columns {
		kinds = append(kinds, c.Name+": "+string(c.Kind))
	}
	if diff := cmp.Diff([]string{"n: text", "when: dates", "z: whole numbers"}, kinds); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if z := s.Column("z"); z.Values != 2 || z.Missing != 4 || z.Most != 3 {
		t.Errorf("z is %+v", z)
	}
}

func TestSurveyFeaturesInAnotherSystem(t *testing.T) {
	text := `{"crs":{"properties":{"name":"urn:ogc:def:crs:EPSG::32633"}},` + feature(at("500000,4600000"), `{"n":1}`)[1:]
	s := survey(t, text, SurveyRequest{})
	refusal, _ := errors.AsType[*Error](s.Unrecognised)
	if s.CRS != "EPSG:32633" || s.Degrees || refusal == nil || refusal.Advice != "say with --crs what the coordinates are in" || s.Places.X[0] != 500000 || s.Shapes.Most[1] != 4600000 {
		t.Errorf("got %+v", s)
	}
	if s = survey(t, text, SurveyRequest{Axes: AxesPlane}); s.Unrecognised != nil || s.Degrees || s.CRS != "EPSG:32633" {
		t.Errorf("in a plane: got %+v", s)
	}
	for _, want := range []SurveyRequest{{X: "x", Y: "y"}, {Geometry: "g"}} {
		if _, err := ReadSurvey(strings.NewReader(text), "obs.csv", want); err == nil {
			t.Errorf("%+v is taken for features", want)
		}
	}
}

// Columns of geometries are known by their looks, or named.
func TestSurveyGeometryColumns(t *testing.T) {
	for _, tt := range []struct {
		name, values string
		kind         ColumnKind
		want         *SurveyShapes
	}{
		{"WKT", "POINT (1 2)|NA|LINESTRING (0 0, 5 5)|POINT EMPTY|x", Geometries, &SurveyShapes{Kinds: []ShapeCount{{"Point", 1}, {"LineString", 1}},
			Most: [2]float64{5, 5}, Positions: 3, Missing: 2, Bad: 1, Line: 6, Row: 5, Reason: `geometry cannot be read: character 1: "X" is not a kind of geometry`}},
		{"late", "|unknown|POINT Z (1 2 3)|point(3 4)", Geometries, &SurveyShapes{Kinds: []ShapeCount{{"Point", 2}}, Least: [2]float64{1, 2}, Most: [2]float64{3, 4}, Positions: 2,
			Heights: 1, Missing: 1, Bad: 1, Line: 3, Row: 2, Reason: `geometry cannot be read: character 1: "UNKNOWN" is not a kind of geometry`}},
		{"EWKB", pointHex + "|0x" + pointHex + "|SRID=32633;POINT (1 2)", Geometries, &SurveyShapes{Kinds: []ShapeCount{{"Point", 3}},
			Least: [2]float64{1, 2}, Most: [2]float64{1, 2}, Positions: 3, CRS: "EPSG:4326", Others: 1, OtherRow: 3}},
		{"half", "POINT (1 2)|village (old)", Text, nil},
		{"names", "Upper Vale (old)|Lower Vale|EMPTY", Text, nil},
		{"long numbers", "000000000000000000001|000000000000000000002", WholeNumbers, nil},
	} {
		t.Run(tt.name, func(t *testing.T) {
			c := column(t, tt.values)
			if diff := cmp.Diff(tt.want, c.Shapes); diff != "" || c.Kind != tt.kind {
				t.Errorf("%q (-want +got):\n%s", c.Kind, diff)
			}
		})
	}
}

func TestSurveyPlacesOfGeometries(t *testing.T) {
	const text = "nr\tg\n1\tSRID=4326;POINT (1 2)\n2\tx\n3\tSRID=4326;POINT (1 2)\n4\t\n"
	guessed := survey(t, text, SurveyRequest{})
	if guessed.GeometryName != "g" || !guessed.Guessed || guessed.Unrecognised == nil || !guessed.Degrees || guessed.CRS != "EPSG:4326" {
		t.Errorf("got %+v", guessed)
	}
	named := survey(t, text, SurveyRequest{Geometry: "g"})
	if named.Guessed || named.Unrecognised != nil || named.Recognised {
		t.Errorf("got %+v", named)
	}
	if diff := cmp.Diff(guessed, named, cmpopts.IgnoreFields(Survey{}, "Guessed", "Unrecognised"), cmpopts.EquateNaNs()); diff != "" {
		t.Errorf("(-guessed +named):\n%s", diff)
	}
	if diff := cmp.Diff(SurveyPlaces{X: []float64{1}, Y: []float64{2}, Rows: []int{2}, Without: 2, Row: 2}, named.Places); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	two := survey(t, "a\tb\nPOINT (1 2)\tPOINT (3 4)\n", SurveyRequest{})
	if two.GeometryName != "" || two.Shapes != nil || two.Guessed || two.Column("b").Shapes == nil {
		t.Errorf("of two columns: %+v", two)
	}
	coordinates := survey(t, "x\ty\tg\n1\t2\tPOINT (3 4)\n", SurveyRequest{})
	if coordinates.GeometryName != "" || coordinates.Shapes != nil || coordinates.Places.X[0] != 1 || coordinates.Column("g").Kind != Geometries {
		t.Errorf("beside coordinates: %+v", coordinates)
	}
	none := survey(t, "nr\tg\n1\tx\n", SurveyRequest{Geometry: "g"})
	if none.Shapes == nil || none.Shapes.Bad != 1 || !math.IsNaN(none.Shapes.Least[0]) || none.Places.Without != 1 {
		t.Errorf("of none that can be read: %+v", none)
	}
	if _, err := ReadSurvey(strings.NewReader(text), "obs.csv", SurveyRequest{Geometry: "h"}); err == nil || err.Error() != `obs.csv: line 1: no column "h" for the geometry` {
		t.Errorf("got %v", err)
	}
}
