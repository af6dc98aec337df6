package crs

import (
	"strings"
	"testing"
)

func TestParameters(t *testing.T) {
	for in, code := range map[string]string{
		" Transverse-Mercator;LON0=-345 ; lat0=0; ellipsoid=grs80;": "transverse-mercator; lon0=15; lat0=0; scale=1; east=0; north=0; ellipsoid=GRS80",
		"mercator; lon0=-0; ellipsoid=6378137, 298.25":              "mercator; lon0=0; east=0; north=0; ellipsoid=6378137,298.25",
		"mercator; lon0=0; frame-shift=1,2,3,4,5,6,7":               "mercator; lon0=0; east=0; north=0; ellipsoid=WGS84; shift=1,2,3,-4,-5,-6,7",
		"albers; lon0=1; lat0=2; parallel1=3; parallel2=4; shift=1,2,3": "albers; lon0=1; lat0=2; parallel1=3; parallel2=4; east=0; north=0; " +
			"ellipsoid=WGS84; shift=1,2,3",
	} {
		s, err := Parse(in)
		if err != nil || s.Code() != code {
			t.Errorf("%q: %v, %v", in, s, err)
		}
	}
	for _, e := range everyEntry() {
		s := must(t, e.words)
		if again := must(t, s.Code()); again != s {
			t.Errorf("EPSG:%d: %q does not come back", e.EPSG, s.Code())
		}
	}
}

func TestParametersRefused(t *testing.T) {
	for in, want := range map[string]string{
		"transvers-mercator; lon0=1": "did you mean transverse-mercator?",
		"conical":                    "",
		"albers; lon0=1; lat0=0; paralel1=2; parallel2=3":                 "did you mean parallel1?",
		"albers; lon0=1; lat0=0; colour=2":                                "known are lon0, lat0",
		"mercator; lon0=0; ellipsoid=GRS8":                                "did you mean GRS80?",
		"mercator; lon0=0; ellipsoid=6371000,0":                           "no spheres",
		"mercator":                                                        "mercator needs lon0",
		"mercator; lon0":                                                  "name=value",
		"mercator; lon0=x":                                                "not a number",
		"mercator; lon0=NaN":                                              "in degrees",
		"mercator; lon0=1; lon0=2":                                        "given twice",
		"mercator; lon0=1; scale=1; parallel=3":                           "not both",
		"mercator; lon0=1; parallel=90":                                   "too near a pole",
		"mercator; lon0=1; scale=0":                                       "factor",
		"mercator; lon0=1; east=1e10":                                     "1e9 metres",
		"mercator; lon0=1; shift=1,2":                                     "want 7",
		"mercator; lon0=1; shift=1,2,3,4,5,6,1e9":                         "beyond",
		"mercator; lon0=1; shift=1,2,x":                                   "not a number",
		"mercator; lon0=1; shift=1,2,3; frame-shift=1,2,3":                "both",
		"conformal-conic; lon0=0; lat0=0":                                 "use mercator",
		"conformal-conic; lon0=0; lat0=90":                                "polar-stereographic",
		"conformal-conic-two; lon0=0; lat0=0; parallel1=5; parallel2=-5":  "as far north as south",
		"conformal-conic-two; lon0=0; lat0=-90; parallel1=5; parallel2=9": "open to",
		"albers; lon0=0; lat0=0; parallel1=5; parallel2=-5":               "as far north as south",
		"polar-stereographic; lon0=0":                                     "needs lat0",
		"polar-stereographic; lon0=0; lat0=80":                            "90 or -90",
		"polar-stereographic; lon0=0; lat0=-90; parallel=71":              "on the pole's side",
		"oblique-stereographic; lon0=0; lat0=90":                          "use polar-stereographic",
		"cylindrical-equal-area; lon0=0; parallel=-90":                    "too near a pole",
		"oblique-conic; lon0=0; lat0=9; axis=1; parallel=0":               "between 1 and 89",
	} {
		s, err := Parse(in)
		coded, ok := err.(*CodeError)
		if s != nil || !ok || !strings.Contains(coded.Reason, want) || coded.Hint() == "" {
			t.Errorf("%q: %v, %v, want %q", in, s, err, want)
		}
	}
}

// A polar plane by its scale and by its parallel is one and the same.
func TestPolarVariantsAgree(t *testing.T) {
	b := newPolarStereographicParallel(wgs84, -71)
	a := newPolarStereographic(wgs84, -1, b.k0)
	if a != b {
		t.Errorf("%v and %v", a, b)
	}
	if k := newPolarStereographicParallel(wgs84, 90).k0; k != 1 {
		t.Errorf("scale at the pole %v", k)
	}
}

func FuzzParse(f *testing.F) {
	for _, e := range everyEntry() {
		if e.EPSG%97 == 0 {
			f.Add(e.words)
		}
	}
	f.Add("laea lon=8.5 lat=47.25")
	f.Add("oblique-mercator; lon0=1; lat0=0; azimuth=0; shift=1,2,3,4,5,6,7")
	f.Fuzz(func(t *testing.T, text string) {
		s, err := Parse(text)
		if err != nil {
			return
		}
		if again, err := Parse(s.Code()); err != nil || again != s {
			t.Errorf("%q: %q does not come back: %v", text, s.Code(), err)
		}
		s.Forward(3, 50)
		s.AreaScale(s.Inverse(1e5, 1e6))
	})
}

func everyEntry() []entry {
	var list []entry
	for _, c := range Codes() {
		e, _ := find(c.EPSG)
		list = append(list, e)
	}
	return list
}
