package vector

import "strings"

// PlainCode turns the name of a coordinate system as GeoJSON files have it, urn:ogc:def:crs:EPSG::32633 or
// urn:ogc:def:crs:OGC:1.3:CRS84 (GeoJSON of 2008, section 3.1) or http://www.opengis.net/def/crs/EPSG/0/32633, into
// authority and code, as in EPSG:32633. Other names come back as they are.
func PlainCode(name string) string {
	parts := strings.Split(name, ":")
	if len(parts) == 7 && strings.EqualFold(strings.Join(parts[:4], ":"), "urn:ogc:def:crs") {
		return parts[4] + ":" + parts[6]
	}
	_, path, isURL := strings.Cut(name, "://www.opengis.net/def/crs/")
	if parts = strings.Split(path, "/"); isURL && len(parts) == 3 {
		return parts[0] + ":" + parts[2]
	}
	return name
}
