package observe

import (
	"errors"
	"fmt"
	"strings"
)

// commas tells whether a number column is written with decimal commas where nobody said so.
type commas struct {
	numbers int   // values that are numbers as they stand
	with    int   // values that are numbers once their comma is a point
	first   Error // where the first of these stands
	certain bool  // one of these is no number with its thousands marked, or the separator speaks for decimal commas
	others  int   // values that are neither
}

// notNumber counts a value that is no number as it stands, and returns its fault. Groups of digits, and points where
// commas are decimal, refuse the table; but other rows may show that it is decimal commas that nobody told of.
func (r *rows) notNumber(i int, s, fault string, here Error) string {
	here.Column, here.Value = r.fields[i].name, shorten(s)
	c := &r.commas[i]
	if r.format.DecimalComma || !hasDecimalComma(s) {
		c.others++
	} else {
		if c.with++; c.with == 1 {
			c.first = here
		}
		c.certain = c.certain || fault != faultGrouped || r.header.origin.separator == ';'
	}
	switch fault {
	case faultGrouped:
		r.hold(here.because(fmt.Sprintf("%q has a mark between thousands, which is not read", here.Value),
			"write the number without it"+r.orDecimalComma(s)))
	case faultPoint:
		r.hold(here.because(fmt.Sprintf("%q has a decimal point, where numbers are said to have a decimal comma", here.Value),
			"write the numbers in one way, or leave out --decimal-comma, which holds for all tables"))
	}
	return faultNumber
}

// orDecimalComma adds to the advice about a number that has one mark only, which may be decimal.
func (r *rows) orDecimalComma(s string) string {
	switch {
	case r.header.origin.features:
	case r.format.DecimalComma:
		if _, fault := parseDecimal(s); fault == "" {
			return ", or leave out --decimal-comma if the point is decimal"
		}
	case hasDecimalComma(s):
		return ", or say with --decimal-comma that the comma is decimal"
	case strings.Count(s, ",") == 1 && !strings.Contains(s[strings.IndexByte(s, ','):], "."):
		return ", and say with --decimal-comma that the comma is decimal"
	}
	return ""
}

const adviceJSONNumber = "write the numbers with a point, as GeoJSON has them"

// hold keeps the first refusal that decimal commas in the rows to come may explain better.
func (r *rows) hold(err error) {
	if r.held == nil {
		r.held = err
	}
}

// explain returns the refusal of a table whose reading ended with err: text that cannot be read before all else, then
// decimal commas in most values of a number column, then what was held back, then err.
func (r *rows) explain(err error) error {
	if unread, ok := errors.AsType[*Error](err); ok && unread.Cause != nil {
		return err
	}
	for i := range r.commas {
		c := &r.commas[i]
		if c.certain && c.with > c.numbers+c.others {
			e := c.first
			e.What = fmt.Sprintf("%q has a decimal comma, like most values of the column", e.Value)
			e.Advice = "say so with --decimal-comma"
			if r.header.origin.features {
				e.Advice = adviceJSONNumber
			}
			return &e
		}
	}
	if r.held != nil {
		return r.held
	}
	return err
}
