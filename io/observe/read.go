package observe

import "io"

// Read reads a table of observations: GeoJSON where the text starts with a brace or a record separator, otherwise CSV.
// The source is the name of the file in messages. The text is UTF-8, UTF-16 (told by its byte order mark, or by the
// zeros in every other byte) or Windows-1252 (told by the first character beyond ASCII, which is no UTF-8, and refused if
// others are). A byte order mark is dropped. The file may be compressed with gzip.
//
// CSV has one line of names, with quotes as in RFC 4180. The columns are separated as Request.Format says or the header
// shows; numbers are decimal with a point unless the format has a comma; empty fields and NA, NaN and null in any
// capitals are missing. Places come from two columns of coordinates or from one of geometries, see Request. Lines and
// rows are those of the text, and it is never held as a whole. A first line such as "sep=;" names the separator. Lines
// of which all fields are blank, and a line with the end-of-file mark of old systems (byte 1A), are no rows and passed
// over as blank lines are. A title above the names is refused.
//
// GeoJSON (RFC 7946) is one FeatureCollection, Feature or geometry, or several of them one after the other, with or
// without record separators (RFC 8142). Its properties are the columns, and its features the rows, with the geometries
// they have. Numbers have a decimal point and there are no separators, whatever the format says. Coordinates are
// longitude and latitude unless Axes says that they are in a plane.
//
// Where rows have geometries, a column called "z" that the table does not have is the third coordinate of its points,
// missing elsewhere. A geometry with a flaw is one that cannot be read: a polygon that crosses itself or has no area, a
// line without length. A column "id" that is no property is the identifier of features.
//
// Rows that cannot be used are set aside, see Request for the order of the checks. An *Error is returned for a table
// that cannot be used as a whole: one that is not such a file, has no such column or two of a name, rows of the wrong
// length, a latitude beyond 90 degrees anywhere (coordinates were probably swapped, or are not degrees), digits in
// groups of three in a number, decimal commas or points against the format, geometries in several reference systems,
// more than half of its rows to set aside, or any such row if the request is strict.
func Read(r io.Reader, source string, want Request) (*Table, error) {
	if err := want.Validate(); err != nil {
		return nil, inFile(err, source)
	}
	decoded, from, err := openOrigin(r, source, want.Format)
	if err != nil {
		return nil, err
	}
	if from.features {
		return readFeatures(decoded, from, want)
	}
	return readCSV(decoded, from, want)
}

// Columns returns the names of the columns of a file that Read reads, in order: those of the header without the blanks
// around them (a blank name is ""), or the properties of all features and then "id" and "z" where features have
// identifiers and points a third coordinate and no property is called so. Of a CSV table only the header is read.
func Columns(r io.Reader, source string, format Format) ([]string, error) {
	if err := format.Validate(); err != nil {
		return nil, inFile(err, source)
	}
	decoded, from, err := openOrigin(r, source, format)
	if err != nil {
		return nil, err
	}
	if from.features {
		o, err := openFeatures(decoded, from, func(string) bool { return false })
		if err != nil {
			return nil, err
		}
		return featureHeader(o, from).columns(), nil
	}
	in, err := openText(decoded, from)
	if err != nil {
		return nil, err
	}
	h, err := readHeader(in, source)
	return h.names, err
}
