package observe

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"
)

// drawFeatures writes features of some districts in all ways that rows can be good or bad, and returns them with the
// district of each.
func drawFeatures(random *rand.Rand, n int) (features, districts []string) {
	geometries := []string{at("1,2"), at("3,4,5.5"), square, "null", `{"type":"LineString","coordinates":[[1,2]]}`,
		`{"type":"MultiLineString","coordinates":[[[1,2],[3,4]],[[5,6],[7,8]]]}`, `{"type":"MultiPoint","coordinates":[[9,9]]}`}
	for i := range n {
		district := fmt.Sprintf("Tal %d", random.IntN(4))
		properties := fmt.Sprintf(`{"n":%d,"district":" %s ","name":"Ort %d"}`, random.IntN(9), district, i)
		switch random.IntN(8) {
		case 0:
			properties = fmt.Sprintf(`{"extra":[1,2],"district":%q}`, district)
		case 1:
			properties, district = `{"n":3,"district":null}`, ""
		}
		features = append(features, feature(geometries[random.IntN(len(geometries))], properties))
		districts = append(districts, district)
	}
	return features, districts
}

// A part is the table with the rows of other parts left out, and the table of a file with nothing else.
func TestPartsOfFeatures(t *testing.T) {
	random := rand.New(rand.NewPCG(5, 6))
	want := Request{Response: "n", Kind: Count, Keep: []string{"name", "district"}}
	for range 20 {
		features, districts := drawFeatures(random, 60)
		text := strings.Join(features, "\n")
		parts := split(t, text, "district")
		sum, bytes, unnamed := 0, 0, 0
		for _, d := range districts {
			if d == "" {
				unnamed++
			}
		}
		for name, part := range parts {
			var alone []string
			for i, d := range districts {
				if d == name {
					alone = append(alone, features[i])
				}
			}
			if part.Rows != len(alone) || part.Name != name {
				t.Fatalf("%q has %d rows, not %d", name, part.Rows, len(alone))
			}
			single := strings.Join(alone, "\n")
			table, err := ReadPart(part, want)
			other, otherErr := Read(strings.NewReader(single), "all.csv", want)
			if (err == nil) != (otherErr == nil) {
				t.Fatalf("%v for the part, %v for a file of its own", err, otherErr)
			}
			if err == nil {
				if diff := cmp.Diff(unplaced(other), unplaced(table)); diff != "" {
					t.Errorf("(-file +part):\n%s", diff)
				}
			}
			if shared := whole(t, single); shared.All().SHA256() != part.SHA256() || shared.All().Bytes != part.Bytes {
				t.Error("a file of its own has another checksum or size")
			}
			sum, bytes = sum+part.Rows, bytes+part.Bytes
		}
		all := whole(t, text).All()
		if sum+unnamed != len(features) || all.Rows != len(features) || unnamed == 0 && bytes != all.Bytes {
			t.Errorf("%d rows of %d bytes in parts, %d of %d in all", sum, bytes, all.Rows, all.Bytes)
		}
	}
}

func TestReadPartOfFeaturesIsRead(t *testing.T) {
	features, _ := drawFeatures(rand.New(rand.NewPCG(7, 8)), 300)
	for _, features := range [][]string{features, {features[0], feature(at("1,99"), "{}")}, {feature("null", `{"n":1}`)}} {
		table, err := readBoth(t, collection(features...), Request{Response: "n", Kind: Count, Linear: []string{"z"}})
		if len(features) > 2 && err == nil {
			t.Errorf("%d rows without a height are kept", table.Len())
		}
		readBoth(t, collection(features...), Request{Response: "n", Kind: Count, Keep: []string{"z", "extra", "name"}})
		readBoth(t, collection(features...), Request{Response: "m", Kind: Count})
	}
}

