package observe

import (
	"fmt"
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/cases"
	"golang.org/x/text/unicode/norm"
)

// Alike is a key that finds no match, but is written almost like one of the side.
type Alike struct {
	Key     string // of the observations
	Of      string // the key of the side
	Differs string // in what, such as "in capitals"
}

// way is a way in which two spellings of one key differ, and how the difference is taken away.
type way struct {
	word  string
	level func(string) string
}

// ways are applied in this order: case folding may take letters apart that normalisation puts together, and zeros
// are looked for in what is left.
var ways = []way{
	{"in capitals", foldCase},
	{"in how letters are composed", norm.NFC.String},
	{"in white space", collapseSpace},
	{"in how the number is written", dropZeroDecimals},
	{"in leading zeros", dropLeadingZeros},
}

// foldCase makes one of capitals and small letters. A folder costs more than the folding of plain text, which is most.
func foldCase(s string) string {
	s = strings.ToLower(s)
	if strings.IndexFunc(s, func(r rune) bool { return r >= utf8.RuneSelf }) < 0 {
		return s
	}
	return cases.Fold().String(s)
}

// collapseSpace makes a blank of each run of white space, and nothing of what has no width or stands at the ends.
func collapseSpace(s string) string {
	const noWidth = "\u200b\u200c\u200d\u2060\ufeff"
	s = strings.Map(func(r rune) rune {
		if strings.ContainsRune(noWidth, r) {
			return -1
		}
		return r
	}, s)
	return strings.Join(strings.FieldsFunc(s, unicode.IsSpace), " ")
}

// dropZeroDecimals takes the decimals from a whole number, which spreadsheets add to codes.
func dropZeroDecimals(s string) string {
	at := strings.IndexAny(s, ".,")
	if at > 0 && at < len(s)-1 && isDigits(s[:at]) && strings.Trim(s[at+1:], "0") == "" {
		return s[:at]
	}
	return s
}

// dropLeadingZeros takes the zeros from a number of digits alone, which spreadsheets take from codes.
func dropLeadingZeros(s string) string {
	if !isDigits(s) {
		return s
	}
	return strings.TrimLeft(s, "0")
}

// even takes the given differences away.
func even(s string, by []way) string {
	for _, w := range by {
		s = w.level(s)
	}
	return s
}

// differs says in what two keys differ that are the same once all ways are gone: the fewest ways that tell it.
func differs(a, b string) string {
	needed := ways
	for i := len(ways) - 1; i >= 0; i-- {
		var fewer []way
		for _, w := range needed {
			if w.word != ways[i].word {
				fewer = append(fewer, w)
			}
		}
		if even(a, fewer) == even(b, fewer) {
			needed = fewer
		}
	}
	var words []string
	for _, w := range needed {
		words = append(words, w.word)
	}
	return strings.Join(words, " and ")
}

// nearMisses returns the keys without a match that are written almost like a key of the side: misses, where that key
// has no match either, and likes, where another key matches it.
func (m *match) nearMisses() (misses, likes []Alike) {
	if len(m.unmatched) == 0 {
		return nil, nil
	}
	unused, used := map[string]string{}, map[string]string{}
	for _, key := range m.unused {
		remember(unused, key)
	}
	for _, key := range m.key.Level {
		if r, there := m.at[key]; there && m.taken[r] {
			remember(used, key)
		}
	}
	for _, key := range m.unmatched {
		plain := even(key, ways)
		if of, near := unused[plain]; near {
			misses = append(misses, Alike{key, of, differs(key, of)})
		} else if of, near := used[plain]; near {
			likes = append(likes, Alike{key, of, differs(key, of)})
		}
	}
	return misses, likes
}

// remember keeps the first key of those that are alike.
func remember(keys map[string]string, key string) {
	plain := even(key, ways)
	if _, seen := keys[plain]; !seen {
		keys[plain] = key
	}
}

// refuseNearMisses names keys that were probably meant to match. To mend them would be to guess: 7 and 007 may be two
// places.
func (w *joining) refuseNearMisses() error {
	for _, m := range w.sides {
		misses, likes := m.nearMisses()
		m.report.Alike = likes
		if len(misses) == 0 {
			continue
		}
		var pairs []string
		for _, a := range misses[:min(5, len(misses))] {
			pairs = append(pairs, fmt.Sprintf("%q from %q %s", shorten(a.Key), shorten(a.Of), a.Differs))
		}
		return &Error{File: w.table.Source, Column: w.Key, Value: shorten(misses[0].Key),
			What:   fmt.Sprintf("keys differ from those of %s only in how they are written: %s", m.Table.Source, andMore(pairs, len(misses))),
			Advice: "make them alike in one of the two files: keys match where they are the same to the letter"}
	}
	return nil
}
