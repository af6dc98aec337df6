package plan

import "strings"

// Nearest finds the candidate that most looks like word, for a "did you mean". It reports false where none is near
// enough to be meant: more than a third of the letters would have to change. Of equally near ones the first counts.
func Nearest(word string, among []string) (string, bool) {
	best, least := "", 0
	for _, candidate := range among {
		d := edits(strings.ToLower(word), strings.ToLower(candidate))
		if best == "" || d < least {
			best, least = candidate, d
		}
	}
	letters := max(len([]rune(word)), len([]rune(best)))
	return best, best != "" && least*3 <= letters
}

// edits counts the insertions, deletions, replacements and swaps of neighbours that turn a into b, no letter being
// touched twice (the restricted form of Damerau's distance, Comm. ACM 7:171-176, 1964).
func edits(a, b string) int {
	s, t := []rune(a), []rune(b)
	before, above, row := make([]int, len(t)+1), make([]int, len(t)+1), make([]int, len(t)+1)
	for j := range above {
		above[j] = j
	}
	for i := 1; i <= len(s); i++ {
		row[0] = i
		for j := 1; j <= len(t); j++ {
			change := 1
			if s[i-1] == t[j-1] {
				change = 0
			}
			row[j] = min(above[j]+1, row[j-1]+1, above[j-1]+change)
			if i > 1 && j > 1 && s[i-1] == t[j-2] && s[i-2] == t[j-1] {
				row[j] = min(row[j], before[j-2]+1)
			}
		}
		before, above, row = above, row, before
	}
	return above[len(t)]
}
