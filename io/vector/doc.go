// Package vector reads polygons and observations from GeoJSON and writes cells, points and zones to it (RFC 7946).
//
// What is read keeps its coordinates as found; the caller knows whether they are longitude and latitude or a plane.
// What is written is in longitude and latitude wherever the plane is tied to the globe, and in plane metres for a
// local plane, which RFC 7946 (section 4) leaves to prior arrangement between the parties. The package opens no files.
package vector
