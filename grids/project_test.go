package grids

import (
	"math"
	"reflect"
	"slices"
	"testing"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// toSegment is the distance from p to the segment a b.
func toSegment(p, a, b orb.Point) float64 {
	dx, dy := b[0]-a[0], b[1]-a[1]
	u := ((p[0]-a[0])*dx + (p[1]-a[1])*dy) / (dx*dx + dy*dy)
	u = math.Max(0, math.Min(1, u))
	return math.Hypot(p[0]-a[0]-u*dx, p[1]-a[1]-u*dy)
}

// Every point of an edge in degrees lies within a centimetre of what is drawn, which is what the doc comment promises.
func TestProjectedEdgesStayClose(t *testing.T) {
	for _, code := range []string{"laea lon=8.5 lat=47.25", "EPSG:32633", "laea lon=179 lat=-17"} {
		sys := system(t, code)
		for _, edge := range []orb.LineString{
			{{6, 46}, {11, 46}}, {{6, 46}, {6, 49}}, {{6, 46}, {11, 49}}, {{14.9999, 50}, {15, 50}}, {{-10, -20}, {40, 20}},
		} {
			if sys.Code() == "laea lon=179 lat=-17" {
				for v := range edge {
					edge[v][0] += 170
				}
			}
			g, err := ProjectGeometry(edge, sys)
			if err != nil {
				t.Fatal(err)
			}
			drawn := g.(orb.LineString)
			worst := 0.0
			const steps = 500
			for i := range steps + 1 {
				u := float64(i) / steps
				x, y := sys.Forward(edge[0][0]+u*(edge[1][0]-edge[0][0]), edge[0][1]+u*(edge[1][1]-edge[0][1]))
				best := math.Inf(1)
				for v := 1; v < len(drawn); v++ {
					best = math.Min(best, toSegment(orb.Point{x, y}, drawn[v-1], drawn[v]))
				}
				worst = math.Max(worst, best)
			}
			if !(worst <= 0.0101) {
				t.Errorf("%s, %v: %d vertices, %.3g m off", code, edge, len(drawn), worst)
			}
		}
	}
}

// Two neighbours draw their common edge in opposite directions and must get the same vertices.
func TestProjectedEdgesAreShared(t *testing.T) {
	sys := system(t, "laea lon=8.5 lat=47.25")
	there, err1 := ProjectGeometry(orb.LineString{{6, 46}, {11.3, 48.7}}, sys)
	back, err2 := ProjectGeometry(orb.LineString{{11.3, 48.7}, {6, 46}}, sys)
	if err1 != nil || err2 != nil {
		t.Fatal(err1, err2)
	}
	a, b := there.(orb.LineString), back.(orb.LineString)
	slices.Reverse(b)
	if len(a) < 10 || !slices.Equal(a, b) {
		t.Errorf("%d and %d vertices", len(a), len(b))
	}
}

func TestProjectEveryKind(t *testing.T) {
	sys := system(t, "laea lon=0 lat=0")
	for _, g := range append(slices.Clone(orb.AllGeometries), orb.Collection{nil, orb.Point{1, 2}}) {
		got, err := ProjectGeometry(g, sys)
		if err != nil {
			t.Errorf("%T %v: %v", g, g, err)
			continue
		}
		want := reflect.TypeOf(g)
		if _, ok := g.(orb.Bound); ok {
			want = reflect.TypeOf(orb.Polygon{})
		}
		if reflect.TypeOf(got) != want {
			t.Errorf("%T became %T", g, got)
		}
	}
	square := box(0, 0, 1e-5, 1e-5)
	kept := square.Clone()
	g, err := ProjectGeometry(orb.Collection{square, square[0], square.Bound(), orb.MultiPoint{{1e-5, 0}}}, sys)
	if err != nil {
		t.Fatal(err)
	}
	c := g.(orb.Collection)
	ring := c[1].(orb.Ring)
	if !slices.Equal(c[0].(orb.Polygon)[0], ring) || len(ring) != 5 || ring[0] != ring[4] || c[3].(orb.MultiPoint)[0] != ring[1] {
		t.Errorf("%v", c)
	}
	// a metre is about 1/111320 degree of the equator (6378137 m x pi/180)
	if !near(ring[1][0], 1e-5*6378137*math.Pi/180, 1e-9) {
		t.Errorf("%v", ring[1])
	}
	if !slices.Equal(square[0], kept[0]) {
		t.Error("the argument was changed")
	}
}

func TestProjectRefusals(t *testing.T) {
	if g, err := ProjectGeometry(orb.Point{1, 2}, crs.Local{}); err == nil || g != nil {
		t.Errorf("local: %v, %v", g, err)
	}
	sys := system(t, "EPSG:32633")
	for _, g := range []orb.Geometry{
		orb.Point{math.NaN(), 1}, orb.Point{15, 91}, orb.LineString{{15, 1}, {math.Inf(1), 1}}, orb.LineString{{15, 1}, {100, 1}},
		orb.MultiPolygon{box(14, 50, 5e5, 51)}, orb.Collection{orb.MultiPoint{{0, 0}, {500000, 5e6}}},
	} {
		if got, err := ProjectGeometry(g, sys); err == nil || got != nil {
			t.Errorf("%v: %v", g, got)
		}
	}
}
