package crs

import (
	"fmt"
	"math"
)

// mercatorReach is how far from the central meridian, in degrees of longitude, a transverse Mercator plane goes. The
// series is good to 0.2 mm there; at 80 degrees it would be 100 m off on the equator.
const mercatorReach = 65

// mercator is the transverse Mercator projection by Krueger's series to the sixth order in the third flattening, in the
// form of C. F. F. Karney (2011), Transverse Mercator with an accuracy of a few nanometers, J. Geodesy 85:475-485
// (equations 7 to 36; EPSG Guidance Note 7-2, method 9807). Coefficients of the series are written out from the paper.
type mercator struct {
	code   string
	series *krueger
	lon0   float64 // central meridian, degrees
	k0     float64 // scale on it
	fe, fn float64 // easting and northing where it crosses the equator
}

var _ System = mercator{}

// krueger holds the series of one ellipsoid.
type krueger struct {
	el          *ellipsoid
	radius      float64    // of the circle as long as the meridian
	alpha, beta [6]float64 // to the plane and back, multiples 2, 4, ... 12 of the angle
}

var wgs84Krueger = newKrueger(wgs84)

// NewUTM returns a zone of the universal transverse Mercator system on WGS 84, EPSG:32601 to EPSG:32660 in the north
// and EPSG:32701 to EPSG:32760 in the south. The plane may be used outside its zone: coordinates are good to a
// tenth of a micrometre within 45 degrees of the central meridian and to a millimetre within 65; places farther out have
// none (NaN). It is an error if zone is not in 1 to 60.
func NewUTM(zone int, south bool) (System, error) {
	if zone < 1 || zone > 60 {
		return nil, fmt.Errorf("UTM zone %d does not exist: zones are 1 to 60", zone)
	}
	m := mercator{
		code:   fmt.Sprintf("EPSG:%d", 32600+zone),
		series: wgs84Krueger,
		lon0:   float64(6*zone - 183),
		k0:     0.9996,
		fe:     500000,
	}
	if south {
		m.code, m.fn = fmt.Sprintf("EPSG:%d", 32700+zone), 10000000
	}
	return m, nil
}

func newKrueger(el *ellipsoid) *krueger {
	n := el.f / (2 - el.f)
	n2 := n * n
	return &krueger{
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

func (m mercator) Code() string { return m.code }

func (m mercator) Geographic() bool { return true }

func (m mercator) Forward(lon, lat float64) (x, y float64) {
	λ := wrap(lon - m.lon0)
	if !onGlobe(lon, lat) || math.Abs(λ) > mercatorReach {
		return math.NaN(), math.NaN()
	}
	ξ, η := m.series.toSphere(λ, lat)
	dξ, dη := m.series.shift(&m.series.alpha, ξ, η)
	r := m.k0 * m.series.radius
	return m.fe + r*(η+dη), m.fn + r*(ξ+dξ)
}

func (m mercator) Inverse(x, y float64) (lon, lat float64) {
	λ, φ := m.inverse(x, y)
	return wrap(m.lon0 + λ), φ
}

// inverse gives degrees east of the central meridian and latitude.
func (m mercator) inverse(x, y float64) (λ, φ float64) {
	r := m.k0 * m.series.radius
	ξ, η := (y-m.fn)/r, (x-m.fe)/r
	if !(math.Abs(ξ) < 2 && math.Abs(η) < 4) { // far off the plane; NaN too
		return math.NaN(), math.NaN()
	}
	dξ, dη := m.series.shift(&m.series.beta, ξ, η)
	ξ, η = ξ-dξ, η-dη
	sinξ, cosξ := math.Sincos(ξ)
	sinhη := math.Sinh(η)
	λ = degrees(math.Atan2(sinhη, cosξ))
	if math.Abs(λ) > mercatorReach+1e-9 { // the pole and what lies behind it included, but for the pole itself
		if math.Hypot(sinhη, cosξ) > 1e-13 {
			return math.NaN(), math.NaN()
		}
		λ = 0
	}
	τ := m.series.el.fromConformal(sinξ / math.Hypot(sinhη, cosξ))
	return λ, degrees(math.Atan(τ))
}

// AreaScale is the square of the point scale factor (Karney 2011, equations 23 to 25): the projection is conformal.
func (m mercator) AreaScale(x, y float64) float64 {
	λ, φ := m.inverse(x, y)
	if math.IsNaN(φ) {
		return math.NaN()
	}
	el := m.series.el
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

// conformal is the tangent of the conformal latitude from that of the geographic one.
func (el *ellipsoid) conformal(τ float64) float64 {
	h := math.Hypot(1, τ)
	σ := math.Sinh(el.e * math.Atanh(el.e*τ/h))
	return τ*math.Hypot(1, σ) - σ*h
}

// fromConformal is the inverse of conformal, by Newton's iteration (Karney 2011, equations 19 to 21).
func (el *ellipsoid) fromConformal(τc float64) float64 {
	τ := τc / (1 - el.e2)
	for range 8 {
		at := el.conformal(τ)
		step := (τc - at) * (1 + (1-el.e2)*τ*τ) / ((1 - el.e2) * math.Hypot(1, τ) * math.Hypot(1, at))
		τ += step
		if math.Abs(step) <= 1e-15*math.Abs(τ) {
			break
		}
	}
	return τ
}

// tangent of an angle in degrees, finite at the poles.
func tangent(d float64) float64 {
	sin, cos := sincosDegrees(d)
	return sin / math.Max(cos, 1e-17)
}
