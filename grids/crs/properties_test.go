package crs

import (
	"math"
	"testing"
)

// everyKind has each projection at least once, with shifts and without, north and south.
var everyKind = []struct {
	code             string
	conformal, equal bool
	west, east       float64 // degrees from the central meridian that are tried
	south, north     float64
}{
	{"EPSG:32633", true, false, -40, 40, -88, 88},
	{"EPSG:27700", true, false, -8, 8, 45, 65},
	{"laea lon=8.5 lat=47.25", false, true, -120, 120, -30, 89.9},
	{"EPSG:6931", false, true, -180, 180, -70, 89.999},
	{"EPSG:6932", false, true, -180, 180, -89.999, 70},
	{"EPSG:3035", false, true, -50, 50, 10, 85},
	{"EPSG:3857", false, false, -180, 180, -88, 88},
	{"EPSG:3395", true, false, -180, 180, -88, 88},
	{"mercator; lon0=51; parallel=42; ellipsoid=Krassovsky1940", true, false, -180, 180, -88, 88},
	{"EPSG:6933", false, true, -180, 180, -86, 86},
	{"EPSG:2154", true, false, -179, 179, -50, 89.9},
	{"EPSG:27572", true, false, -20, 20, 20, 80},
	{"EPSG:31370", true, false, -20, 20, 20, 80},
	{"EPSG:7845", true, false, -179, 179, -89.9, 50},
	{"EPSG:5070", false, true, -179, 179, -80, 85},
	{"EPSG:3577", false, true, -179, 179, -85, 80},
	{"EPSG:28992", true, false, -60, 60, -20, 89},
	{"EPSG:3844", true, false, -60, 60, -20, 89},
	{"oblique-stereographic; lon0=20; lat0=-35; scale=0.9999", true, false, -100, 100, -89, 30},
	{"EPSG:32661", true, false, -180, 180, -60, 89.999},
	{"EPSG:3031", true, false, -180, 180, -89.999, 60},
	{"EPSG:3413", true, false, -180, 180, 0, 89.999},
	{"EPSG:2056", true, false, -40, 40, 10, 80},
	{"EPSG:23700", true, false, -40, 40, 10, 80},
	{"EPSG:3376", true, false, -30, 30, -40, 50},
	{"EPSG:3375", true, false, -30, 30, -40, 50},
	{"EPSG:5514", true, false, -40, 40, 0, 57},
}

// groundDegree gives the lengths in metres of a degree of longitude and of latitude on an ellipsoid (ν cos φ and ρ; for example
// Snyder 1987, equations 4-18 and 4-20, from memory).
func groundDegree(el ellipsoid, φ float64) (east, north float64) {
	s, c := math.Sincos(φ * math.Pi / 180)
	w := math.Sqrt(1 - el.e2*s*s)
	return el.a / w * c * math.Pi / 180, el.a * (1 - el.e2) / (w * w * w) * math.Pi / 180
}

// slopes are the derivatives of a map by central differences of the fourth order, per degree of longitude and latitude.
func slopes(forward func(lon, lat float64) (x, y float64), lon, lat, h float64) (xE, yE, xN, yN float64) {
	along := func(u, v float64) (float64, float64) {
		x1, y1 := forward(lon-2*h*u, lat-2*h*v)
		x2, y2 := forward(lon-h*u, lat-h*v)
		x3, y3 := forward(lon+h*u, lat+h*v)
		x4, y4 := forward(lon+2*h*u, lat+2*h*v)
		return (x1 - 8*x2 + 8*x3 - x4) / (12 * h), (y1 - 8*y2 + 8*y3 - y4) / (12 * h)
	}
	xE, yE = along(1, 0)
	xN, yN = along(0, 1)
	return xE, yE, xN, yN
}

func TestProperties(t *testing.T) {
	for _, k := range everyKind {
		t.Run(k.code, func(t *testing.T) {
			p := must(t, k.code).(plane)
			el := ownEllipsoid(t, p)
			worstBack, worstShape, worstArea := 0.0, 0.0, 0.0
			for i := range 13 {
				for j := range 12 {
					lon := p.lon0 + k.west + (k.east-k.west)*(float64(i)+0.01)/12.02
					lat := k.south + (k.north-k.south)*float64(j)/11
					x, y := p.Forward(lon, lat)
					lon2, lat2 := p.Inverse(x, y)
					back := math.Max(math.Abs(math.Remainder(lon2-lon, 360))*math.Cos(lat*math.Pi/180), math.Abs(lat2-lat))
					worstBack = math.Max(worstBack, back)
					if !(back < 1e-9) {
						t.Errorf("%v %v: back at %v %v", lon, lat, lon2, lat2)
					}
					if math.Abs(lat) > 85 || math.Abs(lon-p.lon0) > 178 { // differences would step over a pole or a slit
						continue
					}
					shape, area := distortion(p, el, lon, lat)
					worstArea = math.Max(worstArea, area)
					if k.conformal {
						worstShape = math.Max(worstShape, shape)
					}
					if x, y := p.projection.forward(lon-p.lon0, lat); k.equal && p.projection.areaScale(x, y) != 1 {
						t.Errorf("%v %v: area scale is not 1", lon, lat)
					}
				}
			}
			t.Logf("back %.2g degrees, shape %.2g, area %.2g", worstBack, worstShape, worstArea)
			if worstShape > 1e-9 || worstArea > 1e-9 {
				t.Errorf("shape %.3g, area %.3g, want below 1e-9", worstShape, worstArea)
			}
		})
	}
}

