package main

import (
	"context"
	"errors"
	"fmt"
	"io"
)

// usageError is a request that cannot be carried out as it was put.
type usageError struct{ message, hint string }

func (e *usageError) Error() string { return e.message }
func (e *usageError) Hint() string  { return e.hint }

func misuse(hint, format string, args ...any) error {
	return &usageError{message: fmt.Sprintf(format, args...), hint: hint}
}

// complain prints an error, the only place where one is printed: a line that says what is wrong and, where there is
// advice, a line that says what to do.
func complain(w io.Writer, err error) {
	if errors.Is(err, context.Canceled) {
		fmt.Fprintln(w, "drumlin: interrupted")
		return
	}
	fmt.Fprintf(w, "drumlin: %v\n", err)
	if hint := hintOf(err); hint != "" {
		fmt.Fprintf(w, "hint: %s\n", hint)
	}
}

// hintOf returns the outermost advice that the error or one that it wraps carries.
func hintOf(err error) string {
	for err != nil {
		var advisor interface {
			error
			Hint() string
		}
		if !errors.As(err, &advisor) {
			return ""
		}
		if hint := advisor.Hint(); hint != "" {
			return hint
		}
		err = errors.Unwrap(advisor)
	}
	return ""
}
