package plan

import (
	"strconv"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// texts reads the elements of a list, each with its offset.
func (r *planReader) texts(e statement) (list []string, offsets []int, err error) {
	for it := e.value.Children(); it.Next(); {
		n := it.Node()
		offset := offsetOf(n, e.from)
		if n.Kind != unstable.String {
			return nil, nil, r.fault(offset, e.key, "is a list of texts in quotes, and one is "+called(n.Kind), quoteAdvice("", n))
		}
		list, offsets = append(list, string(n.Data)), append(offsets, offset)
	}
	if len(list) == 0 {
		return nil, nil, r.fault(e.from, e.key, "is an empty list", "leave it out")
	}
	return list, offsets, nil
}

// offsetOf is where an element of a list begins. The parser does not keep it of a list within a list.
func offsetOf(n *unstable.Node, list int) int {
	if n.Kind == unstable.Array {
		return list
	}
	return int(n.Raw.Offset)
}

// hasForm refuses a value that is not of the forms that its key takes.
func (r *planReader) hasForm(e statement, takes form) error {
	if takes&formOfValue(e.value.Kind) != 0 {
		return nil
	}
	hint := ""
	if takes&asText != 0 && takes&asNumber == 0 {
		hint = quoteAdvice(e.key+" = ", e.value)
	}
	return r.fault(e.from, e.key, "takes "+takes.String()+", not "+called(e.value.Kind), hint)
}

// quoteAdvice says how a value is written as text, unless it is a list or a table.
func quoteAdvice(before string, n *unstable.Node) string {
	if n.Kind == unstable.Array || n.Kind == unstable.InlineTable {
		return ""
	}
	return "write " + before + strconv.Quote(string(n.Data))
}

func (f form) String() string {
	switch f {
	case asText:
		return "text in quotes"
	case asNumber:
		return "a number without quotes"
	case asTruth:
		return "true or false without quotes"
	case asNumber | asText:
		return "a number or text in quotes"
	}
	return `text in quotes, or a list of such, as in ["a", "b"]`
}

func formOfValue(k unstable.Kind) form {
	switch k {
	case unstable.String:
		return asText
	case unstable.Integer, unstable.Float:
		return asNumber
	case unstable.Bool:
		return asTruth
	case unstable.Array:
		return asList
	}
	return 0
}

// called is what a kind of value is called in messages.
func called(k unstable.Kind) string {
	switch k {
	case unstable.String:
		return "text"
	case unstable.Integer, unstable.Float:
		return "a number"
	case unstable.Bool:
		return "true or false"
	case unstable.Array:
		return "a list"
	case unstable.InlineTable:
		return "a table"
	}
	return "a date or a time"
}

// scalar is a text, a number, or true or false, as it would be said on a command line.
func (r *planReader) scalar(key string, n *unstable.Node, offset int) (string, error) {
	said := string(n.Data)
	switch n.Kind {
	case unstable.Integer:
		v, err := strconv.ParseInt(said, 0, 64)
		if err != nil {
			return "", r.fault(offset, key, said+" is too large for a whole number of a plan", "")
		}
		said = strconv.FormatInt(v, 10)
	case unstable.Float:
		said = strings.ReplaceAll(said, "_", "")
	}
	return said, nil
}
