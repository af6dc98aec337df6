package crs

import "math"

// projection is the shape of a plane without its ties: on one ellipsoid, longitude in degrees east of the central
// meridian (-180 .. 180), latitude in degrees, metres from the origin before the false easting and northing.
// Implementations are comparable values.
type projection interface {
	// forward gives NaN twice where the projection is not defined.
	forward(λ, φ float64) (x, y float64)
	// inverse gives NaN twice where the plane has no such place.
	inverse(x, y float64) (λ, φ float64)
	// areaScale is the area in the plane per area on the ellipsoid at a place in the plane, NaN where there is none.
	areaScale(x, y float64) float64
}

// plane is a projection with what ties it to WGS 84.
type plane struct {
	code        string
	projection  projection
	lon0        float64 // central meridian in degrees
	east, north float64 // false easting and northing in metres
	shift       shift
}

var _ System = plane{}

func (p plane) Code() string { return p.code }

func (p plane) Geographic() bool { return true }

func (p plane) Forward(lon, lat float64) (x, y float64) {
	if !onGlobe(lon, lat) {
		return nowhere()
	}
	if p.shift.on {
		lon, lat, _ = p.shift.fromWGS84(lon, lat)
	}
	x, y = p.projection.forward(wrap(lon-p.lon0), lat)
	return p.east + x, p.north + y
}

func (p plane) Inverse(x, y float64) (lon, lat float64) {
	λ, φ := p.projection.inverse(x-p.east, y-p.north)
	lon, lat = wrap(p.lon0+λ), φ
	if p.shift.on && !math.IsNaN(lat) {
		lon, lat = p.shift.toWGS84(lon, lat)
	}
	return lon, lat
}

// AreaScale counts ground on WGS 84, so that a zone has the same area in every plane.
func (p plane) AreaScale(x, y float64) float64 {
	scale := p.projection.areaScale(x-p.east, y-p.north)
	if p.shift.on && !math.IsNaN(scale) {
		scale *= p.shift.areaScale(p.Inverse(x, y))
	}
	return scale
}
