package plan

import (
	"bytes"
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// expression takes the next line, or lines where a value goes over several.
func (r *planReader) expression(e *unstable.Node) error {
	if e.Kind == unstable.KeyValue {
		return r.keyValue(e)
	}
	names, first, _ := namesOf(e)
	head := bytes.LastIndexFunc(r.text[:first], func(c rune) bool { return c != ' ' && c != '\t' && c != '[' }) + 1
	head += bytes.IndexByte(r.text[head:], '[')
	if err := r.isSection(head, names); err != nil {
		return err
	}
	if e.Kind == unstable.ArrayTable {
		return r.fault(head, "["+header(names...)+"]", "has two brackets, and a section has one", "write "+header(names...))
	}
	return r.open(head, names)
}

// namesOf returns the parts of a key, and where it begins and ends.
func namesOf(e *unstable.Node) (names []string, first, end int) {
	for it := e.Key(); it.Next(); {
		n := it.Node()
		if names == nil {
			first = int(n.Raw.Offset)
		}
		names = append(names, string(n.Data))
		end = int(n.Raw.Offset + n.Raw.Length)
	}
	return names, first, end
}

// plainSections are the sections without a name of one's own.
var plainSections = []string{"defaults", "regions", "pictures"}

const (
	allSections = "the sections are [defaults], [regions], [pictures] and [region.NAME]"
	nameRegion  = "write [region.NAME] for a region by its name, or [regions] for where regions come from"
)

// isSection refuses the head of a section that no plan has.
func (r *planReader) isSection(head int, names []string) error {
	kind, more := names[0], names[1:]
	switch {
	case kind == "region" && len(more) == 1 && strings.TrimSpace(more[0]) != "":
		return nil
	case slices.Contains(plainSections, kind) && len(more) == 0:
		return nil
	}
	shown := header(names...)
	switch {
	case kind == "region" && len(more) == 0:
		return r.fault(head, shown, "names no region", nameRegion)
	case kind == "region" && len(more) > 1:
		return r.fault(head, shown, "has a section within a section",
			"a name with a dot in it stands in quotes: "+header("region", strings.Join(more, ".")))
	case kind == "region":
		return r.fault(head, shown, "has an empty name", nameRegion)
	case kind == "regions" && len(more) == 1:
		return r.fault(head, shown, "has a section within a section", "did you mean "+header("region", more[0])+"?")
	case slices.Contains(plainSections, kind):
		return r.fault(head, shown, "has a section within a section", allSections)
	}
	hint, among := allSections, plainSections
	if len(more) > 0 {
		among = []string{"region"}
	}
	if near, ok := Nearest(kind, among); ok {
		hint = "did you mean " + header(append([]string{near}, more...)...) + "?"
	}
	return r.fault(head, shown, "is no section of a plan", hint)
}

// open begins a section.
func (r *planReader) open(head int, names []string) error {
	r.names = names
	switch names[0] {
	case "defaults":
		r.section, r.take = &r.batch.defaults, (*planReader).takeDefault
	case "regions":
		r.section, r.take = &r.batch.regions, (*planReader).takeSource
	case "pictures":
		r.section, r.take = &r.batch.pictures, (*planReader).takePicture
	default:
		r.section, r.take = r.named(names[1]), (*planReader).takeOwn
	}
	at := r.cursor.place(head)
	if before := r.section.head; before != (place{}) {
		return r.batch.fault(at, r.heading(), "is there already, in line "+spoken(before.line), "put its words together")
	}
	r.section.head = at
	return nil
}

// mostAtOnce is how many regions are made room for before they are read. They take many times the space that they take
// in the plan, which may have as many in a text that are none.
const mostAtOnce = 1 << 17

// named is the section of a region, which is new unless the plan has it already.
func (r *planReader) named(region string) *section {
	b := r.batch
	if n := b.find(region); n != nil {
		return &n.section
	}
	if b.Named == nil {
		n := min(bytes.Count(r.text, []byte("\n[region."))+1, mostAtOnce)
		b.Named, b.index = make([]Named, 0, n), make(map[string]int, n)
	}
	b.index[region] = len(b.Named)
	b.Named = append(b.Named, Named{Name: region})
	return &b.Named[len(b.Named)-1].section
}
