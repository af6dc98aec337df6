package chart

import (
	"math"
	"strconv"
	"strings"
)

// round12 drops the noise a product such as 3*0.1 leaves beyond the twelfth digit, so that breaks are the decimals they look like.
func round12(v float64) float64 {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 12, 64), 64)
	if err != nil {
		return v
	}
	return r
}

// numbers writes a set of break values in one manner. Values of similar size get the same number of decimals
// ("0.5", "1.0"); a set that spans decades gets as few as each needs ("0.05", "20"). Very large and very small values are powers of ten.
func numbers(v []float64) []string {
	decimals := -1
	if alike(v) {
		for _, x := range v {
			decimals = max(decimals, decimalsOf(x))
		}
	}
	s := make([]string, len(v))
	for i, x := range v {
		s[i] = number(x, decimals)
	}
	return s
}

// alike is true when the values other than zero lie within a factor of 50 and can be written without powers of ten.
func alike(v []float64) bool {
	lo, hi := math.Inf(1), 0.0
	for _, x := range v {
		if a := math.Abs(x); a > 0 {
			lo, hi = min(lo, a), max(hi, a)
		}
	}
	return hi <= 50*lo && !needsPower(lo) && !needsPower(hi)
}

func needsPower(v float64) bool {
	a := math.Abs(v)
	return a != 0 && (a < 1e-4 || a >= 1e7)
}

// decimalsOf counts the digits after the point in the shortest decimal of v, to twelve digits.
func decimalsOf(v float64) int {
	_, after, _ := strings.Cut(strconv.FormatFloat(round12(v), 'f', -1, 64), ".")
	return len(after)
}

// number writes v with the given decimals, or as few as it needs when decimals is negative.
func number(v float64, decimals int) string {
	v = round12(v)
	if needsPower(v) {
		return power(v)
	}
	s := strconv.FormatFloat(math.Abs(v), 'f', decimals, 64)
	whole, after, point := strings.Cut(s, ".")
	s = group(whole)
	if point {
		s += "." + after
	}
	if v < 0 {
		s = "−" + s
	}
	return s
}

// group sets a thin no-break space between thousands from five digits on.
func group(digits string) string {
	if len(digits) < 5 {
		return digits
	}
	var b strings.Builder
	for i, d := range digits {
		if i > 0 && (len(digits)-i)%3 == 0 {
			b.WriteRune('\u202f')
		}
		b.WriteRune(d)
	}
	return b.String()
}

// power writes v as a mantissa and a raised power of ten: "2×10⁻¹²".
func power(v float64) string {
	mantissa, exponent, _ := strings.Cut(strconv.FormatFloat(v, 'e', -1, 64), "e")
	e, _ := strconv.Atoi(exponent)
	raised := strings.Map(func(r rune) rune {
		if r == '-' {
			return '⁻'
		}
		return []rune("⁰¹²³⁴⁵⁶⁷⁸⁹")[r-'0']
	}, strconv.Itoa(e))
	return strings.Replace(mantissa, "-", "−", 1) + "×10" + raised
}

// tidy gives v to four digits, for a number that stands alone.
func tidy(v float64) string {
	r, err := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 4, 64), 64)
	if err != nil {
		return number(v, -1)
	}
	return number(r, -1)
}

// length writes metres as metres or, from a kilometre on, as kilometres.
func length(metres float64) string {
	if metres >= 1000 {
		return number(metres/1000, -1) + " km"
	}
	return number(metres, -1) + " m"
}
