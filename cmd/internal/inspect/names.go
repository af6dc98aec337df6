package inspect

import (
	"slices"
	"strings"
	"unicode"
)

// The names by which columns are known, as parts of their names in small letters. They are hints and no more: common
// practice, no source.
var (
	responseNames = []string{"case", "cases", "death", "deaths", "died", "ill", "sick", "infected", "positive", "positives", "pos",
		"count", "counts", "counted", "observed", "sightings", "sighted", "seen", "detections", "individuals", "animals", "birds",
		"nests", "plants", "stems", "trees", "seedlings", "catch", "caught", "captures", "events", "larvae", "eggs", "number"}
	covariateNames = []string{"elev", "elevation", "alt", "altitude", "height", "slope", "aspect", "depth", "dist", "distance",
		"temp", "temperature", "rain", "rainfall", "precipitation", "year", "month", "day", "week", "age", "date", "east", "north",
		"x", "y", "z", "lon", "lat", "row", "col", "column"}
	identifierNames = []string{"id", "nr", "no", "code", "key", "gid", "fid", "oid", "fips", "index", "serial"}
	regionNames     = []string{"region", "district", "province", "county", "zone", "block", "site", "stratum", "ward", "parish", "island", "catchment"}
	placeNames      = append([]string{"name", "place", "label", "title", "transect", "line", "track", "plot", "tract", "village", "town", "municipality", "area"}, regionNames...)
	lengthUnits     = map[string]string{"km": "kilometres", "mi": "miles", "miles": "miles", "ft": "feet", "feet": "feet"}

	denominatorNames = []struct {
		word  string
		names []string
	}{
		{"trials", []string{"examined", "tested", "tests", "trials", "screened", "sampled", "checked"}},
		{"people", []string{"people", "population", "pop", "residents", "inhabitants", "persons", "births", "atrisk", "personyears"}},
		{"area", []string{"area", "ha", "m2", "km2", "hectares"}},
		{"effort", []string{"effort", "hours", "hour", "minutes", "nights", "trapnights", "traps", "time", "duration", "exposure", "visits", "hauls", "sweeps", "walked"}},
		{"expected", []string{"expected"}},
	}
	areaUnits = []string{"m2", "ha", "km2"}
)

// parts splits a name into its parts, in small letters: at blanks and signs, and where a small letter is followed by a
// capital.
func parts(name string) []string {
	var b strings.Builder
	before := ' '
	for _, c := range name {
		if unicode.IsUpper(c) && unicode.IsLower(before) {
			b.WriteByte(' ')
		}
		b.WriteRune(unicode.ToLower(c))
		before = c
	}
	return strings.FieldsFunc(b.String(), func(c rune) bool { return !unicode.IsLetter(c) && !unicode.IsDigit(c) })
}

// stems are the parts of a name without digits at their ends, which number years and visits.
func stems(name string) []string {
	list := parts(name)
	for i, p := range list {
		if stem := strings.TrimRight(p, "0123456789"); stem != "" && !slices.Contains(areaUnits, p) {
			list[i] = stem
		}
	}
	return list
}

// digits are the digits of a name, which pair the columns of one year or visit.
func digits(name string) string {
	return strings.Map(func(c rune) rune {
		if c < '0' || c > '9' {
			return -1
		}
		return c
	}, name)
}

func isNamed(name string, among []string) bool {
	return slices.ContainsFunc(stems(name), func(p string) bool { return slices.Contains(among, p) })
}

// denominatorWord is the word that a column's name suggests for a denominator, or empty.
func denominatorWord(name string) string {
	for _, d := range denominatorNames {
		if isNamed(name, d.names) {
			return d.word
		}
	}
	return ""
}

// axes are the parts of names that make an x into the y that belongs to it.
var axes = []struct{ x, y string }{
	{"longitude", "latitude"}, {"long", "lat"}, {"lon", "lat"}, {"lng", "lat"}, {"easting", "northing"}, {"east", "north"},
	{"e", "n"}, {"x", "y"}, {"xcoord", "ycoord"}, {"coordx", "coordy"}, {"xutm", "yutm"}, {"utmx", "utmy"},
	{"column", "row"}, {"col", "row"},
}

// GuessCoordinates finds two names that differ in nothing but what tells an x from a y, such as utm_x and utm_y. Of several
// such pairs it returns the first by the order of axes, then of names; it returns nothing where there is none.
func GuessCoordinates(names []string) (x, y string) {
	for _, pair := range pairsOfNames(names) {
		return pair[0], pair[1]
	}
	return "", ""
}

// pairsOfNames lists all pairs of names that GuessCoordinates could return.
func pairsOfNames(names []string) (pairs [][2]string) {
	byParts := map[string]string{}
	for _, name := range names {
		key := strings.Join(parts(name), " ")
		if _, taken := byParts[key]; !taken {
			byParts[key] = name
		}
	}
	for _, axis := range axes {
		for _, name := range names {
			list := parts(name)
			at := slices.Index(list, axis.x)
			if at < 0 {
				continue
			}
			list[at] = axis.y
			if other, there := byParts[strings.Join(list, " ")]; there && other != name {
				pairs = append(pairs, [2]string{name, other})
			}
		}
	}
	return pairs
}
