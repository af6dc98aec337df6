package plan

import (
	"bytes"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// LargestPlan is the largest plan that is read, in bytes.
const LargestPlan = 64 << 20

// ReadBatch reads a plan of many regions; name is what messages call it. It refuses all that can be seen to be wrong
// without a look at the data, except combinations of words, which Region refuses as it resolves them. The first fault
// counts. The error is a *PlanError.
//
// The plan is TOML, and go-toml says whether it is. Its check for keys that are there twice takes time with the square
// of the number of tables, so that check is made here.
func ReadBatch(text []byte, name string) (*Batch, error) {
	text = bytes.TrimPrefix(text, []byte("\xef\xbb\xbf"))
	r := &planReader{text: text, cursor: cursor{text: text}, batch: &Batch{name: name, laid: map[laying]laidOut{}}}
	if err := r.isText(); err != nil {
		return nil, err
	}
	r.parser.Reset(text)
	for r.parser.NextExpression() {
		if err := r.expression(r.parser.Expression()); err != nil {
			return nil, err
		}
	}
	if err := r.parser.Error(); err != nil {
		return nil, r.notTOML(err)
	}
	if err := r.batch.suits(); err != nil {
		return nil, err
	}
	return r.batch, nil
}

// planReader reads a plan from top to bottom.
type planReader struct {
	text   []byte
	parser unstable.Parser
	cursor cursor
	batch  *Batch

	section *section // the one that is open; nil before the first
	names   []string // of it
	take    func(*planReader, statement) error
}

// heading is the section that is open, with its brackets.
func (r *planReader) heading() string { return header(r.names...) }

// statement is a key of a section with its value.
type statement struct {
	key    string
	offset int // of the key
	value  *unstable.Node
	from   int // offset of the value
}

func (r *planReader) fault(offset int, key, message, hint string) error {
	return r.batch.fault(r.cursor.place(offset), key, message, hint)
}

// keyValue takes a key and its value in the section that is open.
func (r *planReader) keyValue(e *unstable.Node) error {
	names, offset, end := namesOf(e)
	key := shownKey(names[0])
	switch {
	case r.section == nil:
		return r.fault(offset, key, "stands before any section", strayAdvice(names))
	case len(names) > 1:
		return r.fault(offset, key, "is followed by a dot, and no key here has parts", "a section has a line of its own; "+allSections)
	}
	if before, again := r.section.place(names[0]); again {
		return r.fault(offset, key, "is said already, in line "+spoken(before.line), "keep one of the two")
	}
	at := r.cursor.place(offset)
	said := statement{key: names[0], offset: offset, value: e.Value(), from: afterEquals(r.text, end)}
	if err := r.take(r, said); err != nil {
		return err
	}
	r.section.said = append(r.section.said, mention{names[0], at})
	return nil
}

// strayAdvice says what to do with a key above all sections.
func strayAdvice(names []string) string {
	switch names[0] {
	case "defaults", "regions", "pictures", "region":
		return "a section is a line of its own, such as [defaults] or [region.North], with its words below"
	}
	if section := homeOf(strings.ReplaceAll(names[0], "-", "_")); section != "" {
		return "put it under " + section
	}
	return allSections
}

// afterEquals is where the value begins behind a key that ends at the offset.
func afterEquals(text []byte, end int) int {
	blank := func(at int) int {
		for text[at] == ' ' || text[at] == '\t' {
			at++
		}
		return at
	}
	return blank(blank(end) + 1)
}
