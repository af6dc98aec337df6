package observe

import (
	"errors"
	"math"
	"strconv"
	"strings"
)

// Faults of a single value, as used in the codes of rows set aside.
const (
	faultMissing  = "missing"
	faultNumber   = "not-a-number"
	faultInfinite = "not-finite"
	faultLimit    = "below-limit"
	faultGrouped  = "digits-in-groups" // refuses the table
	faultPoint    = "decimal-point"    // where numbers have a decimal comma; refuses the table
)

// missing reports whether a trimmed field is one of the marks for no value: nothing, NA, NaN or null, in any
// mixture of capitals.
func missing(s string) bool {
	switch len(s) {
	case 0:
		return true
	case 2:
		return strings.EqualFold(s, "na")
	case 3:
		return strings.EqualFold(s, "nan")
	case 4:
		return strings.EqualFold(s, "null")
	}
	return false
}

var notANumber = math.NaN()

// parseDecimal reads a trimmed field that is not missing as a finite decimal number, with or without an exponent. The fault
// is "" for a number. Hexadecimal, digits grouped by underscores or commas, and a decimal comma are not numbers here.
func parseDecimal(s string) (float64, string) {
	if strings.ContainsAny(s, "xX_") {
		return notANumber, faultNumber
	}
	v, err := strconv.ParseFloat(s, 64)
	switch {
	case math.IsInf(v, 0): // written so, or beyond the largest number
		return notANumber, faultInfinite
	case err != nil && !errors.Is(err, strconv.ErrRange), math.IsNaN(v):
		return notANumber, faultNumber
	}
	return v, ""
}

// parseDecimalComma is parseDecimal where a comma takes the place of the point. A number with a point has a fault of
// its own: the point may be decimal, or stand between thousands.
func parseDecimalComma(s string) (float64, string) {
	if strings.IndexByte(s, '.') < 0 {
		return parseDecimal(strings.Replace(s, ",", ".", 1))
	}
	if _, fault := parseDecimal(s); fault == "" {
		return notANumber, faultPoint
	}
	return notANumber, faultNumber
}

// hasDecimalComma reports whether a trimmed field would be a number if its comma were a point.
func hasDecimalComma(s string) bool {
	if strings.IndexByte(s, ',') < 0 || strings.IndexByte(s, '.') >= 0 {
		return false
	}
	_, fault := parseDecimal(strings.Replace(s, ",", ".", 1))
	return fault == ""
}

// grouped reports whether a trimmed field is a number whose digits stand in groups of three, as in "1,234.5",
// "1.234,5" or "1 234". Such numbers start with a digit other than 0.
func grouped(s string) bool {
	s = strings.TrimLeft(s, "+-")
	if s == "" || s[0] < '1' || s[0] > '9' {
		return false
	}
	for _, by := range []struct{ group, decimal string }{
		{",", "."}, {".", ","}, {" ", ""}, {"'", ""}, {"\u2019", ""}, {"\u00a0", ""}, {"\u202f", ""},
	} {
		if groupedBy(s, by.group, by.decimal) {
			return true
		}
	}
	return false
}

// groupedBy is grouped for one mark between the groups and one before the decimals; "" is a point or a comma.
func groupedBy(s, group, decimal string) bool {
	if decimal == "" {
		return groupedBy(s, group, ".") || groupedBy(s, group, ",")
	}
	whole, decimals, _ := strings.Cut(s, decimal)
	groups := strings.Split(whole, group)
	if len(groups) < 2 || len(groups[0]) > 3 || !isDigits(groups[0]) || !isDigits(decimals) {
		return false
	}
	for _, g := range groups[1:] {
		if len(g) != 3 || !isDigits(g) {
			return false
		}
	}
	return true
}

func isDigits(s string) bool { return strings.Trim(s, "0123456789") == "" }
