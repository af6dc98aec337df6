package observe

import (
	"bytes"
	"strings"
)

const gzipMark = "\x1f\x8b"

// What to do about files that are no table.
const (
	adviceSheet   = "save the sheet as CSV in UTF-8"
	adviceExport  = "export the rows as CSV in UTF-8, or as GeoJSON in longitude and latitude"
	adviceUnzip   = "save a sheet as CSV in UTF-8, or unpack an archive and name the file in it"
	adviceUnpack  = "unpack it, or compress it with gzip"
	adviceJSON    = "write the rows as CSV, or as the features of a FeatureCollection with their values as properties"
	adviceNoTable = "name the file that holds the table, as CSV or GeoJSON"
)

// marks are the first bytes of files that are something other than text: those of the formats' own descriptions, from
// memory.
var marks = []struct{ mark, what, advice string }{
	{"PK\x03\x04", "a spreadsheet or a zip archive, not a CSV table", adviceUnzip},
	{"\xd0\xcf\x11\xe0", "a spreadsheet or another office document, not a CSV table", adviceSheet},
	{"\x00\x00\x27\x0a", "a shapefile, not a CSV table", adviceExport},
	{"SQLite format 3\x00", "a database, not a CSV table", adviceExport},
	{"PAR1\x15", "a Parquet table, not a CSV table", adviceExport},
	{"\x89HDF\r\n\x1a\n", "an HDF5 or NetCDF file, not a CSV table", adviceExport},
	{"CDF\x01", "a NetCDF file, not a CSV table", adviceExport},
	{"CDF\x02", "a NetCDF file, not a CSV table", adviceExport},
	{"%PDF-", "a PDF document, not a CSV table", adviceNoTable},
	{"\x89PNG\r\n", "a picture, not a CSV table", adviceNoTable},
	{"\xff\xd8\xff", "a picture, not a CSV table", adviceNoTable},
	{"GIF87a", "a picture, not a CSV table", adviceNoTable},
	{"GIF89a", "a picture, not a CSV table", adviceNoTable},
	{"II*\x00", "a picture or a raster, not a CSV table", adviceNoTable},
	{"MM\x00*", "a picture or a raster, not a CSV table", adviceNoTable},
	{"<!DOCTYPE", "a web page or another marked-up document, not a CSV table", adviceText},
	{"<?xml", "a web page or another marked-up document, not a CSV table", adviceText},
	{"<html", "a web page or another marked-up document, not a CSV table", adviceText},
	{"\xff\xfe\x00\x00", "UTF-32 text, which is not read", adviceText},
	{"\x00\x00\xfe\xff", "UTF-32 text, which is not read", adviceText},
	{gzipMark, "compressed with gzip twice", "unpack it once"},
	{"BZh91AY&SY", "compressed with bzip2", adviceUnpack},
	{"\xfd7zXZ\x00", "compressed with xz", adviceUnpack},
	{"\x28\xb5\x2f\xfd", "compressed with zstd", adviceUnpack},
	{"7z\xbc\xaf\x27\x1c", "compressed with 7z", adviceUnpack},
}

// notTable names a file that is something other than CSV or GeoJSON, by its first bytes.
func notTable(head []byte) (what, advice string) {
	if len(head) == 0 {
		return "the file is empty", adviceWhole
	}
	for _, known := range marks {
		if bytes.HasPrefix(head, []byte(known.mark)) {
			return ofItsKind(head, known.what, known.advice)
		}
	}
	switch {
	case isDBase(head):
		return "the file is a dBASE table, not a CSV table", adviceExport
	case startsList(head):
		return "the file is a JSON list, and drumlin reads GeoJSON or CSV", adviceJSON
	case utf16Order(head) == nil && bytes.IndexByte(head, 0) >= 0:
		return "the file holds NUL bytes, so it is not text", adviceText
	}
	return "", ""
}

// ofItsKind tells apart what starts with the same bytes: an office document is a zip archive with a list of its parts, and
// a GeoPackage is a database with a number of its own (OGC 12-128r18, requirement 2).
func ofItsKind(head []byte, what, advice string) (string, string) {
	const geoPackageAt = 68
	switch {
	case bytes.HasPrefix(head, []byte("PK")) && (bytes.Contains(head, []byte("[Content_Types].xml")) || bytes.Contains(head, []byte("opendocument"))):
		what, advice = "a spreadsheet or another office document, not a CSV table", adviceSheet
	case bytes.HasPrefix(head, []byte("SQLite")) && len(head) > geoPackageAt && bytes.HasPrefix(head[geoPackageAt:], []byte("GPKG")):
		what = "a GeoPackage, not a CSV table"
	}
	return "the file is " + what, advice
}

// isDBase reports whether a file is the table of a dBASE database, such as that beside a shapefile: its version, and the
// year, month and day of its last change (common practice, no source).
func isDBase(head []byte) bool {
	return len(head) > 32 && strings.IndexByte("\x02\x03\x30\x31\x43\x83\x8b\xf5", head[0]) >= 0 &&
		head[2] >= 1 && head[2] <= 12 && head[3] >= 1 && head[3] <= 31 && bytes.IndexByte(head[:32], 0) >= 0
}

// jsonStart returns a text from the first character that JSON may start with, in any encoding.
func jsonStart(head []byte) []byte {
	for _, mark := range []string{utf8Mark, "\xff\xfe", "\xfe\xff"} {
		head = bytes.TrimPrefix(head, []byte(mark))
	}
	return bytes.TrimLeft(head, " \t\r\n\x00") // the zeros are those of UTF-16
}

// startsFeatures reports whether a text, of which head is the start in any encoding, is GeoJSON and no table.
func startsFeatures(head []byte) bool {
	head = jsonStart(head)
	return len(head) > 0 && (head[0] == '{' || head[0] == recordSeparator)
}

// startsList reports whether a text, of which head is the start in any encoding, is a JSON list. A bracket alone may
// begin the name of a column.
func startsList(head []byte) bool {
	inside, list := bytes.CutPrefix(jsonStart(head), []byte("["))
	inside = jsonStart(inside)
	return list && len(inside) > 0 && strings.IndexByte(`{["]`, inside[0]) >= 0
}

// recordSeparator stands before each text of a sequence (RFC 8142 section 2, after RFC 7464).
const recordSeparator = 0x1e
