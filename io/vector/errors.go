package vector

import (
	"fmt"
	"strings"
)

// Error is a refusal of a GeoJSON text: what is wrong and where. Fields that do not apply are zero.
type Error struct {
	File    string // name of the source
	Line    int    // line of the text, from 1
	Feature int    // number of the feature in the text, from 1
	Part    string // part of its geometry, such as "polygon 2, ring 1"
	What    string // what is wrong, in words
	Advice  string // what to do about it
	Cause   error  // the error of the reader underneath
}

// Error gives the place and then what is wrong, in one line.
func (e *Error) Error() string {
	parts := []string{e.File}
	if e.Line > 0 {
		parts = append(parts, fmt.Sprintf("line %d", e.Line))
	}
	where := e.Part
	if e.Feature > 0 {
		where = strings.TrimSuffix(fmt.Sprintf("feature %d, %s", e.Feature, e.Part), ", ")
	}
	if where != "" {
		parts = append(parts, where)
	}
	return strings.Join(append(parts, e.What), ": ")
}

// Hint says what to do; it is empty where there is nothing to add.
func (e *Error) Hint() string { return e.Advice }

// Unwrap returns the error of the reader underneath, if that was the cause.
func (e *Error) Unwrap() error { return e.Cause }

// several writes a number of things.
func several(n int, thing string) string {
	if n == 1 {
		return "1 " + thing
	}
	return fmt.Sprintf("%d %ss", n, thing)
}
