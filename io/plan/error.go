package plan

import "fmt"

// Error is a setting that cannot be taken as it was said, alone or beside others.
type Error struct {
	Word    string // name of the word
	Value   string // what was said, where the fault lies in it alone
	Message string // what is wrong

	hint string
}

// Error says which word is wrong and how.
func (e *Error) Error() string {
	if e.Value != "" {
		return fmt.Sprintf("%s: %q %s", e.Word, e.Value, e.Message)
	}
	return e.Word + ": " + e.Message
}

// Hint says what to do about it, or is empty.
func (e *Error) Hint() string { return e.hint }

// advise makes the part of an Error that a parser knows; located adds the word and what was said.
func advise(message, hint string) error { return &Error{Message: message, hint: hint} }

// blame points at the part of a list that is wrong.
func blame(part string, err error) error {
	if e, ok := err.(*Error); ok {
		e.Value = part
	}
	return err
}

func located(word, value string, err error) error {
	if e, ok := err.(*Error); ok {
		if e.Value != "" {
			value = e.Value
		}
		return &Error{Word: word, Value: value, Message: e.Message, hint: e.hint}
	}
	return &Error{Word: word, Value: value, Message: err.Error()}
}

// refuse makes an Error about a word beside others.
func refuse(word, hint, format string, args ...any) error {
	return &Error{Word: word, Message: fmt.Sprintf(format, args...), hint: hint}
}
