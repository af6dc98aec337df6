package observe

import (
	"cmp"
	"math"
	"strings"
)

// part is what a column is asked for.
type part int

const (
	response part = iota
	trials
	denominator
	factor
	weight
	coordinateX
	coordinateY
	geometry
	linear
	category
	keep
)

// String names the part in messages about the header.
func (p part) String() string {
	return [...]string{"the response", "the trials", "the denominator", "a factor of the denominator", "the weight", "the x coordinate", "the y coordinate", "the geometry",
		"a linear covariate", "a category", "text to keep"}[p]
}

// word names the part in codes.
func (p part) word() string {
	return [...]string{"response", "trials", "denominator", "factor", "weight", "coordinate", "coordinate", "geometry", "covariate", "covariate", "text"}[p]
}

// subject names the part in reasons.
func (p part) subject() string {
	if p == trials {
		return "number of trials"
	}
	return p.word()
}

// what names the part that a field plays, in messages about the header.
func (f field) what() string {
	if f.called != "" {
		return "the " + f.called
	}
	return f.part.String()
}

// word names the part that a field plays, in codes.
func (f field) word() string {
	if f.called != "" {
		return strings.ReplaceAll(f.called, " ", "-")
	}
	return f.part.word()
}

// subject names the part that a field plays, in reasons.
func (f field) subject() string { return cmp.Or(f.called, f.part.subject()) }

func (p part) isText() bool { return p == category || p == keep }

const (
	longestLongitude = 360 // degrees: longitudes counted eastward to 360 and continued past 180 are both met
	// farthestPlane in metres is more than any plane on the globe reaches; beyond it lie marks for no value and
	// numbers whose squares lose the metres.
	farthestPlane = 1e9
)

// firstFault fills the row at hand from a record and returns the first fault it has, if any.
func (r *rows) firstFault(record []string, here Error) (Aside, bool) {
	r.limits = r.limits[:0]
	for i, f := range r.fields {
		s := r.cell(record, f)
		if f.part == geometry {
			if a, bad := r.shapeFault(f, s); bad {
				return a, true
			}
			continue
		}
		if f.part.isText() {
			if f.part == category && r.format.isMissing(s) {
				return fault(f, s, faultMissing), true
			}
			r.text[i] = s
			continue
		}
		v, bad := r.number(i, s, here)
		if bad != "" {
			return fault(f, s, bad), true
		}
		r.value[i] = v
		if code, reason := r.outOfRange(f, v); code != "" {
			if code == "positives-above-trials" {
				f = r.fields[0]
				s = r.cell(record, f)
			}
			return Aside{Column: f.name, Value: shorten(s), Code: code, Reason: reason}, true
		}
	}
	return Aside{}, false
}

// number reads a trimmed field of the row at hand, by the rule for values below a limit where the part may have them.
func (r *rows) number(i int, s string, here Error) (float64, string) {
	if r.fields[i].at == atHeight {
		return r.height()
	}
	v, bad := r.format.number(s)
	switch bad {
	case "":
		r.commas[i].numbers++
	case faultNumber, faultGrouped, faultPoint:
		if r.format.BelowLimit != Refuse && r.fields[i].mayBeBelow(r.want.Kind) {
			if limit, is := r.format.limit(s); is {
				return r.belowLimit(i, limit)
			}
		}
		bad = r.notNumber(i, s, bad, here)
	}
	return v, bad
}

// height returns the third coordinate of the row at hand.
func (r *rows) height() (float64, string) {
	if math.IsNaN(r.site.z) {
		return notANumber, faultMissing
	}
	return r.site.z, ""
}

// mayBeBelow reports whether a part may have values below a detection limit.
func (f field) mayBeBelow(kind Kind) bool {
	return f.part == linear || f.part == response && kind == Measure
}

// belowLimit returns what stands for a value below a limit. A value that is kept counts with its row.
func (r *rows) belowLimit(i int, limit float64) (float64, string) {
	switch r.format.BelowLimit {
	case AsideLimit:
		r.below[i]++
		return notANumber, faultLimit
	case HalfLimit:
		limit /= 2
	}
	r.limits = append(r.limits, i)
	return limit, ""
}

// fault describes a value that is missing or no number.
func fault(f field, value, code string) Aside {
	a := Aside{Column: f.name, Value: shorten(value), Code: code, Reason: f.subject()}
	switch code {
	case faultMissing:
		a.Code += "-" + f.word()
		a.Reason += " is missing"
	case faultInfinite:
		a.Reason += " is not finite"
	case faultLimit:
		a.Reason += " is below a detection limit"
	default:
		a.Reason += " is not a number"
	}
	return a
}

// outOfRange returns the code and reason of a finite number that its part cannot use. The response has been read
// when the trials are looked at.
func (r *rows) outOfRange(f field, v float64) (code, reason string) {
	p, whole := f.part, v == math.Trunc(v)
	switch {
	case p == response && r.want.Kind != Measure && v < 0:
		return "negative-count", "response is negative"
	case p == response && r.want.Kind != Measure && !whole:
		return "fractional-count", "response is not a whole number"
	case p == trials && v <= 0:
		return "trials-not-positive", "number of trials is not above 0"
	case p == trials && !whole:
		return "fractional-trials", "number of trials is not a whole number"
	case p == trials && r.value[0] > v:
		return "positives-above-trials", "response is above the number of trials"
	case p == denominator && v <= 0:
		return "denominator-not-positive", "denominator is not above 0"
	case p == factor && v <= 0:
		return f.word() + "-not-positive", cmp.Or(f.called, "factor of the denominator") + " is not above 0"
	case p == weight && v <= 0:
		return "weight-not-positive", "weight is not above 0"
	case p == coordinateX && r.table.Degrees && math.Abs(v) > longestLongitude:
		return "coordinates-out-of-range", "longitude is beyond -360 to 360"
	case p == coordinateX || p == coordinateY:
		return beyondPlane(math.Abs(v))
	}
	return "", ""
}

// beyondPlane returns the code and reason of a coordinate that no plane has.
func beyondPlane(size float64) (code, reason string) {
	if size > farthestPlane {
		return "coordinates-out-of-range", "coordinate is beyond -1e9 to 1e9 metres"
	}
	return "", ""
}
