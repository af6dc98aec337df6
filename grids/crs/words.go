package crs

import (
	"fmt"
	"strings"
)

// wordError is a word that is none of those that may stand in its place.
type wordError struct {
	what  string
	word  string
	known []string
}

func (e *wordError) Error() string {
	if near := nearestWord(e.word, e.known); near != "" {
		return fmt.Sprintf("%s %q: did you mean %s?", e.what, e.word, near)
	}
	return fmt.Sprintf("%s %q: known are %s", e.what, e.word, strings.Join(e.known, ", "))
}

// nearestWord is the known word that the fewest changes of a letter make out of word, or nothing if none is within two
// changes or a third of its letters.
func nearestWord(word string, known []string) string {
	best, least := "", 0
	for _, k := range known {
		d := changes(word, strings.ToLower(k))
		if d <= max(2, len(k)/3) && d < len(k) && (best == "" || d < least) {
			best, least = k, d
		}
	}
	return best
}

// changes is the least number of letters to put in, take out or replace (V. I. Levenshtein 1966).
func changes(a, b string) int {
	row := make([]int, len(b)+1)
	for j := range row {
		row[j] = j
	}
	for i := range len(a) {
		diagonal := row[0]
		row[0] = i + 1
		for j := range len(b) {
			replace := diagonal
			if a[i] != b[j] {
				replace++
			}
			diagonal = row[j+1]
			row[j+1] = min(replace, row[j]+1, row[j+1]+1)
		}
	}
	return row[len(b)]
}
