package crs

import "math"

// Local is a plane in metres with no tie to the globe: what x and y are when nobody said what they are. Its zero value
// is ready for use.
type Local struct{}

var _ System = Local{}

// Code returns "local".
func (Local) Code() string { return "local" }

// Geographic returns false.
func (Local) Geographic() bool { return false }

// Forward returns NaN twice: nothing is known of where the plane lies.
func (Local) Forward(lon, lat float64) (x, y float64) { return math.NaN(), math.NaN() }

// Inverse returns NaN twice: nothing is known of where the plane lies.
func (Local) Inverse(x, y float64) (lon, lat float64) { return math.NaN(), math.NaN() }

// AreaScale returns 1: areas in the plane are taken for true.
func (Local) AreaScale(x, y float64) float64 { return 1 }
