package vector

import "strings"

// Fault is what keeps one feature from being used, while others can be.
type Fault struct {
	Code string // one word for programs, such as "missing-geometry" or "crossing-outlines"
	At   *Error // where and what, in words
}

// The codes of faults: those of features that are read, and those of CheckArea.
const (
	faultMissing = "missing-geometry"
	faultEmpty   = "empty-geometry"
	faultBad     = "bad-geometry"

	faultNotArea  = "not-an-area"
	faultNoArea   = "no-area"
	faultCrossing = "crossing-outlines"
	faultTangled  = "tangled-outlines"
	faultHole     = "hole-outside"
)

func newFault(code, what string) *Fault {
	return &Fault{code, &Error{What: what, Advice: adviceSkip}}
}

// Error gives the place, as far as it is known, and then what is wrong, in one line.
func (f *Fault) Error() string { return strings.TrimPrefix(f.At.Error(), ": ") }

// Hint says what to do.
func (f *Fault) Hint() string { return f.At.Advice }

// Unwrap returns At.
func (f *Fault) Unwrap() error { return f.At }
