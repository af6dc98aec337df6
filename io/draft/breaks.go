package draft

import (
	"bytes"
	"cmp"
	"errors"
	"fmt"
	"io"
	"slices"
	"strings"

	"drumlin/io/chart"

	"github.com/pelletier/go-toml/v2"
	"github.com/pelletier/go-toml/v2/unstable"
)

// Breaks are the edges of the classes that the pictures of one kind share in a batch.
type Breaks struct {
	Picture        string // name of the file: MapFile, UncertaintyFile or RelativeFile; the classes of a chance never change
	Response, Unit string // breaks are good for no other
	Edges          []float64
}

// sharing lists the pictures whose breaks can be given, in their order.
var sharing = []string{MapFile, UncertaintyFile, RelativeFile}

// check returns what is wrong with b and the key that it is wrong with.
func (b Breaks) check() (key string, err error) {
	switch {
	case b.Picture == ChanceFile:
		return "picture", fmt.Errorf("%s always has the same classes", ChanceFile)
	case !slices.Contains(sharing, b.Picture):
		return "picture", fmt.Errorf("%q is none of the pictures that have breaks: %s", b.Picture, strings.Join(sharing, ", "))
	case b.Response == "":
		return "response", errors.New("no response is named")
	}
	return "edges", chart.CheckShared(b.Edges)
}

// order sorts by response and unit, and then as the pictures stand in a folder's list.
func (b Breaks) order(o Breaks) int {
	return cmp.Or(strings.Compare(b.Response, o.Response), strings.Compare(b.Unit, o.Unit),
		cmp.Compare(slices.Index(sharing, b.Picture), slices.Index(sharing, o.Picture)))
}

// breaksTable is Breaks as they stand in the file. Edges are checked one by one, for a word among them has no place of
// its own in the errors of the package underneath.
type breaksTable struct {
	Picture  string `toml:"picture"`
	Response string `toml:"response"`
	Unit     string `toml:"unit"`
	Edges    []any  `toml:"edges"`
}

type breaksFile struct {
	Breaks []breaksTable `toml:"breaks"`
}

const breaksHead = `# The edges of the classes that all regions of this batch share, by picture, response and unit.
# To draw another batch with the same classes and colours, such as next year's, name this file in its plan:
#
#     [pictures]
#     breaks = "path/breaks.toml"
#
# Each edge begins a class, and the last of them a class that is open. The first edge may be -inf, which leaves the
# lowest class open as well. On maps of relative risks both outermost classes are open, and the first and the last edge
# are not shown.

`

// WriteBreaks writes a file of breaks: equal lists give equal bytes, in whatever order they come. Numbers are read back
// to the last bit. It returns an error, before anything is written, for breaks that ReadBreaks would not take.
func WriteBreaks(w io.Writer, list []Breaks) error {
	list = slices.Clone(list)
	slices.SortStableFunc(list, Breaks.order)
	var file breaksFile
	for i, b := range list {
		if _, err := b.check(); err != nil {
			return fmt.Errorf("breaks of %s for %s: %w", b.Picture, b.Response, err)
		}
		if i > 0 && b.order(list[i-1]) == 0 {
			return fmt.Errorf("breaks of %s for %s are given twice", b.Picture, b.Response)
		}
		t := breaksTable{Picture: b.Picture, Response: b.Response, Unit: b.Unit}
		for _, e := range b.Edges {
			t.Edges = append(t.Edges, e)
		}
		file.Breaks = append(file.Breaks, t)
	}
	out := bytes.NewBufferString(breaksHead)
	if len(list) > 0 {
		if err := toml.NewEncoder(out).Encode(file); err != nil {
			return err
		}
	}
	_, err := out.WriteTo(w)
	return err
}

