package plan

import "strings"

// Word is one thing that can be said about a run: a flag of the command line and a key of a plan.
type Word struct {
	Name  string // as a flag, with hyphens; Key gives the key
	Group string // heading it stands under in the help
	Arg   string // what follows it, in capitals; empty for a word that is said or not
	Help  string // a sentence or two; names every choice; the default is added by Default

	Repeat  bool // may be said several times, each adding to a list
	RunOnly bool // bears on how a run is carried out and not on what comes of it
	File    bool // the value is the path of an input file, or NAME=FILE where it is Labelled

	Labelled bool // with File: the value has a name before the path

	// Set puts value into the settings, adding to the list of a Repeat word and replacing otherwise. An empty value
	// of a word without Arg means true. The error is an *Error.
	Set func(s *Settings, value string) error

	takes  form // as a value in a plan
	filled func(*Settings) bool
	copy   func(dst, src *Settings)
	value  func(*Settings) any
}

// form is a set of the ways in which a value can be written in a plan.
type form uint8

const (
	asText form = 1 << iota
	asNumber
	asTruth
	asList // of texts
)

// formOf is how a value of type T is written in a plan.
func formOf[T any]() form {
	switch any(*new(T)).(type) {
	case string:
		return asText
	case float64, int, uint64:
		return asNumber
	case bool:
		return asTruth
	case Key:
		return asText
	case Knots, Smoothness, Reference, Amount, Levels:
		return asNumber | asText
	}
	return 0
}

// Key is the word as a key of a plan and of summary.json: with underscores.
func (w Word) Key() string { return strings.ReplaceAll(w.Name, "-", "_") }

// Flag reports whether the word is said or not, with nothing after it.
func (w Word) Flag() bool { return w.Arg == "" }

// Default returns the default in the form in which it would be said. It is empty where there is none, and for words
// without Arg and RunOnly words, whose defaults are plain or depend on the machine.
func (w Word) Default() string {
	d := Defaults()
	if !w.filled(&d) || w.Flag() || w.RunOnly {
		return ""
	}
	return spoken(w.value(&d))
}

// Lookup finds a word by its name.
func Lookup(name string) (Word, bool) {
	for _, w := range words {
		if w.Name == name {
			return w, true
		}
	}
	return Word{}, false
}

// plain is a setting that goes into summary.json as something simpler than itself.
type plain interface{ plain() any }

func simplify(v any) any {
	if p, ok := v.(plain); ok {
		return p.plain()
	}
	return v
}

// one makes a word for a field that holds one value.
func one[T any](w Word, field func(*Settings) **T, parse func(string) (T, error)) Word {
	w.takes = formOf[T]()
	w.Set = func(s *Settings, value string) error {
		v, err := parse(value)
		if err != nil {
			return located(w.Name, value, err)
		}
		*field(s) = &v
		return nil
	}
	w.filled = func(s *Settings) bool { return *field(s) != nil }
	w.copy = func(dst, src *Settings) { *field(dst) = *field(src) }
	w.value = func(s *Settings) any { return simplify(**field(s)) }
	return w
}

// several makes a word for a field that holds a list, each saying adding one to it.
func several[T any](w Word, field func(*Settings) *[]T, parse func(string) (T, error)) Word {
	w.Repeat = true
	w.Set = func(s *Settings, value string) error {
		v, err := parse(value)
		if err != nil {
			return located(w.Name, value, err)
		}
		// Copied, because settings are values and may share what the list stands on.
		*field(s) = append(append([]T(nil), *field(s)...), v)
		return nil
	}
	return listed(w, field)
}

// choices makes a word for a field that holds a list said at once, separated by commas.
func choices(w Word, field func(*Settings) *[]string, among []string) Word {
	w.Set = func(s *Settings, value string) error {
		list, err := parseChoices(value, among)
		if err != nil {
			return located(w.Name, value, err)
		}
		*field(s) = list
		return nil
	}
	return listed(w, field)
}

func listed[T any](w Word, field func(*Settings) *[]T) Word {
	w.takes = asList | asText
	w.filled = func(s *Settings) bool { return len(*field(s)) > 0 }
	w.copy = func(dst, src *Settings) { *field(dst) = *field(src) }
	w.value = func(s *Settings) any {
		list := []string{}
		for _, v := range *field(s) {
			list = append(list, spoken(simplify(v)))
		}
		return list
	}
	return w
}
