package observe

import (
	"bytes"
	"fmt"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Format says how a table is written. The zero value finds out what can be found out. Compression and encoding are
// always found out.
type Format struct {
	Separator    rune       // between the columns; 0: comma, semicolon, tab or pipe, whichever the header has most of
	DecimalComma bool       // numbers have a decimal comma; then a comma separates columns only if it is named
	Missing      []string   // marks of a missing value beside nothing, NA, NaN and null, without blanks around them; capitals count
	BelowLimit   BelowLimit // what becomes of values below a detection limit, such as "<0.5"
}

// BelowLimit says what becomes of a value that is only known to be below a detection limit, written "<0.5" or "< 0.5"
// with a limit above 0. Only a response that is a Measure and numeric covariates have such values; elsewhere, as with
// Refuse, they are no numbers.
type BelowLimit int

const (
	Refuse     BelowLimit = iota // it is no number, and its row is set aside as that
	HalfLimit                    // half the limit stands for it
	AtLimit                      // the limit stands for it
	AsideLimit                   // its row is set aside with a code of its own, "below-limit"
)

// String names the rule as the user does: "refuse", "half", "limit" or "aside".
func (b BelowLimit) String() string {
	if b < Refuse || b > AsideLimit {
		return fmt.Sprintf("BelowLimit(%d)", int(b))
	}
	return [...]string{"refuse", "half", "limit", "aside"}[b]
}

// Validate reports a format that no table can have. Read and WholeAs call it.
func (f Format) Validate() error {
	if f.Separator != 0 && !canSeparate(f.Separator) {
		return &Error{What: fmt.Sprintf("%q cannot stand between columns", string(f.Separator)),
			Advice: "name a character that is in no name and no number, such as a semicolon"}
	}
	if f.BelowLimit < Refuse || f.BelowLimit > AsideLimit {
		return &Error{What: fmt.Sprintf("there is no rule %d for values below a limit", int(f.BelowLimit))}
	}
	return nil
}

// canSeparate reports whether a character is in no number, no name and no quotes.
func canSeparate(c rune) bool {
	return c == '\t' || c != utf8.RuneError && unicode.IsPrint(c) && !unicode.IsLetter(c) && !unicode.IsNumber(c) &&
		!strings.ContainsRune("\"'+-.<_", c)
}

// isMissing reports whether a trimmed field is a mark for no value, one of everybody's or one of the user's own.
func (f *Format) isMissing(s string) bool {
	return missing(s) || len(f.Missing) > 0 && slices.Contains(f.Missing, s)
}

// number reads a trimmed field as a number. The fault is "" for one.
func (f *Format) number(s string) (float64, string) {
	if f.isMissing(s) {
		return notANumber, faultMissing
	}
	parse := parseDecimal
	if f.DecimalComma {
		parse = parseDecimalComma
	}
	v, fault := parse(s)
	if (fault == faultNumber || fault == faultPoint) && grouped(s) {
		fault = faultGrouped
	}
	return v, fault
}

// limit reads a trimmed field as the detection limit that a value is below.
func (f *Format) limit(s string) (float64, bool) {
	below, found := strings.CutPrefix(s, "<")
	if !found {
		return 0, false
	}
	v, fault := f.number(strings.TrimSpace(below))
	return v, fault == "" && v > 0
}

// found are the separators that need not be named.
var found = []rune{',', ';', '\t', '|'}

// separator returns the character between the columns: the one that is named, or else the one that the header has
// most of outside of quotes. Where none is ahead it is a comma, or with decimal commas a semicolon.
func (f *Format) separator(head []byte, source string) (rune, error) {
	if f.Separator != 0 {
		return f.Separator, nil
	}
	count := outsideQuotes(headerLine(head))
	among := found
	if f.DecimalComma {
		among = found[1:]
	}
	best, most := among[0], 0
	for _, c := range among {
		switch {
		case count[c] > most:
			best, most = c, count[c]
		case count[c] == most:
			best = among[0]
		}
	}
	if f.DecimalComma && most == 0 && count[','] > 0 {
		return 0, &Error{File: source, What: "the header has no separator but commas, and commas are said to be decimal",
			Advice: "name the separator with --separator, or leave out --decimal-comma; both hold for all tables"}
	}
	return best, nil
}

// headerLine returns the first line on which something stands beside blanks and separators. A line end within quotes
// does not end it.
func headerLine(head []byte) []byte {
	for {
		line := firstLine(head)
		if len(line) == 0 || len(bytes.Trim(line, " \t,;|\r\n\x1a")) > 0 {
			break
		}
		head = head[len(line):]
	}
	quoted := false
	for i, c := range head {
		switch {
		case c == '"':
			quoted = !quoted
		case c == '\n' && !quoted:
			return bytes.TrimRight(head[:i], "\r")
		}
	}
	return bytes.TrimRight(head, "\r")
}

// outsideQuotes counts the ASCII characters of a line that do not stand within quotes.
func outsideQuotes(line []byte) (count [utf8.RuneSelf]int) {
	quoted := false
	for _, c := range line {
		switch {
		case c == '"':
			quoted = !quoted
		case !quoted && c < utf8.RuneSelf:
			count[c]++
		}
	}
	return count
}

// separatorWord names a separator in messages.
func separatorWord(c rune) string {
	switch c {
	case ',':
		return "comma"
	case ';':
		return "semicolon"
	case '\t':
		return "tab"
	}
	return fmt.Sprintf("%q", string(c))
}
