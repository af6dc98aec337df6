package crs

import (
	"fmt"
	"math"
)

// mercatorReach is how far from the central meridian, in degrees of longitude, a transverse Mercator plane goes. The
// series is good to 0.2 mm there; at 80 degrees it would be 100 m off on the equator.
const mercatorReach = 65

// transverseMercator is the transverse Mercator projection by Krueger's series to the sixth order in the third flattening, in the
// form of C. F. F. Karney (2011), Transverse Mercator with an accuracy of a few nanometers, J. Geodesy 85:475-485
// (equations 7 to 36; EPSG Guidance Note 7-2, method 9807). Coefficients of the series are written out from the paper.
type transverseMercator struct {
	series krueger
	k0     float64 // scale on the central meridian
	south  float64 // metres on it from the equator to the origin
}

var _ projection = transverseMercator{}

// krueger holds the series of one ellipsoid.
type krueger struct {
	el          ellipsoid
	radius      float64    // of the circle as long as the meridian
	alpha, beta [6]float64 // to the plane and back, multiples 2, 4, ... 12 of the angle
}

// newTransverseMercator takes the latitude of the origin in degrees and the scale on the central meridian.
func newTransverseMercator(el ellipsoid, lat0, scale float64) transverseMercator {
	m := transverseMercator{series: newKrueger(el), k0: scale}
	if lat0 != 0 {
		_, m.south = m.forward(0, lat0)
	}
	return m
}

// NewUTM returns a zone of the universal transverse Mercator system on WGS 84, EPSG:32601 to EPSG:32660 in the north
// and EPSG:32701 to EPSG:32760 in the south. The plane may be used outside its zone: coordinates are good to a
// tenth of a micrometre within 45 degrees of the central meridian and to a millimetre within 65; places farther out have
// none (NaN). It is an error if zone is not in 1 to 60.
func NewUTM(zone int, south bool) (System, error) {
	if zone < 1 || zone > 60 {
		return nil, fmt.Errorf("UTM zone %d does not exist: zones are 1 to 60", zone)
	}
	code, north := 32600+zone, 0.0
	if south {
		code, north = 32700+zone, 10000000
	}
	return plane{
		code:       fmt.Sprintf("EPSG:%d", code),
		projection: newTransverseMercator(wgs84, 0, 0.9996),
		lon0:       float64(6*zone - 183),
		east:       500000,
		north:      north,
	}, nil
}

func newKrueger(el ellipsoid) krueger {
	n := el.f / (2 - el.f)
	n2 := n * n
	return krueger{
		el:     el,
		radius: el.a / (1 + n) * (1 + n2*(1./4+n2*(1./64+n2/256))),
		alpha: [6]float64{
			polynomial(n, 1, 1./2, -2./3, 5./16, 41./180, -127./288, 7891./37800),
			polynomial(n, 2, 13./48, -3./5, 557./1440, 281./630, -1983433./1935360),
			polynomial(n, 3, 61./240, -103./140, 15061./26880, 167603./181440),
			polynomial(n, 4, 49561./161280, -179./168, 6601661./7257600),
			polynomial(n, 5, 34729./80640, -3418889./1995840),
			polynomial(n, 6, 212378941./319334400),
		},
		beta: [6]float64{
			polynomial(n, 1, 1./2, -2./3, 37./96, -1./360, -81./512, 96199./604800),
			polynomial(n, 2, 1./48, 1./15, -437./1440, 46./105, -1118711./3870720),
			polynomial(n, 3, 17./480, -37./840, -209./4480, 5569./90720),
			polynomial(n, 4, 4397./161280, -11./504, -830251./7257600),
			polynomial(n, 5, 4583./161280, -108847./3991680),
			polynomial(n, 6, 20648693./638668800),
		},
	}
}

// polynomial is c[0] n^first + c[1] n^(first+1) + ...
func polynomial(n float64, first int, c ...float64) float64 {
	sum := 0.0
	for i := len(c) - 1; i >= 0; i-- {
		sum = sum*n + c[i]
	}
	for range first {
		sum *= n
	}
	return sum
}

func (m transverseMercator) forward(λ, φ float64) (x, y float64) {
	if !(math.Abs(λ) <= mercatorReach) {
		return nowhere()
	}
	ξ, η := m.series.toSphere(λ, φ)
	dξ, dη := m.series.shift(&m.series.alpha, ξ, η)
	r := m.k0 * m.series.radius
	return r * (η + dη), r*(ξ+dξ) - m.south
}

func (m transverseMercator) inverse(x, y float64) (λ, φ float64) {
	r := m.k0 * m.series.radius
	ξ, η := (y+m.south)/r, x/r
	if !(math.Abs(ξ) < 2 && math.Abs(η) < 4) { // far off the plane; NaN too
		return nowhere()
	}
	dξ, dη := m.series.shift(&m.series.beta, ξ, η)
	ξ, η = ξ-dξ, η-dη
	sinξ, cosξ := math.Sincos(ξ)
	sinhη := math.Sinh(η)
	λ = degrees(math.Atan2(sinhη, cosξ))
	if math.Abs(λ) > mercatorReach+1e-9 { // the pole and what lies behind it included, but for the pole itself
		if math.Hypot(sinhη, cosξ) > 1e-13 {
			return nowhere()
		}
		λ = 0
	}
	τ := m.series.el.fromConformal(sinξ / math.Hypot(sinhη, cosξ))
	return λ, degrees(math.Atan(τ))
}

// areaScale is the square of the point scale factor (Karney 2011, equations 23 to 25): the projection is conformal.
func (m transverseMercator) areaScale(x, y float64) float64 {
	λ, φ := m.inverse(x, y)
	if math.IsNaN(φ) {
		return math.NaN()
	}
	el := &m.series.el
	ξ, η := m.series.toSphere(λ, φ)
	p, q := 1.0, 0.0
	for j, a := range m.series.alpha {
		w := float64(2 * (j + 1))
		s, c := math.Sincos(w * ξ)
		p += w * a * c * math.Cosh(w*η)
		q += w * a * s * math.Sinh(w*η)
	}
	τ := tangent(φ)
	τc := el.conformal(τ)
	sinφ, _ := sincosDegrees(φ)
	_, cosλ := sincosDegrees(λ)
	k := m.k0 * m.series.radius / el.a * math.Hypot(p, q) *
		math.Sqrt(1-el.e2*sinφ*sinφ) * math.Hypot(1, τ) / math.Hypot(τc, cosλ)
	return k * k
}

// toSphere gives the transverse Mercator coordinates of the conformal sphere, of radius one.
func (s *krueger) toSphere(λ, φ float64) (ξ, η float64) {
	τ := s.el.conformal(tangent(φ))
	sinλ, cosλ := sincosDegrees(λ)
	return math.Atan2(τ, cosλ), math.Asinh(sinλ / math.Hypot(τ, cosλ))
}

// shift sums one of the two series.
func (s *krueger) shift(c *[6]float64, ξ, η float64) (dξ, dη float64) {
	for j, a := range c {
		w := float64(2 * (j + 1))
		sin, cos := math.Sincos(w * ξ)
		dξ += a * sin * math.Cosh(w*η)
		dη += a * cos * math.Sinh(w*η)
	}
	return dξ, dη
}
