// Package crs turns longitude and latitude into the plane and back.
//
// Everything a map is made of lives in a plane measured in metres. A System says how that plane hangs together with
// the globe: one projection a file, formulas from EPSG Guidance Note 7-2. Longitude and latitude are in degrees on
// WGS 84, in that order; plane coordinates are easting and northing in metres, in that order.
package crs

// System is a plane coordinate system. Implementations are small values, safe for concurrent use.
type System interface {
	// Code names the system: "local", "EPSG:32633", or a plane in words; Parse takes it back.
	Code() string
	// Geographic reports whether the plane is tied to the globe; Forward and Inverse of one that is not return NaN.
	Geographic() bool
	// Forward projects longitude and latitude in degrees; both results are NaN where the projection is not defined.
	Forward(lon, lat float64) (x, y float64)
	// Inverse gives longitude and latitude in degrees; both are NaN where the plane has no such place.
	Inverse(x, y float64) (lon, lat float64)
	// AreaScale is the area in the plane per area on the ground at a place in the plane; 1 for equal-area planes.
	AreaScale(x, y float64) float64
}
