package plan

import (
	"path/filepath"
	"slices"
	"strconv"
	"strings"
	"sync"
)

// Batch is a plan of many regions, as it was read. Paths in it stand as they were said. Nothing changes it once it is
// read, and its methods may be called at the same time.
type Batch struct {
	Defaults Settings // what [defaults] says; a smoothness that is pooled is not in it

	Patterns      []string // [regions] files: a region each
	File, SplitBy string   // [regions] file, a region for each value of the column; both are set or neither is
	Margin        float64  // metres; 0 where none is said

	Own        bool      // [pictures] scale: each region has colours of its own
	Breaks     []float64 // [pictures] breaks, 2 to 12 and rising; nil where they are not said as numbers
	BreaksFile string    // [pictures] breaks, said as a path; empty where it is not

	Pooled bool    // one smoothness for all regions, estimated from all of them
	Named  []Named // each [region.NAME], in the order of the plan

	name                        string // of the plan, in messages
	defaults, regions, pictures section
	patterns                    []place        // of each of Patterns
	index                       map[string]int // of Named, by name

	lock sync.Mutex
	laid map[laying]laidOut
}

// Named is what the plan says of one region by its name.
type Named struct {
	Name     string
	Settings Settings // its own words alone; with Observations it is a region of its own

	section section
}

// section is where a section of the plan stands and what it says where.
type section struct {
	head place // zero where the plan does not have it
	said []mention
}

type mention struct {
	key string
	at  place
}

func (s section) place(key string) (place, bool) {
	for _, m := range s.said {
		if m.key == key {
			return m.at, true
		}
	}
	return place{}, false
}

// Names reports whether the plan says anything of a region by this name.
func (b *Batch) Names(region string) bool { return b.find(region) != nil }

func (b *Batch) find(region string) *Named {
	if i, ok := b.index[region]; ok {
		return &b.Named[i]
	}
	return nil
}

// section finds a section by its name without brackets and quotes: defaults, regions, pictures or region.NAME.
func (b *Batch) section(name string) section {
	switch name {
	case "defaults":
		return b.defaults
	case "regions":
		return b.regions
	case "pictures":
		return b.pictures
	}
	if region, ok := strings.CutPrefix(name, "region."); ok {
		if n := b.find(region); n != nil {
			return n.section
		}
	}
	return section{}
}

// Position returns the line and the column, from 1 and in characters, at which a section says a key, or at which the
// section begins where key is empty. A section is named without brackets and quotes: defaults, regions, pictures or
// region.NAME. Position reports false where the plan says no such thing.
func (b *Batch) Position(section, key string) (line, column int, ok bool) {
	s := b.section(section)
	at := s.head
	if key != "" {
		at, _ = s.place(key)
	}
	return int(at.line), int(at.column), at != place{}
}

// Fault makes a *PlanError of something that was found out later. It stands where the section, named as for Position,
// says the key; else where the section begins; else at the beginning of the plan. An empty key means the section as
// such, an empty value that the fault is not in the value alone. Flags in message and hint are turned into keys.
func (b *Batch) Fault(section, key, value, message, hint string) error {
	s := b.section(section)
	at, said := s.place(key)
	switch {
	case key == "files" && section == "regions" && b.patternAt(value) != place{}:
		at = b.patternAt(value)
	case !said:
		at = s.head.orBeginning()
	}
	if key == "" {
		key = bracketed(section)
	}
	if value != "" {
		message = strconv.Quote(value) + " " + message
	}
	return b.fault(at, key, InPlan(message), InPlan(hint))
}

// bracketed is a section, named as for Position, as it is written in a plan.
func bracketed(section string) string {
	if region, ok := strings.CutPrefix(section, "region."); ok {
		return header("region", region)
	}
	return header(section)
}

func (b *Batch) patternAt(pattern string) place {
	for i, p := range b.Patterns {
		if p == pattern {
			return b.patterns[i]
		}
	}
	return place{}
}

func (b *Batch) fault(at place, key, message, hint string) error {
	return &PlanError{File: b.name, Line: int(at.line), Column: int(at.column), Key: key, Message: message, hint: hint}
}

// Origin returns the section and the key that made file, a path taken from dir, an input of a region: words of its
// own before those of [defaults], and what [regions] says where no word did.
func (b *Batch) Origin(region, file, dir string) (section, key string) {
	if n := b.find(region); n != nil {
		if key, ok := n.Settings.naming(file, dir); ok {
			return "region." + region, key
		}
	}
	if key, ok := b.Defaults.naming(file, dir); ok {
		return "defaults", key
	}
	if b.File != "" {
		return "regions", "file"
	}
	return "regions", "files"
}

// naming finds the word that names a file.
func (s Settings) naming(file, dir string) (key string, ok bool) {
	for _, w := range words {
		if w.File && w.filled(&s) && slices.ContainsFunc(w.paths(&s), func(path string) bool { return inFolder(dir, path) == file }) {
			return w.Key(), true
		}
	}
	return "", false
}

// inFolder takes a relative path from a folder.
func inFolder(dir, path string) string {
	if filepath.IsAbs(path) {
		return path
	}
	return filepath.Join(dir, path)
}
