package geotiff

import "strings"

// keyList collects keys in ascending order, as OGC 19-008r4 asks, and the numbers and text that stand beside them.
type keyList struct {
	keys    []uint16
	numbers []float64
	text    string
}

func (k *keyList) short(key, value uint16) { k.keys = append(k.keys, key, 0, 1, value) }

func (k *keyList) number(key uint16, value float64) {
	k.keys = append(k.keys, key, tagGeoDoubles, 1, uint16(len(k.numbers)))
	k.numbers = append(k.numbers, value)
}

// cite adds a text; a bar ends it, so it may not hold one itself.
func (k *keyList) cite(key uint16, text string) {
	text = strings.ReplaceAll(clean(text), "|", "/") + "|"
	k.keys = append(k.keys, key, tagGeoASCII, uint16(len(text)), uint16(len(k.text)))
	k.text += text
}

// keys describes the coordinate system: an EPSG code by itself, an azimuthal plane by its centre, anything else in words
// as a plane in metres of its own.
func (g Grid) keys() (keys []uint16, numbers []float64, text string) {
	k := &keyList{}
	switch {
	case g.EPSG > 0 && g.Geographic:
		k.begin(modelGeographic, g.Citation)
		k.short(keyGeodeticCRS, uint16(g.EPSG))
	case g.EPSG > 0:
		k.begin(modelProjected, g.Citation)
		k.short(keyProjectedCRS, uint16(g.EPSG))
	case g.Azimuthal != nil:
		k.azimuthal(g)
	default:
		citation := g.Citation
		if citation == "" {
			citation = "local metres"
		}
		k.begin(userDefined, citation)
		k.short(keyLinearUnits, unitMetre)
	}
	const version, revision, minor = 1, 1, 1 // GeoTIFF 1.1
	return append([]uint16{version, revision, minor, uint16(len(k.keys) / 4)}, k.keys...), k.numbers, k.text
}

func (k *keyList) begin(model uint16, citation string) {
	k.short(keyModelType, model)
	k.short(keyRasterType, rasterArea)
	if citation != "" {
		k.cite(keyCitation, citation)
	}
}

// azimuthal spells out the plane of the Lambert azimuthal equal-area projection on WGS 84 around a centre.
func (k *keyList) azimuthal(g Grid) {
	citation := g.Citation
	if citation == "" {
		citation = "azimuthal equal-area plane around the data, WGS 84"
	}
	k.begin(modelProjected, citation)
	k.short(keyGeodeticCRS, geodeticWGS84)
	k.short(keyAngularUnits, unitDegree)
	k.short(keyProjectedCRS, userDefined)
	k.cite(keyProjectedCite, citation)
	k.short(keyProjection, userDefined)
	k.short(keyMethod, methodAzimuthal)
	k.short(keyLinearUnits, unitMetre)
	k.number(keyFalseEasting, 0)
	k.number(keyFalseNorthing, 0)
	k.number(keyCentreLongitude, g.Azimuthal.Lon)
	k.number(keyCentreLatitude, g.Azimuthal.Lat)
}
