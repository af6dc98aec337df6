package crs

import (
	"errors"
	"fmt"
	"math"
	"strconv"
)

// azimuthal is the Lambert azimuthal equal-area projection on an ellipsoid, oblique, equatorial or polar alike (EPSG
// Guidance Note 7-2, method 9820): the centre is (0, 0).
type azimuthal struct {
	el           ellipsoid
	lat0         float64 // degrees
	sinβ0, cosβ0 float64
	radius       float64 // authalic radius
	d            float64 // keeps the scale true at the centre in both directions
}

var _ projection = azimuthal{}

// NewAzimuthalEqualArea returns the Lambert azimuthal equal-area plane on WGS 84 centred at longitude lon0 and latitude
// lat0 in degrees, where x = y = 0. Areas in it are true everywhere; only the point opposite the centre is missing. Its
// code spells the centre out: "laea lon=8.5 lat=47.25". It is an error if the centre is not a place on the globe.
func NewAzimuthalEqualArea(lon0, lat0 float64) (System, error) {
	if !onGlobe(lon0, lat0) {
		return nil, fmt.Errorf("centre of the plane: longitude %v, latitude %v is not a place on the globe", lon0, lat0)
	}
	lon0, lat0 = wrap(lon0), lat0+0
	code := "laea lon=" + strconv.FormatFloat(lon0, 'f', -1, 64) + " lat=" + strconv.FormatFloat(lat0, 'f', -1, 64)
	return plane{code: code, projection: newAzimuthal(wgs84, lat0), lon0: lon0}, nil
}

// AzimuthalAround returns the azimuthal equal-area plane for a set of places: its centre is the mean of their unit
// vectors, rounded to six decimals so that the code says it exactly. Longitude and latitude are in degrees; places that
// are not on the globe (NaN too) are passed over. It is an error if none is left or if they surround the globe so
// evenly that they have no middle. AzimuthalAround panics if the lengths differ.
func AzimuthalAround(lon, lat []float64) (System, error) {
	if len(lon) != len(lat) {
		panic("crs: longitudes and latitudes differ in number")
	}
	var sx, sy, sz float64
	n := 0
	for i := range lon {
		if !onGlobe(lon[i], lat[i]) {
			continue
		}
		sinλ, cosλ := sincosDegrees(lon[i])
		sinφ, cosφ := sincosDegrees(lat[i])
		sx, sy, sz = sx+cosφ*cosλ, sy+cosφ*sinλ, sz+sinφ
		n++
	}
	if n == 0 {
		return nil, errors.New("no centre for the plane: no place with a longitude and a latitude")
	}
	across := math.Hypot(sx, sy)
	if math.Hypot(across, sz) < 1e-6*float64(n) {
		return nil, errors.New("no centre for the plane: the places lie all around the globe")
	}
	return NewAzimuthalEqualArea(round6(degrees(math.Atan2(sy, sx))), round6(degrees(math.Atan2(sz, across))))
}

func newAzimuthal(el ellipsoid, lat0 float64) azimuthal {
	p := azimuthal{el: el, lat0: lat0, radius: el.a * math.Sqrt(el.qp/2), d: 1}
	sinφ, cosφ := sincosDegrees(lat0)
	p.sinβ0, p.cosβ0 = el.authalic(sinφ, cosφ)
	if p.cosβ0 > 0 {
		p.d = el.a * cosφ / (math.Sqrt(1-el.e2*sinφ*sinφ) * p.radius * p.cosβ0)
	}
	return p
}

func (p azimuthal) forward(λ, φ float64) (x, y float64) {
	sinλ, cosλ := sincosDegrees(λ)
	sinβ, cosβ := p.el.authalic(sincosDegrees(φ))
	up := p.sinβ0*sinβ + p.cosβ0*cosβ*cosλ // cosine of the distance from the centre
	if 1+up < 1e-12 {
		return nowhere() // within some metres of the point opposite, which has no image
	}
	b := p.radius * math.Sqrt(2/(1+up))
	return b * p.d * cosβ * sinλ, b / p.d * (p.cosβ0*sinβ - p.sinβ0*cosβ*cosλ)
}

// fromCentre is the sine of half the distance from the centre, seen from the globe's middle.
func (p azimuthal) fromCentre(x, y float64) float64 { return math.Hypot(x/p.d, y*p.d) / (2 * p.radius) }

func (p azimuthal) inverse(x, y float64) (λ, φ float64) {
	r := p.fromCentre(x, y)
	if !(r < 1) {
		return nowhere()
	}
	up := 1 - 2*r*r
	k := math.Sqrt(1-r*r) / p.radius
	east, north := k*x/p.d, k*y*p.d
	// the place as a unit vector: out of the equator at the central meridian, east of that, and towards the pole
	out, pole := up*p.cosβ0-north*p.sinβ0, up*p.sinβ0+north*p.cosβ0
	φ = degrees(p.el.fromAuthalic(pole, math.Hypot(out, east)))
	return degrees(math.Atan2(east, out)), math.Max(-90, math.Min(90, φ))
}

func (p azimuthal) areaScale(x, y float64) float64 {
	if !(p.fromCentre(x, y) < 1) {
		return math.NaN()
	}
	return 1
}

func round6(v float64) float64 { return math.Round(v*1e6)/1e6 + 0 }
