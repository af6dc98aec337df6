package crs

// The ellipsoids that have a name here: semi-major axis in metres and inverse flattening as EPSG lists them (from
// memory; borne out by the points of testdata/points.csv for those that an offered code stands on).
var namedEllipsoids = []struct {
	name       string
	a, inverse float64
}{
	{"WGS84", 6378137, 298.257223563},
	{"GRS80", 6378137, 298.257222101},
	{"Airy1830", 6377563.396, 299.3249646},
	{"AiryModified1849", 6377340.189, 299.3249646},
	{"AustralianNational", 6378160, 298.25},
	{"Bessel1841", 6377397.155, 299.1528128},
	{"Clarke1866", 6378206.4, 294.978698213898},
	{"Clarke1880IGN", 6378249.2, 293.466021293627},
	{"Clarke1880RGS", 6378249.145, 293.465},
	{"GRS67", 6378160, 298.247167427},
	{"International1924", 6378388, 297},
	{"Krassovsky1940", 6378245, 298.3},
	{"WGS72", 6378135, 298.26},
}

var wgs84 = newEllipsoid(6378137, 298.257223563)

// ellipsoidName is the name of an ellipsoid, if it has one.
func ellipsoidName(el ellipsoid) (string, bool) {
	for _, known := range namedEllipsoids {
		if newEllipsoid(known.a, known.inverse) == el {
			return known.name, true
		}
	}
	return "", false
}