// distortion gives, relative to the scale, how far the map is from conformal on its own ellipsoid, and how far AreaScale
// is from the Jacobian over the ground of WGS 84, shift included.
func distortion(p plane, el ellipsoid, lon, lat float64) (shape, area float64) {
	const h = 2e-2
	xE, yE, xN, yN := slopes(p.projection.forward, wrap(lon-p.lon0), lat, h)
	e, n := groundDegree(el, lat)
	scale := math.Hypot(xN/n, yN/n)
	shape = math.Hypot(xE/e-yN/n, yE/e+xN/n) / scale
	xE, yE, xN, yN = slopes(p.Forward, lon, lat, h)
	ground := wgs84
	if !p.shift.on {
		ground = el
	}
	e, n = groundDegree(ground, lat)
	x, y := p.Forward(lon, lat)
	return shape, math.Abs((xE*yN-yE*xN)/(e*n)/p.AreaScale(x, y) - 1)
}

func ownEllipsoid(t *testing.T, p plane) ellipsoid {
	t.Helper()
	switch s := p.projection.(type) {
	case transverseMercator:
		return s.series.el
	case azimuthal:
		return s.el
	case mercator:
		return s.el
	case webMercator:
		return s.el
	case cylindrical:
		return s.el
	case conformalConic:
		return s.el
	case albers:
		return s.el
	case polarStereographic:
		return s.el
	case obliqueStereographic:
		return s.sphere.el
	case obliqueMercator:
		return s.sphere.el
	case obliqueConic:
		return s.sphere.el
	}
	t.Fatalf("no ellipsoid for %T", p.projection)
	return ellipsoid{}
}

// ground is the area element of WGS 84 per square degree.
func ground(φ float64) float64 {
	e, n := groundDegree(wgs84, φ)
	return e * n
}

// simpson integrates over latitude in degrees.
func simpson(f func(φ float64) float64, from, to float64, pieces int) float64 {
	h := (to - from) / float64(2*pieces)
	sum := f(from) + f(to)
	for i := 1; i < 2*pieces; i++ {
		sum += f(from+float64(i)*h) * float64(2+2*(i%2))
	}
	return sum * h / 3
}

// Formulas in closed form against integrals over the ellipsoid: the meridian arc, the isometric latitude, and the area
// from the equator to a latitude.
func TestAgainstIntegrals(t *testing.T) {
	utm, mercator, cylinder := must(t, "EPSG:32631"), must(t, "EPSG:3395"), must(t, "cylindrical-equal-area; lon0=0")
	for _, φ := range []float64{-85, -41, 0.5, 23, 52, 80} {
		arc := simpson(func(φ float64) float64 { _, n := groundDegree(wgs84, φ); return n }, 0, φ, 2000)
		stretched := simpson(func(φ float64) float64 {
			e, n := groundDegree(wgs84, φ)
			return n / e * wgs84.a * math.Pi / 180
		}, 0, φ, 20000)
		area := simpson(ground, 0, φ, 2000) / (wgs84.a * math.Pi / 180)
		for _, c := range []struct {
			s    System
			lon  float64
			want float64
		}{{utm, 3, 0.9996 * arc}, {mercator, 0, stretched}, {cylinder, 0, area}} {
			if _, y := c.s.Forward(c.lon, φ); !(math.Abs(y-c.want) < 1e-6) {
				t.Errorf("%s at %v: northing %.7f, by quadrature %.7f", c.s.Code(), φ, y, c.want)
			}
		}
	}
}

// Anything at all gives a place or NaN twice, and never half of it; what Forward refuses, AreaScale has no number for.
func TestNoHalfPlaces(t *testing.T) {
	odd := []float64{0, math.NaN(), math.Inf(1), math.Inf(-1), 1e300, -1e300, 1e9, -3e7, 2.1e7, 90, -90, 180, -180, 360, 1e-320}
	for _, k := range everyKind {
		s := must(t, k.code)
		for _, a := range odd {
			for _, b := range odd {
				x, y := s.Forward(a, b)
				lon, lat := s.Inverse(a, b)
				if math.IsNaN(x) != math.IsNaN(y) || math.IsNaN(lon) != math.IsNaN(lat) || math.IsInf(x, 0) || math.IsInf(y, 0) {
					t.Errorf("%s at %v %v: %v %v and %v %v", k.code, a, b, x, y, lon, lat)
				}
				if math.Abs(lon) > 180 || math.Abs(lat) > 90 || math.IsNaN(lat) && !math.IsNaN(s.AreaScale(a, b)) {
					t.Errorf("%s at %v %v: %v %v, area scale %v", k.code, a, b, lon, lat, s.AreaScale(a, b))
				}
			}
		}
	}
}

// A longitude may be counted from 0 to 360.
func TestFullTurn(t *testing.T) {
	for _, k := range everyKind {
		p := must(t, k.code)
		lon, lat := p.(plane).lon0+5, (k.south+k.north)/2
		if lon > 0 {
			lon -= 360
		}
		x1, y1 := p.Forward(lon, lat)
		x2, y2 := p.Forward(lon+360, lat)
		if !(math.Hypot(x1-x2, y1-y2) < 1e-6) {
			t.Errorf("%s: %v %v and %v %v", k.code, x1, y1, x2, y2)
		}
	}
}
