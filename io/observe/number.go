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

// parseNumber reads a trimmed field as a finite decimal number, with or without an exponent. The fault is "" for a
// number. Hexadecimal, digits grouped by underscores or commas, and a decimal comma are not numbers here.
func parseNumber(s string) (float64, string) {
	if missing(s) {
		return math.NaN(), faultMissing
	}
	if strings.ContainsAny(s, "xX_") {
		return math.NaN(), faultNumber
	}
	v, err := strconv.ParseFloat(s, 64)
	switch {
	case math.IsInf(v, 0): // written so, or beyond the largest number
		return math.NaN(), faultInfinite
	case err != nil && !errors.Is(err, strconv.ErrRange), math.IsNaN(v):
		return math.NaN(), faultNumber
	}
	return v, ""
}