// ReadBreaks reads a file of breaks; name is the file's, for errors, which are *BreaksError. The list has the order of
// the file and may be empty.
func ReadBreaks(text []byte, name string) ([]Breaks, error) {
	var file breaksFile
	if err := toml.NewDecoder(bytes.NewReader(text)).DisallowUnknownFields().Decode(&file); err != nil {
		return nil, located(name, err)
	}
	places := placesOf(text)
	list := make([]Breaks, len(file.Breaks))
	for i, t := range file.Breaks {
		b, key, err := t.breaks()
		if err == nil {
			key, err = b.check()
		}
		if err == nil && slices.ContainsFunc(list[:i], func(o Breaks) bool { return o.order(b) == 0 }) {
			key, err = "", fmt.Errorf("breaks of %s for %s in this unit stand here a second time", b.Picture, b.Response)
		}
		if err != nil {
			at := places.of(i, key)
			return nil, &BreaksError{File: name, Line: at.Line, Column: at.Column, What: err.Error()}
		}
		list[i] = b
	}
	return list, nil
}

// breaks turns the table into Breaks, or says what is wrong with one of its keys.
func (t breaksTable) breaks() (b Breaks, key string, err error) {
	b = Breaks{Picture: t.Picture, Response: t.Response, Unit: t.Unit}
	for i, e := range t.Edges {
		switch v := e.(type) {
		case float64:
			b.Edges = append(b.Edges, v)
		case int64:
			b.Edges = append(b.Edges, float64(v))
		default:
			return b, "edges", fmt.Errorf("edges takes numbers, and number %d is none", i+1)
		}
	}
	return b, "", nil
}

// BreaksError is a file of breaks that cannot be taken as it is.
type BreaksError struct {
	File         string
	Line, Column int // from 1; 0 where there is none
	What         string
}

// Error says where and what.
func (e *BreaksError) Error() string {
	if e.Line == 0 {
		return e.File + ": " + e.What
	}
	return fmt.Sprintf("%s: line %d, column %d: %s", e.File, e.Line, e.Column, e.What)
}

// Hint shows how breaks are written.
func (e *BreaksError) Hint() string {
	return `breaks are written like this: [[breaks]] on a line, and below it picture = "map.png", response = "stems", unit = "stems per ha", edges = [0, 5, 10]`
}

// located turns an error of the TOML reader into one of ours.
func located(name string, err error) error {
	e := &BreaksError{File: name, What: strings.TrimPrefix(err.Error(), "toml: ")}
	var unknown *toml.StrictMissingError
	var wrong *toml.DecodeError
	if errors.As(err, &unknown) && len(unknown.Errors) > 0 {
		e.Line, e.Column = unknown.Errors[0].Position()
		e.What = fmt.Sprintf("there is no key %s here; a table of breaks has picture, response, unit and edges", strings.Join(unknown.Errors[0].Key(), "."))
		return e
	}
	if errors.As(err, &wrong) {
		e.Line, e.Column = wrong.Position()
		if key := wrong.Key(); len(key) > 0 && key[0] == "breaks" {
			e.What = typeOf(key[1:])
		}
	}
	return e
}

// typeOf says what a key of a table of breaks takes.
func typeOf(key []string) string {
	switch {
	case len(key) == 0:
		return "breaks are tables"
	case key[0] == "edges":
		return "edges takes a list of numbers"
	}
	return key[0] + " takes a text in quotes"
}

// places say where the tables of breaks in a file and their keys stand.
type places []map[string]unstable.Position

// of returns the place of a key of table i, or where there is none, of the table; the zero Position if that is not known.
func (p places) of(i int, key string) unstable.Position {
	if i >= len(p) {
		return unstable.Position{}
	}
	if at, ok := p[i][key]; ok {
		return at
	}
	return p[i][""]
}

// placesOf finds the tables that have a header of their own; text must be TOML.
func placesOf(text []byte) places {
	var list places
	var p unstable.Parser
	p.Reset(text)
	for p.NextExpression() {
		e := p.Expression()
		keys := e.Key()
		if !keys.Next() {
			continue
		}
		key := keys.Node()
		at := p.Shape(key.Raw).Start
		switch {
		case e.Kind == unstable.KeyValue && len(list) > 0:
			list[len(list)-1][strings.ToLower(string(key.Data))] = at
		case e.Kind != unstable.KeyValue:
			list = append(list, map[string]unstable.Position{"": at})
		}
	}
	return list
}
