package observe

import (
	"strconv"
	"strings"
	"time"
)

// DateForm is how the dates of a column are written.
type DateForm string

// The forms of dates.
const (
	DateISO         DateForm = "year-month-day"
	DatePoints      DateForm = "day.month.year"
	DateDayFirst    DateForm = "day/month/year"
	DateMonthFirst  DateForm = "month/day/year"
	DateEitherFirst DateForm = "day/month/year or month/day/year"
)

// isTruth reports whether a value is a word for true or false.
func isTruth(s string) bool {
	switch strings.ToLower(s) {
	case "true", "false", "t", "f", "yes", "no", "y", "n":
		return true
	}
	return false
}

// dateCounts counts the dates of a column by the way in which they are written.
type dateCounts struct {
	iso, points, slashes int
	dayFirst, monthFirst int // of those with slashes, that can be read in one way only
}

// take counts a value if it is a date.
func (d *dateCounts) take(s string) bool {
	if len(s) < 6 || len(s) > 35 || s[0] < '0' || s[0] > '9' {
		return false
	}
	switch {
	case isISODate(s):
		d.iso++
		return true
	case strings.Count(s, ".") == 2:
		if day, month, ok := dayAndMonth(strings.Split(s, ".")); ok && day <= 31 && month <= 12 {
			d.points++
			return true
		}
	case strings.Count(s, "/") == 2:
		a, b, ok := dayAndMonth(strings.Split(s, "/"))
		if !ok || min(a, b) > 12 || max(a, b) > 31 {
			return false
		}
		d.slashes++
		switch {
		case a > 12:
			d.dayFirst++
		case b > 12:
			d.monthFirst++
		}
		return true
	}
	return false
}

// form names the way in which all dates of a column are written.
func (d *dateCounts) form() DateForm {
	switch {
	case d.iso > 0:
		return DateISO
	case d.points > 0:
		return DatePoints
	case d.dayFirst > 0 && d.monthFirst == 0:
		return DateDayFirst
	case d.monthFirst > 0 && d.dayFirst == 0:
		return DateMonthFirst
	}
	return DateEitherFirst
}

// isISODate reports whether a value is a date of ISO 8601 in full, with or without a time of day.
func isISODate(s string) bool {
	if len(s) < len(time.DateOnly) {
		return false
	}
	if _, err := time.Parse(time.DateOnly, s[:len(time.DateOnly)]); err != nil {
		return false
	}
	rest := s[len(time.DateOnly):]
	if rest == "" {
		return true
	}
	for _, form := range []string{"15:04", "15:04:05", "15:04Z07:00", "15:04:05Z07:00"} {
		if _, err := time.Parse(form, rest[1:]); err == nil {
			return rest[0] == 'T' || rest[0] == ' '
		}
	}
	return false
}

// dayAndMonth reads the first two parts of a date that ends in a year of two or four digits.
func dayAndMonth(parts []string) (first, second int, ok bool) {
	year := strings.TrimSpace(parts[2])
	if !isDigits(year) || len(year) != 2 && len(year) != 4 {
		return 0, 0, false
	}
	for i, to := range []*int{&first, &second} {
		p := strings.TrimSpace(parts[i])
		if !isDigits(p) || p == "" || len(p) > 2 {
			return 0, 0, false
		}
		*to, _ = strconv.Atoi(p) // two digits
	}
	return first, second, first > 0 && second > 0
}
