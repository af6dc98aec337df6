package crs

import (
	"errors"
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
)

// A plane in words: the method, then what it needs, as in
//
//	transverse-mercator; lon0=15; lat0=0; scale=0.9996; east=500000; north=0; ellipsoid=GRS80
//
// Angles are in degrees, lengths in metres. See methods for the keys of each method.

// parameters are the numbers of a plane by key; those of keys that were left out are NaN until they get a default.
type parameters map[string]float64

// method is a projection by its word.
type method struct {
	word string
	keys []key
	make func(el ellipsoid, p parameters) (projection, error)
}

// key is a number that a method takes.
type key struct {
	word      string
	otherwise float64 // value when left out; NaN: see needed
	needed    bool    // it must be given; a key that is neither needed nor has a value otherwise may stay out
	kind      kind
}

type kind int

const (
	length kind = iota
	longitude
	latitude
	angle
	factor
)

var missing = math.NaN()

var (
	needLatitude  = key{"lat0", missing, true, latitude}
	maybeLatitude = key{"lat0", missing, false, latitude}
	scaleOfOne    = key{"scale", 1, false, factor}
	maybeScale    = key{"scale", missing, false, factor}
	first         = key{"parallel1", missing, true, latitude}
	second        = key{"parallel2", missing, true, latitude}
	maybeParallel = key{"parallel", missing, false, latitude}
	needAzimuth   = key{"azimuth", missing, true, angle}
	maybeBearing  = key{"bearing", missing, false, angle}
)

// Every method has these too: the central meridian before its own keys, the false origin after them.
var (
	meridian    = key{"lon0", missing, true, longitude}
	falseOrigin = []key{{"east", 0, false, length}, {"north", 0, false, length}}
)

var methods = []method{
	{"transverse-mercator", []key{{"lat0", 0, false, latitude}, scaleOfOne}, func(el ellipsoid, p parameters) (projection, error) {
		return newTransverseMercator(el, p["lat0"], p["scale"]), nil
	}},
	{"mercator", []key{maybeScale, maybeParallel}, makeMercator},
	{"web-mercator", nil, func(el ellipsoid, p parameters) (projection, error) { return webMercator{el}, nil }},
	{"conformal-conic", []key{needLatitude, scaleOfOne}, func(el ellipsoid, p parameters) (projection, error) {
		return newConformalConic(el, p["lat0"], p["scale"])
	}},
	{"conformal-conic-two", []key{needLatitude, first, second}, func(el ellipsoid, p parameters) (projection, error) {
		return newConformalConicTwo(el, p["lat0"], p["parallel1"], p["parallel2"])
	}},
	{"albers", []key{needLatitude, first, second}, func(el ellipsoid, p parameters) (projection, error) {
		return newAlbers(el, p["lat0"], p["parallel1"], p["parallel2"])
	}},
	{"azimuthal-equal-area", []key{needLatitude}, func(el ellipsoid, p parameters) (projection, error) {
		return newAzimuthal(el, p["lat0"]), nil
	}},
	{"cylindrical-equal-area", []key{{"parallel", 0, false, latitude}}, makeCylindrical},
	{"oblique-stereographic", []key{needLatitude, scaleOfOne}, makeObliqueStereographic},
	{"polar-stereographic", []key{maybeLatitude, maybeScale, maybeParallel}, makePolarStereographic},
	{"oblique-mercator", []key{needLatitude, needAzimuth, maybeBearing, scaleOfOne}, func(el ellipsoid, p parameters) (projection, error) {
		return makeObliqueMercator(el, p), nil
	}},
	{"oblique-mercator-equator", []key{needLatitude, needAzimuth, maybeBearing, scaleOfOne}, func(el ellipsoid, p parameters) (projection, error) {
		return makeObliqueMercator(el, p).fromEquator(), nil
	}},
	{"oblique-conic", []key{needLatitude, {"axis", missing, true, angle}, {"parallel", missing, true, latitude}, scaleOfOne}, makeObliqueConic},
}

func methodWords() []string {
	var words []string
	for _, m := range methods {
		words = append(words, m.word)
	}
	return words
}

func (p parameters) given(word string) bool { return !math.IsNaN(p[word]) }

func makeMercator(el ellipsoid, p parameters) (projection, error) {
	switch {
	case p.given("parallel") && p.given("scale"):
		return nil, errors.New("mercator takes scale (on the equator) or parallel (true to scale), not both")
	case p.given("parallel"):
		if math.Abs(p["parallel"]) > 89 {
			return nil, errors.New("parallel is too near a pole for mercator")
		}
		return newMercatorParallel(el, p["parallel"]), nil
	case p.given("scale"):
		return newMercator(el, p["scale"]), nil
	}
	return newMercator(el, 1), nil
}

func makeCylindrical(el ellipsoid, p parameters) (projection, error) {
	if math.Abs(p["parallel"]) > 89 {
		return nil, errors.New("parallel is too near a pole for cylindrical-equal-area")
	}
	return newCylindrical(el, p["parallel"]), nil
}

