package vector

import (
	"encoding/json"
	"fmt"
	"slices"
	"strings"
)

// usual are the properties looked at for a name, in this order.
var usual = []string{"name", "zone", "id"}

// Names gives each feature a name of its own. With a property it is that property's value, which must be there, be a
// text or a number, and differ from all others. Without, it is the first of "name", "zone" and "id" that all features
// have, then their member "id", else "zone 1", "zone 2" and so on. The second result says where the names came from:
// the property, "id", or "" for numbered zones.
func (s *Shapes) Names(property string) (names []string, from string, err error) {
	if property != "" {
		return s.named(property)
	}
	for _, p := range usual {
		if s.allHave(p) {
			return s.named(p)
		}
	}
	names = make([]string, len(s.Features))
	for i, f := range s.Features {
		if names[i] = label(f.ID); names[i] == "" {
			return s.numbered(), "", nil
		}
	}
	return names, "id", s.distinct(names, "id")
}

func (s *Shapes) numbered() []string {
	names := make([]string, len(s.Features))
	for i := range names {
		names[i] = fmt.Sprintf("zone %d", i+1)
	}
	return names
}

func (s *Shapes) allHave(property string) bool {
	return !slices.ContainsFunc(s.Features, func(f Feature) bool { return label(f.Properties[property]) == "" })
}

// named takes the names from a property.
func (s *Shapes) named(property string) ([]string, string, error) {
	names := make([]string, len(s.Features))
	for i, f := range s.Features {
		value, there := f.Properties[property]
		names[i] = label(value)
		switch {
		case !there:
			return nil, "", &Error{File: s.Source, Feature: i + 1, What: fmt.Sprintf("has no property %q", property), Advice: properties(f)}
		case names[i] == "":
			return nil, "", &Error{File: s.Source, Feature: i + 1, Advice: "name a property that is a text or a number in every zone with --zone-name",
				What: fmt.Sprintf("its property %q is not a name", property)}
		}
	}
	return names, property, s.distinct(names, property)
}

// label writes a property as a name; "" if it is none.
func label(value any) string {
	switch v := value.(type) {
	case string:
		return strings.TrimSpace(v)
	case json.Number:
		return v.String()
	}
	return ""
}

// distinct refuses names that are given twice.
func (s *Shapes) distinct(names []string, from string) error {
	first := map[string]int{}
	for i, name := range names {
		if at, seen := first[name]; seen {
			return &Error{File: s.Source, Feature: i + 1, What: fmt.Sprintf("has the same %q as feature %d: %q", from, at+1, shorten(name)),
				Advice: "name a property that differs between the zones with --zone-name, or join the parts of a zone in one MultiPolygon"}
		}
		first[name] = i
	}
	return nil
}

// properties lists what a feature has, stopping at about 200 characters.
func properties(f Feature) string {
	if len(f.Properties) == 0 {
		return "the feature has no properties"
	}
	var all []string
	for name := range f.Properties {
		all = append(all, name)
	}
	slices.Sort(all)
	var b strings.Builder
	b.WriteString("its properties are ")
	for i, name := range all {
		if b.Len() > 200 {
			fmt.Fprintf(&b, " and %d more", len(all)-i)
			break
		}
		if i > 0 {
			b.WriteString(", ")
		}
		fmt.Fprintf(&b, "%q", shorten(name))
	}
	return b.String()
}
