package plan

import (
	"bytes"
	"unicode/utf8"
)

// place is a line and a column of a plan, from 1 and in characters. The zero value is nowhere.
type place struct{ line, column int32 }

var beginning = place{1, 1}

func (p place) orBeginning() place {
	if p == (place{}) {
		return beginning
	}
	return p
}

func (p place) after(q place) bool {
	return p.line > q.line || p.line == q.line && p.column > q.column
}

// cursor turns offsets into places. It counts on from the last one, so that a whole plan is counted through once.
type cursor struct {
	text   []byte
	offset int
	start  int // offset at which the line begins
	line   int
}

func (c *cursor) place(offset int) place {
	if offset < c.offset {
		*c = cursor{text: c.text} // only the place of a fault lies behind
	}
	passed := c.text[c.offset:offset]
	if last := bytes.LastIndexByte(passed, '\n'); last >= 0 {
		c.line += bytes.Count(passed, []byte{'\n'})
		c.start = c.offset + last + 1
	}
	c.offset = offset
	return place{int32(c.line + 1), int32(utf8.RuneCount(c.text[c.start:offset]) + 1)}
}
