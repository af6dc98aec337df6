package crs

import (
	"errors"
	"fmt"
	"math"
	"strconv"
)

// azimuthal is the Lambert azimuthal equal-area projection on an ellipsoid, oblique, equatorial or polar alike (EPSG
// Guidance Note 7-2, method 9820), without false origin: the centre is (0, 0).
type azimuthal struct {
	el           *ellipsoid
	lon0, lat0   float64 // degrees; lon0 in -180 .. 180
	sinβ0, cosβ0 float64
	radius       float64 // authalic radius
	d            float64 // keeps the scale true at the centre in both directions
}

var _ System = azimuthal{}

// NewAzimuthalEqualArea returns the Lambert azimuthal equal-area plane on WGS 84 centred at longitude lon0 and latitude
// lat0 in degrees, where x = y = 0. Areas in it are true everywhere; only the point opposite the centre is missing. Its
// code spells the centre out: "laea lon=8.5 lat=47.25". It is an error if the centre is not a place on the globe.
func NewAzimuthalEqualArea(lon0, lat0 float64) (System, error) {
	if !onGlobe(lon0, lat0) {
		return nil, fmt.Errorf("centre of the plane: longitude %v, latitude %v is not a place on the globe", lon0, lat0)
	}
	return newAzimuthal(wgs84, lon0, lat0), nil
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

func newAzimuthal(el *ellipsoid, lon0, lat0 float64) azimuthal {
	p := azimuthal{el: el, lon0: wrap(lon0), lat0: lat0 + 0, radius: el.a * math.Sqrt(el.qp/2), d: 1}
	sinφ, cosφ := sincosDegrees(lat0)
	p.sinβ0, p.cosβ0 = el.authalic(sinφ, cosφ)
	if p.cosβ0 > 0 {
		p.d = el.a * cosφ / (math.Sqrt(1-el.e2*sinφ*sinφ) * p.radius * p.cosβ0)
	}
	return p
}

func (p azimuthal) Code() string {
	return "laea lon=" + strconv.FormatFloat(p.lon0, 'f', -1, 64) + " lat=" + strconv.FormatFloat(p.lat0, 'f', -1, 64)
}

func (p azimuthal) Geographic() bool { return true }

func (p azimuthal) Forward(lon, lat float64) (x, y float64) {
	if !onGlobe(lon, lat) {
		return math.NaN(), math.NaN()
	}
	sinλ, cosλ := sincosDegrees(wrap(lon - p.lon0))
	sinβ, cosβ := p.el.authalic(sincosDegrees(lat))
	up := p.sinβ0*sinβ + p.cosβ0*cosβ*cosλ // cosine of the distance from the centre
	if 1+up < 1e-12 {
		return math.NaN(), math.NaN() // within some metres of the point opposite, which has no image
	}
	b := p.radius * math.Sqrt(2/(1+up))
	return b * p.d * cosβ * sinλ, b / p.d * (p.cosβ0*sinβ - p.sinβ0*cosβ*cosλ)
}

func (p azimuthal) Inverse(x, y float64) (lon, lat float64) {
	u, v := x/p.d, y*p.d
	r := math.Hypot(u, v) / (2 * p.radius) // sine of half the distance from the centre
	if !(r < 1) {
		return math.NaN(), math.NaN()
	}
	up := 1 - 2*r*r
	k := math.Sqrt(1-r*r) / p.radius
	east, north := k*u, k*v
	// the place as a unit vector: out of the equator at the central meridian, east of that, and towards the pole
	out, pole := up*p.cosβ0-north*p.sinβ0, up*p.sinβ0+north*p.cosβ0
	φ := p.el.fromAuthalic(pole, math.Hypot(out, east))
	return wrap(p.lon0 + degrees(math.Atan2(east, out))), math.Max(-90, math.Min(90, degrees(φ)))
}

func (p azimuthal) AreaScale(x, y float64) float64 { return 1 }

func round6(v float64) float64 { return math.Round(v*1e6)/1e6 + 0 }
