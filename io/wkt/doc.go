// Package wkt reads geometries written in a single text, as they stand in the cells of a table: well-known text (WKT;
// OGC 06-103r4 section 7, ISO 19125-1) and well-known binary in hexadecimal (OGC 06-103r4 section 8), both also as
// spatial databases extend them by heights, measures and the number of a reference system (EWKT, EWKB).
//
// What is read keeps its coordinates as found; the caller knows whether they are longitude and latitude or a plane.
package wkt
