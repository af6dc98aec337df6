package observe

import (
	"fmt"
	"strings"
	"unicode"
)

// adviceForCell says what to do about a trimmed value that stands where a number should; "" where it is not known.
func adviceForCell(s string, format *Format) string {
	isNumber := func(s string) bool {
		_, fault := format.number(strings.TrimSpace(s))
		return fault == ""
	}
	trimmed, percent := strings.CutSuffix(s, "%")
	switch {
	case isMark(s):
		return fmt.Sprintf("say with --missing=%s that it stands for a missing value", shellWord(s))
	case strings.HasPrefix(s, "#"):
		return "correct the formula in the spreadsheet, or leave the cell empty"
	case isTruth(s):
		return "write 1 for true and 0 for false"
	case new(dateCounts).take(s):
		return "a date is no number: write the days since a first day, or take the column for a category"
	case isNumber(plainMinus(s)):
		return "write a plain hyphen as the minus sign"
	case percent && isNumber(trimmed):
		return "take the % away, and divide by 100 if a share is meant"
	case strings.HasPrefix(s, "(") && strings.HasSuffix(s, ")") && isNumber(strings.Trim(s, "()")):
		return "write negative numbers with a minus sign"
	case isAngle(s):
		return "write degrees as decimal numbers, west and south as negative ones"
	}
	switch unit := unitOf(s, format); {
	case unit == "":
		return ""
	case len(unit) == 1 && strings.Contains("OolI", unit):
		return fmt.Sprintf("%q is a letter: write the digit", unit)
	default:
		return fmt.Sprintf("take %q out of the cells", unit)
	}
}

// isMark reports whether a value is one of the marks for a missing value that are met beside those that are known.
func isMark(s string) bool {
	switch strings.ToLower(s) {
	case "n/a", "#n/a", "n.a.", "nd", "n.d.", "none", "nil", "missing", "unknown", "-", "--", "---", "\u2013", "\u2014", ".", "..", "...", "?", "*", "x":
		return true
	}
	return false
}

// shellWord writes a word for a command line, in quotes where a shell would take it for something else.
func shellWord(s string) string {
	if strings.ContainsAny(s, "#?*") {
		return "'" + s + "'"
	}
	return s
}

// plainMinus puts a hyphen in the place of a sign at the start that looks like one.
func plainMinus(s string) string {
	for _, minus := range []string{"\u2212", "\u2010", "\u2011", "\u2012", "\u2013", "\u2014", "\ufe63", "\uff0d"} {
		if number, is := strings.CutPrefix(s, minus); is {
			return "-" + strings.TrimSpace(number)
		}
	}
	return s
}

// isAngle reports whether a value is written with marks of degrees or with a point of the compass, such as "46°12'" or
// "12.5 N".
func isAngle(s string) bool {
	rest := strings.Trim(s, "NSEWOnsewo ")
	if rest == "" || strings.ContainsFunc(rest, func(c rune) bool {
		return !unicode.IsDigit(c) && !strings.ContainsRune(".,-+ \u00b0\u00ba\u2032\u2033'\"\u2019\u201d:", c)
	}) {
		return false
	}
	marked := strings.ContainsAny(rest, "\u00b0\u00ba\u2032\u2033'\"\u2019\u201d")
	compass := strings.Trim(s, "NSEWnsew ") == rest && strings.Trim(s, " ") != rest
	return marked || compass
}

// unitOf returns the sign or the word that stands behind a number or before it; "" where there is none, or where what
// remains is no number.
func unitOf(s string, format *Format) string {
	isDigit := func(c rune) bool { return c >= '0' && c <= '9' }
	from, to := strings.IndexFunc(s, isDigit), strings.LastIndexFunc(s, isDigit)+1
	if from < 0 || strings.ContainsAny(s, "<>~=") {
		return ""
	}
	if from > 0 && strings.ContainsRune("+-.,", rune(s[from-1])) {
		from--
	}
	if digits := strings.IndexFunc(s[from:], unicode.IsLetter); from == 0 && digits > 0 {
		to = digits // a unit may have digits of its own, as in "3 m2"
	}
	number := strings.TrimSpace(s[from:to])
	before, behind := strings.TrimSpace(s[:from]), strings.TrimSpace(s[to:])
	unit := before + behind
	within := strings.IndexFunc(strings.TrimRight(unit, "0123456789"), isDigit) >= 0 // as in 0x1F
	if _, fault := format.number(number); fault != "" || (before == "") == (behind == "") || within || strings.ContainsAny(unit, "_ ") {
		return ""
	}
	return unit
}
