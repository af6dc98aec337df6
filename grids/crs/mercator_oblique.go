package crs

import "math"

// obliqueMercator is Mercator's projection of the conformal sphere along a great circle through the centre: Hotine's
// oblique Mercator (EPSG Guidance Note 7-2, methods 9815, variant B, with the false origin at the centre, and 9812,
// variant A, with it where the great circle crosses the sphere's equator). At an azimuth of 90 degrees it is the Swiss and
// the Hungarian projection (M. Rosenmund 1903). Here it is written with vectors on the sphere; Hotine's own formulas,
// which the Guidance Note prints, give the same plane.
type obliqueMercator struct {
	sphere     gaussSphere
	k0         float64
	sinα, cosα float64 // azimuth of the great circle
	sinγ, cosγ float64 // its bearing in the plane
	before     float64 // metres along it from the false origin to the centre
}

var _ projection = obliqueMercator{}

// newObliqueMercator takes, in degrees, the latitude of the centre, the azimuth of the great circle there and its
// bearing in the plane, and the scale on it.
func newObliqueMercator(el ellipsoid, lat0, azimuth, bearing, scale float64) obliqueMercator {
	m := obliqueMercator{sphere: newGaussSphere(el, lat0), k0: scale}
	m.sinα, m.cosα = sincosDegrees(azimuth)
	m.sinγ, m.cosγ = sincosDegrees(bearing)
	return m
}

// fromEquator puts the false origin where the great circle crosses the sphere's equator (variant A).
func (m obliqueMercator) fromEquator() obliqueMercator {
	m.before = m.k0 * m.sphere.radius * math.Atan2(m.sphere.sin0, m.sphere.cos0*m.cosα)
	return m
}

// frame gives three directions at right angles: to the centre, along the great circle, and to the right of it.
func (m obliqueMercator) frame() (centre, along, right vector) {
	up, east, north := m.sphere.origin()
	return up, north.times(m.cosα).plus(m.sinα, east), east.times(m.cosα).plus(-m.sinα, north)
}

func (m obliqueMercator) forward(λ, φ float64) (x, y float64) {
	at := m.sphere.forward(λ, φ)
	centre, along, right := m.frame()
	r := m.k0 * m.sphere.radius
	u := m.before + r*math.Atan2(at.dot(along), at.dot(centre))
	sine := at.dot(right)
	if !(math.Abs(sine) < 1-1e-12) { // within some metres of where the map has its poles
		return nowhere()
	}
	v := r * math.Atanh(sine)
	return v*m.cosγ + u*m.sinγ, u*m.cosγ - v*m.sinγ
}

// onSphere gives the place as a unit vector and the cosine of its distance from the great circle; NaN where there is
// none.
func (m obliqueMercator) onSphere(x, y float64) (at vector, cosine float64) {
	r := m.k0 * m.sphere.radius
	u, v := (x*m.sinγ+y*m.cosγ-m.before)/r, (x*m.cosγ-y*m.sinγ)/r
	if !(math.Abs(u) <= math.Pi*(1+1e-12) && math.Abs(v) < 14.5) {
		return vector{}, math.NaN()
	}
	centre, along, right := m.frame()
	sin, cos := math.Sincos(u)
	cosine = 1 / math.Cosh(v)
	return centre.times(cosine*cos).plus(cosine*sin, along).plus(math.Tanh(v), right), cosine
}

func (m obliqueMercator) inverse(x, y float64) (λ, φ float64) {
	at, cosine := m.onSphere(x, y)
	if math.IsNaN(cosine) {
		return nowhere()
	}
	return m.sphere.inverse(at)
}

func (m obliqueMercator) areaScale(x, y float64) float64 {
	at, cosine := m.onSphere(x, y)
	k := m.k0 / cosine * m.sphere.scale(at)
	return k * k
}
