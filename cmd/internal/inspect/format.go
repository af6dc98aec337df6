package inspect

import (
	"fmt"
	"math"
	"strconv"
	"strings"
)

// short is a number as it is shown: six digits, and all those before the point.
func short(v float64) string {
	if size := math.Abs(v); size < 1e12 && (v == math.Trunc(v) || size >= 1e5) {
		return strconv.FormatFloat(v, 'f', 0, 64)
	}
	return strconv.FormatFloat(v, 'g', 6, 64)
}

// round rounds a number to so many digits.
func round(digits int, v float64) float64 {
	rounded, err := strconv.ParseFloat(strconv.FormatFloat(v, 'e', digits-1, 64), 64)
	if err != nil {
		return v
	}
	return rounded
}

// countOf is a number with what it counts, one or several.
func countOf(n int, one, several string) string {
	if n == 1 {
		return "1 " + one
	}
	return strconv.Itoa(n) + " " + several
}

func rowsHave(n int) string  { return countOf(n, "row has", "rows have") }
func rowsStand(n int) string { return countOf(n, "row stands", "rows stand") }

// listed writes a list of names, at most eight of them.
func listed(names []string) string {
	const most = 8
	if len(names) > most {
		return fmt.Sprintf("%s and %d more", strings.Join(names[:most], ", "), len(names)-most)
	}
	if n := len(names) - 1; n > 0 {
		return strings.Join(names[:n], ", ") + " and " + names[n]
	}
	return strings.Join(names, "")
}

// quoted is a word as a POSIX shell takes it.
func quoted(word string) string {
	plain := func(c rune) bool {
		return c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c >= '0' && c <= '9' || strings.ContainsRune("-_./=:,+%@", c)
	}
	if word != "" && strings.TrimFunc(word, plain) == "" {
		return word
	}
	return "'" + strings.ReplaceAll(word, "'", `'\''`) + "'"
}
