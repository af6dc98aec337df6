package isolines

import "math"

// DefaultLevels is about how many levels Round gives if nothing else is said.
const DefaultLevels = 8

// A range of positive values wider than this factor gets levels that multiply (common practice, no source).
const wide = 30

// Round returns round levels strictly between least and most, ascending and about so many; about 0 means DefaultLevels.
// They are multiples of 1, 2, 2.5 or 5 times a power of ten; where all is positive and most more than 30 times least,
// they run 1, 2, 5, 10, or over powers of ten where these would be too many. There are none if the range is empty, not finite or nothing
// to nine digits.
func Round(least, most float64, about int) []float64 {
	if !finite(least) || !finite(most) || !(most-least > 1e-9*max(math.Abs(least), math.Abs(most))) {
		return nil
	}
	if about <= 0 {
		about = DefaultLevels
	}
	about = min(about, MostLevels/2) // what comes nearest can be more
	var best []float64
	consider := func(level []float64) {
		if len(level) > 0 && (best == nil || distance(len(level), about) < distance(len(best), about)-1e-12) {
			best = level
		}
	}
	if least > 0 && most/least > wide {
		consider(multiplied(least, most, []float64{1, 2, 5}, 1))
		for decades := 1; decades < 600; decades *= 2 {
			consider(multiplied(least, most, []float64{1}, decades))
		}
		return best
	}
	top := int(math.Floor(math.Log10((most/2 - least/2) / float64(about))))
	for e := top - 1; e <= top+2; e++ {
		for _, m := range []float64{1, 2, 5, 2.5} {
			consider(added(least, most, m, e))
		}
	}
	return best
}

// distance between two counts, as a ratio.
func distance(a, b int) float64 { return math.Abs(math.Log(float64(a) / float64(b))) }

// added returns the multiples of m 10^e strictly inside the range; nil if they are too many or cannot be told apart.
func added(least, most, m float64, e int) []float64 {
	step := scale(m, e)
	// What is on an end of the range but for rounding is not inside.
	first, last := math.Floor(least/step+1e-9)+1, math.Ceil(most/step-1e-9)-1
	if !finite(first) || !finite(last) || last-first >= MostLevels {
		return nil
	}
	var level []float64
	for k := first; k <= last; k++ {
		if v := scale(m*k, e); v > least && v < most && (len(level) == 0 || v > level[len(level)-1]) {
			level = append(level, v)
		}
	}
	return level
}

// multiplied returns the rungs of every so many decades strictly inside the range.
func multiplied(least, most float64, rung []float64, decades int) []float64 {
	var level []float64
	from := int(math.Floor(math.Log10(least)))
	from -= ((from % decades) + decades) % decades
	for e := from; e <= 308; e += decades {
		for _, m := range rung {
			v := scale(m, e)
			if v >= most*(1-1e-9) {
				return level
			}
			if v > least*(1+1e-9) {
				level = append(level, v)
			}
		}
	}
	return level
}

// scale is m 10^e, rounded once where that is possible.
func scale(m float64, e int) float64 {
	if e < 0 && e >= -22 {
		return m / math.Pow10(-e)
	}
	return m * math.Pow10(e)
}
