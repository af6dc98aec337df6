package vector

import "testing"

func TestPlainCode(t *testing.T) {
	for name, want := range map[string]string{
		"urn:ogc:def:crs:EPSG::32633":                     "EPSG:32633",
		"urn:ogc:def:crs:OGC:1.3:CRS84":                   "OGC:CRS84",
		"URN:OGC:DEF:CRS:EPSG:9.8:4326":                   "EPSG:4326",
		"http://www.opengis.net/def/crs/EPSG/0/4326":      "EPSG:4326",
		"https://www.opengis.net/def/crs/OGC/1.3/CRS84":   "OGC:CRS84",
		"http://www.opengis.net/def/crs/EPSG/0/4326/more": "http://www.opengis.net/def/crs/EPSG/0/4326/more",
		"urn:ogc:def:cs:EPSG::32633":                      "urn:ogc:def:cs:EPSG::32633",
		"EPSG:4326":                                       "EPSG:4326",
		"local grid":                                      "local grid",
		"":                                                "",
	} {
		if got := PlainCode(name); got != want {
			t.Errorf("%q became %q, not %q", name, got, want)
		}
	}
}