// The checksum tells of everything that is read, and of nothing else.
func TestSHA256OfFeatures(t *testing.T) {
	sum := func(text string) string {
		part, ok := split(t, text, "d")["A"]
		if !ok {
			t.Fatalf("no part in %s", text)
		}
		return part.SHA256()
	}
	start := feature(at("1,2"), `{"d":"A","n":3.50}`)
	for name, text := range map[string]string{
		"blanks":                  "\n" + strings.ReplaceAll(start, ",", " , "),
		"order":                   `{"properties":{"n":3.50,"d":"A"},"geometry":{"coordinates":[1,2],"type":"Point"},"type":"Feature"}`,
		"a collection":            collection(start),
		"nothing said":            feature(at("1,2"), `{"d":"A","n":3.50,"more":null}`),
		"a row of another":        feature(at("5,6,7"), `{"other":1,"d":"B","n":1}`) + start,
		"numbers in other places": feature(at("1.0,2e0"), `{"d":"A","n":3.50}`),
	} {
		if sum(text) != sum(start) {
			t.Errorf("%s make a difference", name)
		}
	}
	seen := map[string]string{sum(start): "the start"}
	for name, text := range map[string]string{
		"place":      feature(at("1,3"), `{"d":"A","n":3.50}`),
		"height":     feature(at("1,2,0"), `{"d":"A","n":3.50}`),
		"value":      feature(at("1,2"), `{"d":"A","n":3.51}`),
		"name":       feature(at("1,2"), `{"d":"A","m":3.50}`),
		"property":   feature(at("1,2"), `{"d":"A","n":3.50,"m":1}`),
		"identifier": `{"id":1,` + start[1:],
		"kind":       feature(`{"type":"MultiPoint","coordinates":[[1,2]]}`, `{"d":"A","n":3.50}`),
		"no place":   feature("null", `{"d":"A","n":3.50}`),
		"bad place":  feature(at("1"), `{"d":"A","n":3.50}`),
		"rows":       start + start,
		"system":     `{"crs":{"properties":{"name":"EPSG:4326"}},` + start[1:],
	} {
		if before, again := seen[sum(text)]; again {
			t.Errorf("%s and %s are not told apart", name, before)
		}
		seen[sum(text)] = name
	}
}

func TestOnlyOfFeatures(t *testing.T) {
	shared := whole(t, feature(at("1,2,5"), `{"n":1}`)+"\n"+feature(at("3,4,5"), `{"n":2}`)+"\n"+feature(at("5,6,7"), `{"n":3}`))
	only := shared.All().Only([]int32{3, 1, 9, 3})
	got, err := ReadPart(only, measured("n"))
	if err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff([]int32{1, 3}, got.Row) + cmp.Diff([]int32{1, 3}, got.Line) + cmp.Diff([]orb.Geometry{orb.Point{1, 2}, orb.Point{5, 6}}, got.Geometry); diff != "" {
		t.Errorf("(-want +got):\n%s", diff)
	}
	if _, err := ReadPart(shared.All().Only(nil), measured("n")); message(err) == "" || err.Error() != "all.csv: none of its rows are left to read" {
		t.Errorf("of no rows: %v", err)
	}
	parts, _, err := shared.Split("z")
	if err != nil || len(parts) != 2 || parts[0].Name != "5" || parts[0].Rows != 2 {
		t.Errorf("by height: %+v, %v", parts, err)
	}
	_, _, err = shared.Split("m")
	if err == nil || err.Error() != `all.csv: no column "m" for the names of the regions` || hint(err) != `did you mean "n"? the columns are n, z` {
		t.Errorf("got %v (%s)", err, hint(err))
	}
	if _, _, err = shared.Split(""); err == nil || hint(err) != "the columns are n, z" {
		t.Errorf("got %v (%s)", err, hint(err))
	}
	if err := shared.All().Check(Request{Response: "n", Kind: Measure, X: "x", Y: "y"}); err == nil {
		t.Error("coordinate columns are taken for features")
	}
	if x, _ := got.XY(); math.Abs(x[1]-5) > 0 {
		t.Errorf("x is %v", x)
	}
}