func makeObliqueStereographic(el ellipsoid, p parameters) (projection, error) {
	if math.Abs(p["lat0"]) > 89.99 {
		return nil, errors.New("lat0 is a pole: use polar-stereographic")
	}
	return newObliqueStereographic(el, p["lat0"], p["scale"]), nil
}

func makePolarStereographic(el ellipsoid, p parameters) (projection, error) {
	pole := math.Copysign(1, p["parallel"])
	switch {
	case p.given("lat0") && math.Abs(p["lat0"]) != 90:
		return nil, errors.New("lat0 of polar-stereographic is 90 or -90: use oblique-stereographic elsewhere")
	case p.given("parallel") && (p.given("scale") || p["parallel"] == 0 || p.given("lat0") && p["lat0"] != 90*pole):
		return nil, errors.New("polar-stereographic takes lat0 (90 or -90) and scale, or parallel (true to scale, on the pole's side)")
	case p.given("parallel"):
		return newPolarStereographicParallel(el, p["parallel"]), nil
	case !p.given("lat0"):
		return nil, errors.New("polar-stereographic needs lat0 (90 or -90) or parallel (true to scale)")
	case !p.given("scale"):
		return newPolarStereographic(el, math.Copysign(1, p["lat0"]), 1), nil
	}
	return newPolarStereographic(el, math.Copysign(1, p["lat0"]), p["scale"]), nil
}

func makeObliqueMercator(el ellipsoid, p parameters) obliqueMercator {
	bearing := p["azimuth"]
	if p.given("bearing") {
		bearing = p["bearing"]
	}
	return newObliqueMercator(el, p["lat0"], p["azimuth"], bearing, p["scale"])
}

func makeObliqueConic(el ellipsoid, p parameters) (projection, error) {
	if !(p["parallel"] > 1 && p["parallel"] < 89) {
		return nil, errors.New("parallel of oblique-conic lies between 1 and 89 degrees")
	}
	return newObliqueConic(el, p["lat0"], p["axis"], p["parallel"], p["scale"]), nil
}

// allKeys are the method's keys in the order in which a code spells them.
func (m method) allKeys() []key {
	return append(append([]key{meridian}, m.keys...), falseOrigin...)
}

// keyWords are the words a text for the method may have.
func (m method) keyWords() []string {
	var words []string
	for _, k := range m.allKeys() {
		words = append(words, k.word)
	}
	return append(words, "ellipsoid", "shift", "frame-shift")
}

// check says what is wrong with a value, or nothing.
func (k key) check(v float64) string {
	ok, must := math.Abs(v) <= 1e9, "at most 1e9 metres"
	switch k.kind {
	case longitude, angle:
		ok, must = math.Abs(v) <= 360, "in degrees, -360 to 360"
	case latitude:
		ok, must = math.Abs(v) <= 90, "in degrees, -90 to 90"
	case factor:
		ok, must = v >= 0.01 && v <= 100, "a factor near 1"
	}
	if ok {
		return ""
	}
	return fmt.Sprintf("%s=%v is not %s", k.word, v, must)
}

// spoken is a text taken apart.
type spoken struct {
	method method
	text   map[string]string
}

// parseParameters reads a plane in words. Its code is the same text put in order.
func parseParameters(text string) (plane, error) {
	s, err := takeApart(text)
	if err != nil {
		return plane{}, err
	}
	el, err := readEllipsoid(s.text)
	if err != nil {
		return plane{}, err
	}
	numbers, err := s.numbers()
	if err != nil {
		return plane{}, err
	}
	shift, seven, err := readShift(el, s.text)
	if err != nil {
		return plane{}, err
	}
	shape, err := s.method.make(el, numbers)
	if err != nil {
		return plane{}, err
	}
	return plane{
		code:       s.method.spell(numbers, el, s.text["ellipsoid"], seven),
		projection: shape,
		lon0:       numbers["lon0"],
		east:       numbers["east"],
		north:      numbers["north"],
		shift:      shift,
	}, nil
}

func takeApart(text string) (spoken, error) {
	parts := strings.Split(strings.ToLower(text), ";")
	s := spoken{text: map[string]string{}}
	word := strings.TrimSpace(parts[0])
	at := slices.IndexFunc(methods, func(m method) bool { return m.word == word })
	if at < 0 {
		return s, &wordError{"projection", word, methodWords()}
	}
	s.method = methods[at]
	for _, part := range parts[1:] {
		if strings.TrimSpace(part) == "" {
			continue
		}
		word, value, ok := strings.Cut(part, "=")
		word, value = strings.TrimSpace(word), squeeze(value)
		if !ok {
			return s, fmt.Errorf("%q is not of the form name=value", strings.TrimSpace(part))
		}
		if !slices.Contains(s.method.keyWords(), word) {
			return s, &wordError{s.method.word + " has no", word, s.method.keyWords()}
		}
		if _, twice := s.text[word]; twice {
			return s, fmt.Errorf("%s is given twice", word)
		}
		s.text[word] = value
	}
	return s, nil
}

