package plan

import (
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// titleWhy is the reason recorded for the title of a region's maps.
const titleWhy = "each region's maps have its name behind what is mapped"

// laying is what the settings of regions that say nothing of the model depend on.
type laying struct {
	dir    string // folder of the plan
	titled bool   // the region says its own title
}

type laidOut struct {
	settings Settings
	err      error
}

// Region returns the settings of a region, resolved: its own words over those of [defaults]. Observations is its table.
// Relative paths, that of the table among them, are taken from dir, the folder of the plan. Where the region says no
// title, it is chosen: what [defaults] says, or the response, with the region's name behind it. A smoothness that is
// pooled is not in it: it stays the default.
//
// The settings of regions share what is alike in them. The error is a *PlanError where the word to blame is said,
// which the region may do or else [defaults]; where neither does, at the head of the section.
func (b *Batch) Region(name, observations, dir string) (Settings, error) {
	n := b.find(name)
	if n != nil && n.differs() {
		return b.resolve(n, name, observations, dir)
	}
	how := laying{dir: dir, titled: n != nil && n.Settings.Title != nil}
	s, err := b.alike(how)
	if err != nil {
		return Settings{}, err
	}
	s.Observations = new(inFolder(dir, observations))
	if how.titled {
		s.Title = n.Settings.Title
	} else {
		s.Title = new(b.title(s, name))
	}
	return s, nil
}

// differs reports whether a region says more than its table and its title, which no other word depends on.
func (n *Named) differs() bool {
	for _, m := range n.section.said {
		if m.key != "observations" && m.key != "title" {
			return true
		}
	}
	return false
}

// alike returns the settings of all regions that do not differ, with a table and a title that stand for theirs.
func (b *Batch) alike(how laying) (Settings, error) {
	b.lock.Lock()
	defer b.lock.Unlock()
	laid, done := b.laid[how]
	if !done {
		var standIn Named
		if how.titled {
			standIn.Settings.Title = new("a title")
		}
		laid.settings, laid.err = b.resolve(&standIn, "a name", "a table", how.dir)
		b.laid[how] = laid
	}
	return laid.settings, laid.err
}

// mayGiveWay are the words that shape a lattice or a surface: a region that has none of the kind has no use for them.
var mayGiveWay = []string{"cell-size", "cells-across", "within", "zones", "zone-name", "max-knots", "surface-per", "surface-smoothness", "shrink"}

// resolve lays the words of one region over the defaults. A default that shapes what its own words rule out, such as
// cells_across beside at, gives way; one that other defaults rule out does not.
func (b *Batch) resolve(n *Named, name, observations, dir string) (Settings, error) {
	defaults := b.Defaults
	for {
		s := n.Settings.Over(defaults)
		s.Observations = &observations
		s, err := s.RelativeTo(dir).Resolve()
		if err == nil {
			if n.Settings.Title == nil {
				s.Choose("title", b.title(s, name), titleWhy)
			}
			return s, nil
		}
		blamed, _ := Lookup(err.(*Error).Word)
		if !n.differs() || !slices.Contains(mayGiveWay, blamed.Name) || !blamed.saidIn(&defaults) || blamed.saidIn(&n.Settings) || !b.suitTogether(dir) {
			return Settings{}, b.impossible(n, err.(*Error))
		}
		blamed.copy(&defaults, &Settings{})
	}
}

// suitTogether reports whether the defaults can be meant without a region's own words.
func (b *Batch) suitTogether(dir string) bool {
	_, err := b.alike(laying{dir: dir})
	return err == nil
}

// saidIn reports whether settings have the word; a word that there is not is in none.
func (w Word) saidIn(s *Settings) bool { return w.filled != nil && w.filled(s) }

// title is that of a region which says none itself.
func (b *Batch) title(s Settings, name string) string {
	if b.Defaults.Title != nil {
		return *b.Defaults.Title + ", " + name
	}
	return capitalised(*s.Response) + ", " + name
}

// capitalised begins a name with a capital, unless it has capitals of its own, as pH has.
func capitalised(name string) string {
	if name != strings.ToLower(name) {
		return name
	}
	first, size := utf8.DecodeRuneInString(name)
	return string(unicode.ToUpper(first)) + name[size:]
}

// impossible says where in the plan a combination of words is to blame.
func (b *Batch) impossible(n *Named, e *Error) error {
	key, message, hint := keyed(e)
	if at, own := n.section.place(key); own {
		return b.fault(at, key, message, hint)
	}
	at, said := b.defaults.place(key)
	switch {
	case said:
	case n.section.head != place{}:
		return b.fault(n.section.head, key, message, hint)
	case b.defaults.head != place{}:
		at = b.defaults.head
	default:
		at = b.regions.head.orBeginning()
	}
	if n.section.head != (place{}) {
		message += ", in region " + strconv.Quote(n.Name)
	}
	return b.fault(at, key, message, hint)
}
