package observe

import (
	"strings"
	"testing"
)

// Neither features nor geometries take more than 64 times the size of their text, however it is made up. What is packed
// counts as it is unpacked, which the size of the file bounds by itself.
func TestAllocationOfShapesIsBounded(t *testing.T) {
	const size = 1 << 17
	fill := func(start, with string) string { return start + strings.Repeat(with, (size-len(start))/len(with)) }
	deep := strings.Repeat("[", 60)
	list := func(start, with, end string) string {
		return start + strings.Repeat(with+",", (size-len(start)-len(end))/(len(with)+1)-1) + with + end
	}
	point := func(properties string) string { return feature(at("1,2"), properties) }
	for name, text := range map[string]string{
		"braces": fill("", "{"), "braces in members": fill(`{"type":`, `{"a":`), "separators": fill("", "\x1e"), "an open string": fill(`{"type":"`, "a"),
		"nested lists":   list(`{"type":"FeatureCollection","features":[`, feature("null", `{"z":`+deep+strings.Repeat("]", 60)+`}`), `]}`),
		"empty features": fill("", `{"type":"Feature"}`), "tiny points": fill("", `{"type":"Point","coordinates":[0,0]}`), "bad points": fill("", at("")), "worse points": fill("", at("[]")),
		"features": fill("", point(`{"z":1}`)), "features set aside": fill(point(`{"z":1}`), point(`{"z":"x"}`)+point(`{"z":2}`)), "levels of features": fill("", point(`{"z":1,"k":"a"}`)),
		"positions": list(`{"type":"MultiPoint","coordinates":[`, "[1,2]", `]}`), "polygons": list(`{"type":"MultiPolygon","coordinates":[`, "[[[0,0],[1,0],[1,1],[0,0]]]", `]}`),
		"no polygons": list(`{"type":"MultiPolygon","coordinates":[`, "[]", `]}`), "members": list(`{"type":"Feature","properties":{"z":1`, `,"z":1`, `}}`),
		"escapes": list(`{"type":"Feature","properties":{"z":"`, `\u0000`, `"}}`), "foreign": list(`{"type":"Feature","a":[`, `0`, `]}`),
		"column of points": fill("z,k\n", "1,POINT(1 2)\n"), "column of nothing": fill("z,k\n1,POINT(1 2)\n", "1,\n"), "column of announcements": fill("z,k\n", "1,0103000000FFFFFF7F\n1,POINT(1 2)\n"),
		"column of points in hex": fill("z,k\n", "1,0101000000000000000000F03F0000000000000040\n"), "one announcement": fill("z,k\n1,0106000000FFFFFF00", "0103000000FFFFFF00"),
		"one polygon": list("z,k\n1,\"POLYGON((", "1 2", "))\"\n"), "one multipolygon": list("z,k\n1,\"MULTIPOLYGON(", "((0 0,1 0,1 1,0 0))", ")\"\n"), "brackets": fill("z,k\n1,POLYGON", "("),
	} {
		want := Request{Response: "z", Kind: Measure}
		if strings.HasPrefix(text, "z,k") {
			want.Geometry = "k"
		}
		file := zipped(t, text)
		for way, read := range map[string]func(){
			"Read":       func() { _, _ = Read(strings.NewReader(text), "wells", want) },
			"packed":     func() { _, _ = Read(strings.NewReader(file), "wells", want) },
			"ReadSurvey": func() { _, _ = ReadSurvey(strings.NewReader(text), "wells", SurveyRequest{}) },
			"ReadPart": func() {
				if shared, err := Whole(strings.NewReader(text), "wells"); err == nil {
					_, _ = ReadPart(shared.All(), want)
				}
			},
		} {
			others := name == "empty features" || name == "one polygon" || name == "column of points"
			if way == "Read" || way == "ReadPart" || others {
				checkHeld(t, name+", "+way, len(text), read)
			}
		}
	}
}
