package observe

import (
	"fmt"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// Error is a refusal of a whole table: what is wrong and where. Fields that do not apply are zero.
type Error struct {
	File   string // name of the source
	Line   int    // line of the file; the header stands on line 1
	Row    int    // row below the header, or feature, from 1
	Column string // name of the column
	Value  string // what stands there, cut short after 60 characters
	What   string // what is wrong, in words
	Advice string // what to do about it
	Cause  error  // the error of the reader underneath
}

// Error gives the place and then what is wrong, in one line.
func (e *Error) Error() string {
	var parts, where []string
	if e.File != "" {
		parts = append(parts, e.File)
	}
	switch {
	case e.Row > 0:
		where = append(where, fmt.Sprintf("row %d (line %d)", e.Row, e.Line))
	case e.Line > 0:
		where = append(where, fmt.Sprintf("line %d", e.Line))
	}
	if e.Column != "" {
		where = append(where, fmt.Sprintf("column %q", shorten(e.Column)))
	}
	if len(where) > 0 {
		parts = append(parts, strings.Join(where, ", "))
	}
	return strings.Join(append(parts, e.What), ": ")
}

// because returns the error with what is wrong at its place. The place itself, made for every row, stays off the heap.
func (e Error) because(what, advice string) error {
	e.What, e.Advice = what, advice
	return &e
}

// Hint says what to do; it is empty where there is nothing to add.
func (e *Error) Hint() string { return e.Advice }

// Unwrap returns the error of the reader underneath, if that was the cause.
func (e *Error) Unwrap() error { return e.Cause }

const (
	adviceXY      = "name the coordinate columns with --x and --y"
	adviceDegrees = adviceXY + ", or say what they are with --crs"
)

// columnList writes the names of the header for a message, stopping at about 200 characters.
func columnList(names []string) string {
	var b strings.Builder
	b.WriteString("the columns are ")
	for i, name := range names {
		if b.Len() > 200 {
			fmt.Fprintf(&b, " and %d more", len(names)-i)
			break
		}
		if i > 0 {
			b.WriteString(", ")
		}
		b.WriteString(plainOrQuoted(shorten(name)))
	}
	return b.String()
}

// plainOrQuoted quotes a name that would be hard to tell from its neighbours in a list.
func plainOrQuoted(s string) string {
	odd := func(r rune) bool {
		return r != '_' && r != '.' && r != '-' && !unicode.IsLetter(r) && !unicode.IsDigit(r)
	}
	if s == "" || strings.ContainsFunc(s, odd) {
		return strconv.Quote(s)
	}
	return s
}

// nearest returns the name that a typing error most likely meant, or "" if none is within a third of its length. Case
// does not count.
func nearest(name string, names []string) string {
	wanted := []rune(strings.ToLower(name))
	best, least := "", max(1, len(wanted)/3)+1
	for _, candidate := range names {
		r := []rune(strings.ToLower(candidate))
		if candidate == "" || len(r) > 2*len(wanted)+2 {
			continue // further than the limit in any case; also keeps the work on a hostile header small
		}
		if d := edits(wanted, r); d < least {
			best, least = candidate, d
		}
	}
	return best
}

// edits counts the insertions, deletions, substitutions and swaps of neighbours that turn a into b, no place being
// edited twice (the restricted form of F. Damerau 1964, Comm. ACM 7:171-176).
func edits(a, b []rune) int {
	before, last := make([]int, len(b)+1), make([]int, len(b)+1)
	for j := range last {
		last[j] = j
	}
	for i := range a {
		row := make([]int, len(b)+1)
		row[0] = i + 1
		for j := range b {
			change := 1
			if a[i] == b[j] {
				change = 0
			}
			row[j+1] = min(last[j+1]+1, row[j]+1, last[j]+change)
			if i > 0 && j > 0 && a[i] == b[j-1] && a[i-1] == b[j] {
				row[j+1] = min(row[j+1], before[j-1]+1)
			}
		}
		before, last = last, row
	}
	return last[len(b)]
}

// several writes a number of things.
func several(n int, thing string) string {
	if n == 1 {
		return "1 " + thing
	}
	return fmt.Sprintf("%d %ss", n, thing)
}

// shorten cuts a value after 60 characters, and copies it so that it does not hold on to the line it came from.
func shorten(s string) string {
	const most = 60
	if len(s) <= most {
		return strings.Clone(s)
	}
	n := 0
	for i := range s {
		if n == most {
			return s[:i] + "..."
		}
		n++
	}
	return strings.Clone(s)
}

// clean reports whether a field is text: UTF-8 without NUL.
func clean(s string) bool { return utf8.ValidString(s) && strings.IndexByte(s, 0) < 0 }
