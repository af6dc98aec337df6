package plan

import (
	"fmt"
	"regexp"
	"strconv"
	"strings"
)

// PlanError is something in a plan that cannot be taken as it stands.
type PlanError struct {
	File         string // name of the plan
	Line, Column int    // from 1, the column in characters, of the key or of a value that is wrong alone; 0 for the whole plan
	Key          string // as in the plan; a section is in brackets; empty where it is neither
	Message      string // what is wrong

	hint string
}

// Error says where the plan is wrong and how.
func (e *PlanError) Error() string {
	var b strings.Builder
	b.WriteString(e.File + ": ")
	if e.Line > 0 {
		fmt.Fprintf(&b, "line %d, column %d: ", e.Line, e.Column)
	}
	if e.Key != "" {
		b.WriteString(e.Key + ": ")
	}
	b.WriteString(e.Message)
	return b.String()
}

// Hint says what to do about it, or is empty.
func (e *PlanError) Hint() string { return e.hint }

// keyed returns what an Error says as it is said of a plan.
func keyed(e *Error) (key, message, hint string) {
	return Word{Name: e.Word}.Key(), InPlan(strings.TrimPrefix(e.Error(), e.Word+": ")), InPlan(e.hint)
}

// phrase is a part of a message that is taken as one: what stands in quotes, or what stands between signs.
var phrase = regexp.MustCompile(`"(?:[^"\\]|\\.)*"|[^\s,;:?()"]+`)

// InPlan turns the flags in a message, and words with hyphens, into keys of a plan. What stands in quotes is somebody's
// own and stays, as do words that a plan does not take.
func InPlan(text string) string {
	return phrase.ReplaceAllStringFunc(text, func(part string) string {
		if w, ok := Lookup(strings.TrimPrefix(part, "--")); ok && !w.RunOnly {
			return w.Key()
		}
		return part
	})
}

// header is the head of a section with these names.
func header(names ...string) string {
	shown := make([]string, len(names))
	for i, name := range names {
		shown[i] = shownKey(name)
	}
	return "[" + strings.Join(shown, ".") + "]"
}

// shownKey is a key as it can be written in a plan: in quotes where it needs them.
func shownKey(key string) string {
	for _, c := range key {
		if !(c >= 'a' && c <= 'z' || c >= 'A' && c <= 'Z' || c >= '0' && c <= '9' || c == '-' || c == '_') {
			return strconv.Quote(key)
		}
	}
	if key == "" {
		return `""`
	}
	return key
}
