package geotiff

import (
	"math"
	"strings"
	"unicode/utf8"
)

const mostKeys = 1024 // of one file; some fifty are defined

// geoKeys is the key directory of OGC 19-008r4, section 7.1: keys with a short value, or with the place of longer ones
// among the numbers and texts that stand beside it.
type geoKeys struct {
	at    map[int]geoKey
	reals []float64
	ascii string
}

type geoKey struct{ store, count, value int }

// geoKeys reads the keys of a directory; a file without them has none.
func (f *file) geoKeys(d directory) (geoKeys, error) {
	k := geoKeys{at: map[int]geoKey{}}
	v, err := f.whole(d, tagGeoKeys, 4*(mostKeys+1))
	if err != nil || v == nil {
		return k, err
	}
	if len(v) < 4 || v[0] != 1 || v[3] > mostKeys || uint64(len(v)) < 4*(v[3]+1) {
		return k, f.refuse(adviceDamaged, "has a description of its coordinate system that is cut short or of an unknown version")
	}
	for i := range v[3] {
		e := v[4*i+4:]
		k.at[int(e[0])] = geoKey{store: int(e[1]), count: int(e[2]), value: int(e[3])}
	}
	if k.reals, err = f.reals(d, tagGeoDoubles, mostKeys); err != nil {
		return k, err
	}
	k.ascii, err = f.text(d, tagGeoASCII)
	return k, err
}

// number is the value of a key that holds a short number; 0, which means undefined, where it is absent.
func (k geoKeys) number(key int) int {
	if e, ok := k.at[key]; ok && e.store == 0 {
		return e.value
	}
	return 0
}

// real is the value of a key that holds a number with decimals; NaN where it is absent.
func (k geoKeys) real(key int) float64 {
	e, ok := k.at[key]
	switch {
	case ok && e.store == 0:
		return float64(e.value)
	case ok && e.store == tagGeoDoubles && e.value < len(k.reals):
		return k.reals[e.value]
	}
	return math.NaN()
}

// zero reports whether a key is absent or 0.
func (k geoKeys) zero(key int) bool {
	_, ok := k.at[key]
	return !ok || k.real(key) == 0
}

// text is the value of a key that holds text, without the bar at its end; "" where it is absent.
func (k geoKeys) text(key int) string {
	e, ok := k.at[key]
	if !ok || e.store != tagGeoASCII || e.value > len(k.ascii) {
		return ""
	}
	text := k.ascii[e.value:min(len(k.ascii), e.value+e.count)]
	return clean(strings.TrimRight(text, "|\x00"))
}

// clean makes text of a file fit to print: valid, on one line, and not endless.
func clean(text string) string {
	const most = 500
	text = strings.Join(strings.Fields(strings.ToValidUTF8(text, "\uFFFD")), " ")
	text = strings.Map(func(r rune) rune {
		if r < ' ' || r == 0x7f {
			return -1
		}
		return r
	}, text)
	if utf8.RuneCountInString(text) > most {
		text = string([]rune(text)[:most])
	}
	return text
}
