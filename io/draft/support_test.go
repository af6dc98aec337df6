package draft_test

import (
	"bytes"
	"fmt"
	"math"
	"reflect"
	"testing"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/chart"
	"drumlin/io/draft"
)

func system(t testing.TB, code string) crs.System {
	t.Helper()
	s, err := crs.Parse(code)
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// masked is a lattice of 7 x 5 cells from which a corner is missing.
func masked(t testing.TB) grids.Lattice {
	l := grids.Lattice{CRS: system(t, "laea lon=-38.5 lat=47.25"), X0: -1234.567, Y0: 98.7, Cell: 1.0 / 3, NX: 7, NY: 5}
	l.Mask = make([]bool, l.Cells())
	for k := range l.Mask {
		l.Mask[k] = k%7+k/7 > 2
	}
	return l
}

func column(n int, f func(k float64) float64) []float64 {
	v := make([]float64, n)
	for k := range v {
		v[k] = f(float64(k))
	}
	return v
}

// full is a draft on a lattice with everything in it; places and numbers are invented.
func full(t testing.TB) draft.Draft {
	l := masked(t)
	cells, x, y := l.Centres()
	l.Mask = nil
	n := len(cells)
	d := draft.Draft{Response: "stems <é>", Unit: "stems per ha", Factor: 1e4 / 3, Ratio: true, Spread: draft.Variation,
		Threshold: new(0.30000000000000004), Reference: 1.0 / 7,
		Title: "Stems in \"Harrow\" valley", Subtitle: "adjusted to depth = 12.5", Stamp: "NOT FOR USE: convergence",
		Foot: []string{"A caution.", ""}, Lattice: l, X: x, Y: y,
		Estimate:      column(n, func(k float64) float64 { return math.Exp(math.Sin(k)) }),
		StandardError: column(n, func(k float64) float64 { return 0.1 + 0.01*k }),
		Lower:         column(n, func(k float64) float64 { return -k }),
		Upper:         column(n, func(k float64) float64 { return math.Sqrt(k) }),
		CV:            column(n, func(k float64) float64 { return 0.2 + 0.001*k*k }),
		Nearest:       column(n, func(k float64) float64 { return 1 / k }),
		Chance:        column(n, func(k float64) float64 { return k / float64(n) }),
		Relative:      column(n, func(k float64) float64 { return math.Exp(math.Cos(k)) }),
		RelativeLower: column(n, func(k float64) float64 { return 0.5 + k }),
		RelativeUpper: column(n, func(k float64) float64 { return 1.5 + k }),
		Outline:       orb.MultiPolygon{{{{0, 0}, {1.0 / 3, 0}, {0, 5e-324}, {0, 0}}, {}}, nil},
		Zones: []chart.Zone{{Name: "Pellworm", Area: orb.MultiPolygon{{{{-1234, 99}, {-1233, 99}, {-1233, 100}, {-1234, 99}}}}},
			{Name: ""}, {Name: "Mere", Area: orb.MultiPolygon{}}, {Name: "Tavish", Area: orb.MultiPolygon{{nil}}}},
		PlaceX: []float64{-1234, -1233.5, -1233.25}, PlaceY: []float64{99, 99.5, math.Copysign(0, -1)},
		ShapeOf: shapes(), ShapeName: []string{"Mere", "", "Path", "Paths", "Well", "Wells <é>"},
		ShapeEstimate: []float64{1.0 / 3, 2, math.NaN(), 5e-324, math.Copysign(0, -1), 7}, ShapeRelative: []float64{0.1, 0.5, 1, math.Inf(1), 2, 3}}
	for _, c := range cells {
		d.Cells = append(d.Cells, int32(c))
	}
	d.CV[2], d.Lower[0] = math.Float64frombits(0x7ff8_0000_0000_0123), math.Inf(-1)
	return d
}

// shapes are places of every kind, some of them in parts; the last ends with a ring.
func shapes() []orb.Geometry {
	ring := orb.Ring{{-1234, 99}, {-1233, 99}, {-1233, 1.0 / 3}, {-1234, 99}}
	return []orb.Geometry{
		orb.Polygon{ring, {{-1233.5, 98}, {-1233.25, 98}, {-1233.5, 97}, {-1233.5, 98}}},
		orb.LineString{{-1234, 99}, {-1233, math.Copysign(0, -1)}},
		orb.MultiLineString{{{-1234, 99}, {-1233, 100}}, {{5e-324, 1}}},
		orb.Point{-1233.1, 99.9},
		orb.MultiPoint{{-1233.2, 99.1}, {1.0 / 7, 2}},
		orb.MultiPolygon{{ring}, {ring[1:]}},
	}
}

// hollow are shapes without vertices, which are stored like any other.
func hollow() []orb.Geometry {
	return []orb.Geometry{orb.Polygon(nil), orb.Polygon{}, orb.Polygon{nil, {}}, orb.MultiPolygon(nil), orb.MultiPolygon{}, orb.MultiPolygon{nil, {}, {nil}},
		orb.LineString(nil), orb.LineString{}, orb.MultiLineString(nil), orb.MultiLineString{}, orb.MultiLineString{nil, {}}, orb.MultiPoint(nil), orb.MultiPoint{},
		orb.Point{math.NaN(), math.Inf(-1)}}
}

// own is a draft at places of the user's own, without anything that may be left out.
func own(t testing.TB) draft.Draft {
	v := []float64{3, 1, 2, math.NaN()}
	return draft.Draft{Response: "zinc", Unit: "mg/kg", Factor: 1, Spread: draft.StandardError, Title: "zinc",
		Lattice: grids.Lattice{CRS: system(t, "EPSG:32633")}, X: []float64{1, 2, 3, 2}, Y: []float64{5, 5, 6, 7},
		Estimate: v, StandardError: []float64{0.1, 0.2, 0.3, math.NaN()}, Lower: v, Upper: v, CV: v, Nearest: v}
}

func drafts(t testing.TB) map[string]draft.Draft {
	bare := draft.Draft{Spread: draft.Variation, Lattice: grids.Lattice{Cell: 1, NX: 1, NY: 2}, Cells: []int32{},
		X: []float64{}, Y: []float64{}, Estimate: []float64{}, StandardError: []float64{}, Lower: []float64{}, Upper: []float64{}, CV: []float64{}, Nearest: []float64{},
		Foot: []string{}, Outline: orb.MultiPolygon{}, Zones: []chart.Zone{}, PlaceX: []float64{}, PlaceY: []float64{}}
	moved := full(t)
	moved.X[3] = math.Nextafter(moved.X[3], 0)
	moved.Outline[0][0][1] = orb.Point{math.NaN(), math.Copysign(0, -1)}
	local := full(t)
	local.Lattice.CRS = system(t, "local")
	odd := own(t)
	odd.ShapeOf, odd.ShapeEstimate = hollow(), make([]float64, len(hollow()))
	none := own(t)
	none.ShapeOf, none.ShapeEstimate, none.ShapeRelative, none.ShapeName = []orb.Geometry{}, []float64{}, []float64{}, []string{}
	return map[string]draft.Draft{"shapes without vertices": odd, "no shapes": none, "full": full(t), "own places": own(t), "no cells and no system": bare, "a place off its centre": moved, "local": local}
}

// exactly compares to the bit: NaN equals itself, 0 is not -0, and nil is not the same as empty.
var exactly = []cmp.Option{
	cmp.Transformer("plain", plain), // without the Equal of shapes, which is not exact
	cmp.Comparer(func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }),
	cmp.Exporter(func(reflect.Type) bool { return true }),
}