// numbers reads the method's own keys.
func (s spoken) numbers() (parameters, error) {
	p := parameters{}
	for _, k := range s.method.allKeys() {
		text, ok := s.text[k.word]
		if !ok {
			if k.needed {
				return nil, fmt.Errorf("%s needs %s", s.method.word, k.word)
			}
			p[k.word] = k.otherwise
			continue
		}
		v, err := strconv.ParseFloat(text, 64)
		if err != nil {
			return nil, fmt.Errorf("%s=%q is not a number", k.word, text)
		}
		if wrong := k.check(v); wrong != "" {
			return nil, errors.New(wrong)
		}
		if k.kind == longitude {
			v = wrap(v)
		}
		p[k.word] = v + 0
	}
	return p, nil
}

// readEllipsoid takes a name, or the semi-major axis in metres and the inverse flattening; WGS 84 if nothing is said.
func readEllipsoid(text map[string]string) (ellipsoid, error) {
	value, ok := text["ellipsoid"]
	if !ok {
		return wgs84, nil
	}
	if strings.Contains(value, ",") {
		two, err := readNumbers("ellipsoid", value, 2)
		if err != nil {
			return wgs84, err
		}
		if !(two[0] >= 1e6 && two[0] <= 1e8 && two[1] >= 100 && two[1] <= 1e4) {
			return wgs84, errors.New("ellipsoid is the semi-major axis in metres and the inverse flattening (100 to 10000; no spheres), " +
				"as in ellipsoid=6378137,298.257222101")
		}
		return newEllipsoid(two[0], two[1]), nil
	}
	var words []string
	for _, known := range namedEllipsoids {
		if strings.ToLower(known.name) == value {
			return newEllipsoid(known.a, known.inverse), nil
		}
		words = append(words, known.name)
	}
	return wgs84, &wordError{"ellipsoid", value, words}
}

// readShift takes the seven numbers to WGS 84, or three translations; the turns of frame-shift are those of a coordinate
// frame. It also returns the numbers as those of a position vector, nil if there is no shift.
func readShift(el ellipsoid, text map[string]string) (shift, []float64, error) {
	word := "shift"
	value, ok := text[word]
	if framed, too := text["frame-shift"]; too {
		if ok {
			return shift{}, nil, errors.New("shift and frame-shift are given both")
		}
		word, value, ok = "frame-shift", framed, true
	}
	if !ok {
		return shift{}, nil, nil
	}
	count := 7
	if strings.Count(value, ",") == 2 {
		count = 3
	}
	numbers, err := readNumbers(word, value, count)
	if err != nil {
		return shift{}, nil, err
	}
	var seven [7]float64
	copy(seven[:], numbers)
	for i, v := range seven {
		if most := [...]float64{1e4, 1e4, 1e4, 60, 60, 60, 1e3}[i]; !(math.Abs(v) <= most) {
			return shift{}, nil, fmt.Errorf("%s: %v is beyond %v (three metres, three seconds of arc, parts per million)", word, v, most)
		}
	}
	if word == "frame-shift" {
		for i := 3; i < 6; i++ {
			seven[i] = 0 - seven[i]
		}
	}
	if count == 3 {
		return newShift(el, seven), seven[:3], nil
	}
	return newShift(el, seven), seven[:], nil
}

func readNumbers(word, value string, count int) ([]float64, error) {
	parts := strings.Split(value, ",")
	if len(parts) != count {
		return nil, fmt.Errorf("%s=%s has %d numbers, want %d", word, value, len(parts), count)
	}
	numbers := make([]float64, count)
	for i, part := range parts {
		v, err := strconv.ParseFloat(part, 64)
		if err != nil {
			return nil, fmt.Errorf("%s: %q is not a number", word, part)
		}
		numbers[i] = v + 0
	}
	return numbers, nil
}

// spell is the code of a plane: every number that was given or taken for granted, in order.
func (m method) spell(p parameters, el ellipsoid, ellipsoidText string, seven []float64) string {
	parts := []string{m.word}
	for _, k := range m.allKeys() {
		if v := p[k.word]; !math.IsNaN(v) {
			parts = append(parts, k.word+"="+plainNumber(v))
		}
	}
	name, ok := ellipsoidName(el)
	if !ok {
		name = ellipsoidText
	}
	parts = append(parts, "ellipsoid="+name)
	if seven != nil {
		numbers := make([]string, len(seven))
		for i, v := range seven {
			numbers[i] = plainNumber(v)
		}
		parts = append(parts, "shift="+strings.Join(numbers, ","))
	}
	return strings.Join(parts, "; ")
}

func plainNumber(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }
