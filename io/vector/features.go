package vector

import (
	"bytes"
	"encoding/json"
	"math"
	"slices"
	"strings"
)

// features collects the features of a stream.
type features struct {
	*pieces
	out   *Observations
	keep  func(name string) bool
	known map[string]property
	row   []byte // the text of the row at hand
}

// property is the name of one met before.
type property struct {
	name int32 // index into Names
	kept bool
}

// members are those of an object that mean something here, as they stand in the text; nil where there is none.
type members struct {
	kind                                             string
	geometry, coordinates, properties, id, crs, list []byte
}

// set takes a member; others are foreign and mean nothing (RFC 7946 section 6.1).
func (m *members) set(key string, value []byte) {
	switch key {
	case "type":
		m.kind = word(value)
	case "geometry":
		m.geometry = value
	case "coordinates":
		m.coordinates = value
	case "properties":
		m.properties = value
	case "id":
		m.id = value
	case "crs":
		m.crs = value
	case "features":
		m.list = value
	}
}

// membersOf takes an object that is valid JSON apart.
func membersOf(object []byte) (m members) {
	walk(object, func(key, value []byte) error {
		m.set(string(unquote(key)), value)
		return nil
	})
	return m
}

// readText reads one GeoJSON object of the stream. The features of a collection are read one by one.
func (f *features) readText() error {
	f.feature, f.left = f.out.Len()+1, f.limit
	line := f.line
	m, listed, err := f.readMembers()
	if err != nil {
		return err
	}
	if err := f.noteCRS(m.crs, line); err != nil {
		return err
	}
	switch {
	case listed && m.kind != "FeatureCollection", m.kind == "FeatureCollection" && !listed:
		f.feature = 0
		return f.refuse(line, adviceFeatures, `an object of type %q, where a FeatureCollection has a list of "features" and nothing else has`, shorten(m.kind))
	case listed:
		return nil
	case m.kind == "Feature":
		return f.addFeature(m, line)
	case knownKind(m.kind):
		return f.add(members{}, m, line)
	}
	return f.refuseKind("the object", m.kind, line)
}

// readMembers reads the object that comes next, and reports whether it had a list of features, which is read.
func (f *features) readMembers() (m members, listed bool, err error) {
	f.in.ReadByte() // the brace
	if empty, err := f.take('}'); err != nil || empty {
		return m, false, err
	}
	for {
		key, err := f.readKey()
		if err != nil {
			return m, false, err
		}
		c, err := f.peek(false)
		if err == nil && key == "features" && c == '[' {
			listed, err = true, f.readList()
		} else {
			var raw []byte
			raw, _, err = f.value()
			m.set(key, slices.Clone(raw))
		}
		if err != nil {
			return m, false, err
		}
		if more, err := f.take(','); err != nil {
			return m, false, err
		} else if !more {
			return m, listed, f.expect('}')
		}
	}
}

// readKey reads the name of a member and the colon behind it.
func (f *features) readKey() (string, error) {
	raw, line, err := f.value()
	if err != nil {
		return "", err
	}
	if raw[0] != '"' {
		return "", f.refuse(line, adviceWhole, "not JSON: the name of a member was expected")
	}
	key := string(unquote(raw))
	return key, f.expect(':')
}

// readList reads the list of features of a collection.
func (f *features) readList() error {
	f.in.ReadByte() // the bracket
	end, err := f.take(']')
	for err == nil && !end {
		f.feature, f.left = f.out.Len()+1, f.limit
		if err = f.readFeature(); err != nil {
			return err
		}
		f.feature = 0
		var more bool
		if more, err = f.take(','); err == nil && !more {
			end, err = true, f.expect(']')
		}
	}
	f.feature, f.left = 0, f.limit
	return err
}

// readFeature reads one feature of a collection.
func (f *features) readFeature() error {
	raw, line, err := f.value()
	if err != nil {
		return err
	}
	if raw[0] != '{' {
		return f.refuse(line, adviceFeatures, `not an object of type "Feature"`)
	}
	m := membersOf(raw)
	if m.kind != "Feature" {
		return f.refuse(line, adviceFeatures, `not an object of type "Feature"`)
	}
	return f.addFeature(m, line)
}

// addFeature adds the feature with the given members.
func (f *features) addFeature(m members, line int) error {
	if err := f.noteCRS(m.crs, line); err != nil {
		return err
	}
	if isNull(m.geometry) {
		return f.add(m, members{}, line)
	}
	if m.geometry[0] != '{' {
		return f.refuse(line, adviceFeatures, "its geometry is not an object")
	}
	g := membersOf(m.geometry)
	if !knownKind(g.kind) {
		return f.refuseKind("its geometry", g.kind, line)
	}
	if err := f.noteCRS(g.crs, line); err != nil {
		return err
	}
	return f.add(m, g, line)
}

func isNull(raw []byte) bool { return len(raw) == 0 || string(raw) == "null" }

// refuseKind says what is wrong with an object that is no geometry of a known kind.
func (f *features) refuseKind(subject, kind string, line int) error {
	switch kind {
	case "":
		return f.refuse(line, adviceFeatures, `%s has no "type", so it is not GeoJSON`, subject)
	case "GeometryCollection":
		return f.refuse(line, adviceMixed, "%s is a GeometryCollection, which is not read", subject)
	}
	return f.refuse(line, adviceFeatures, "%s is a %q, which is not a kind of geometry in GeoJSON", subject, shorten(kind))
}

// noteCRS takes the name of a reference system, which may stand in a text, a feature or a geometry (GeoJSON 2008
// specification, section 3) and must be the same wherever it stands.
func (f *features) noteCRS(raw []byte, line int) error {
	name := strings.Join(strings.Fields(crsName(raw)), " ")
	switch {
	case name == "" || name == f.out.CRS:
	case f.out.CRS == "":
		f.out.CRS = name
	default:
		return f.refuse(line, "bring all features into one reference system",
			`its "crs" is %q, and that of features before is %q`, shorten(name), shorten(f.out.CRS))
	}
	return nil
}

// add appends a row for a feature and its geometry; members without a kind stand for no geometry.
func (f *features) add(m, geometry members, line int) error {
	if f.out.Len() == math.MaxInt32 {
		return f.refuse(line, adviceWhole, "the file has more features than can be counted")
	}
	if err := f.addProperties(m, line); err != nil {
		return err
	}
	g, z, fault := shapeOf(geometry)
	if fault != nil {
		fault.At.File, fault.At.Line, fault.At.Feature = f.source, line, f.feature
	}
	o := f.out
	o.Line, o.Geometry, o.Z, o.Fault = append(o.Line, int32(line)), append(o.Geometry, g), append(o.Z, z), append(o.Fault, fault)
	return nil
}

// addProperties appends the properties and the identifier of a feature.
func (f *features) addProperties(m members, line int) error {
	f.row = f.row[:0]
	if !isNull(m.id) {
		if m.id[0] == '{' || m.id[0] == '[' || m.id[0] == 't' || m.id[0] == 'f' {
			return f.refuse(line, adviceFeatures, `its "id" is neither a string nor a number`)
		}
		f.addCell(idCell, m.id)
	}
	if !isNull(m.properties) {
		if m.properties[0] != '{' {
			return f.refuse(line, adviceFeatures, `its "properties" are not an object`)
		}
		err := walk(m.properties, func(key, value []byte) error { return f.addProperty(unquote(key), value, line) })
		if err != nil {
			return err
		}
	}
	f.out.rows = append(f.out.rows, row{string(f.row), len(f.out.cells)})
	return nil
}

func (f *features) addProperty(key, value []byte, line int) error {
	p, seen := f.known[string(key)]
	if !seen {
		if len(f.out.Names) == maxNames {
			return f.refuse(line, "leave out the properties that are not needed", "there are more than %d different names of properties", maxNames)
		}
		name := string(key)
		p = property{int32(len(f.out.Names)), f.keep == nil || f.keep(name)}
		f.out.Names = append(f.out.Names, name)
		f.known[name] = p
	}
	if p.kept {
		f.addCell(p.name, value)
	}
	return nil
}

// addCell appends a value to the row at hand.
func (f *features) addCell(name int32, value []byte) {
	switch value[0] {
	case 'n': // null
	case '"':
		f.row = append(f.row, unquote(value)...)
	case '{', '[':
		var b bytes.Buffer
		json.Compact(&b, value) // cannot fail: the text is valid
		f.row = append(f.row, b.Bytes()...)
	default:
		f.row = append(f.row, value...)
	}
	f.out.cells = append(f.out.cells, cell{name, uint32(len(f.row))})
}