// A plainShape is a geometry without methods.
type plainShape struct {
	Kind  string
	Parts [][][][2]float64
}

func plain(g orb.Geometry) plainShape {
	s := plainShape{Kind: fmt.Sprintf("%T", g)}
	switch g := g.(type) {
	case orb.Point:
		s.Parts = [][][][2]float64{{{g}}}
	case orb.MultiPoint:
		s.Parts = [][][][2]float64{{plainly(g)}}
	case orb.LineString:
		s.Parts = [][][][2]float64{{plainly(g)}}
	case orb.Ring:
		s.Parts = [][][][2]float64{{plainly(g)}}
	case orb.MultiLineString:
		s.Parts = [][][][2]float64{each(g, plainly[orb.LineString])}
	case orb.Polygon:
		s.Parts = [][][][2]float64{each(g, plainly[orb.Ring])}
	case orb.MultiPolygon:
		s.Parts = each(g, func(p orb.Polygon) [][][2]float64 { return each(p, plainly[orb.Ring]) })
	}
	return s
}

func plainly[S ~[]orb.Point](points S) [][2]float64 {
	return each(points, func(p orb.Point) [2]float64 { return p })
}

// each is the slice of what f makes of each element; nil for nil.
func each[S ~[]T, T, U any](all S, f func(T) U) []U {
	if all == nil {
		return nil
	}
	out := make([]U, len(all))
	for i, v := range all {
		out[i] = f(v)
	}
	return out
}

func write(t testing.TB, d draft.Draft) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := draft.Write(&b, d); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func read(t testing.TB, raw []byte) draft.Draft {
	t.Helper()
	d, err := draft.Read(bytes.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	return d
}
