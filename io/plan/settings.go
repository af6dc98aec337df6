package plan

import (
	"maps"
	"path/filepath"
	"runtime"
	"slices"
	"strings"
)

// Settings are the settings of one run. Every exported field is a pointer or a slice, nil where the word was not
// said. The zero value says nothing. Settings are values: no method changes the receiver except Choose.
type Settings struct {
	Observations *string  // path of the table of observations
	Response     *string  // column
	X, Y         *string  // columns with the coordinates
	Geometry     *string  // column with a geometry as text
	CRS          *string  // what the coordinates are in
	Places       *string  // path of the file that has the places of the rows
	Join         []string // paths of the files that have columns which the observations lack
	Key          *Key
	Absent       *string // AbsentZero or AbsentMissing
	SumBy        *string // column
	Separator    *string // Comma, Semicolon, Tab or Pipe
	DecimalComma *bool
	Missing      []string // marks beside the usual ones
	BelowLimit   *string  // HalfLimit, AtLimit or AsideLimit

	People         *string // column
	Area           *string // column
	AreaUnit       *string // SquareMetres, Hectares or SquareKilometres
	Length         *string // column: the length of a strip
	LengthUnit     *string // Metres or Kilometres
	Width          *Amount // of a strip, in metres
	Detection      *Amount // share of what is there that is seen
	Effort         *string // column
	Expected       *string // column
	ExposureCV     *Amount // coefficient of variation of a factor that rows share
	ExposureStrata *string // column: the rows of a level share the factor
	Trials         *string // column
	Weight         *string // column

	Distribution   *string // Gaussian, Poisson, NegativeBinomial, Binomial, BetaBinomial, Gamma or Tweedie
	Link           *string // Identity, Log, Logit or ComplementaryLogLog
	Shape          *float64
	ExtraVariation *string // Auto, NoVariation or ScaleVariation

	Surface               *string // ThinPlate or NoSurface
	SurfacePer            *string // column
	SurfaceSmoothness     *string // SharedSmoothness or OwnSmoothness
	Shrink                *bool
	MaxKnots              *Knots
	Smoothness            *Smoothness
	SmoothnessUncertainty *string  // Auto, On or Off
	Linear                []string // columns
	Curve                 []string // columns
	CurvePer              []CurvePer
	Category              []string // columns
	Group                 []string // columns
	TestVariation         *bool
	Also                  []Alternative

	CellSize    *float64 // metres
	CellsAcross *int
	At          *string // path
	Within      *string // path
	Zones       *string // path
	ZoneName    *string // property of the zones
	Layer       []Layer
	Hold        []Hold

	Threshold  *float64 // reporting unit
	Per        *float64
	UnitLabel  *string
	Confidence *float64 // between 0 and 1
	Reference  *Reference
	Title      *string

	Isolines   *string  // Lines or Bands
	IsolinesAt *Levels  // in the reporting unit
	Write      []string // CSV, GeoJSON, TIF, Pictures, Saved
	Strict     *bool
	Seed       *uint64
	Workers    *int
	Force      *bool
	Quiet      *bool

	// why holds the reason of each value that nobody said, by word. It is never changed in place, so that copies of
	// the settings do not share it.
	why map[string]string
}

// byDefault is the reason recorded for a value that comes from Defaults.
const byDefault = "default"

// Defaults returns the settings that hold where nothing was said. This is the only place where they are written.
func Defaults() Settings {
	s := Settings{
		ExtraVariation:        new(Auto),
		Surface:               new(ThinPlate),
		SmoothnessUncertainty: new(Auto),
		TestVariation:         new(false),
		Shrink:                new(false),
		MaxKnots:              &Knots{Auto: true},
		Smoothness:            &Smoothness{By: ByREML},
		CellsAcross:           new(100),
		Per:                   new(1.0),
		Confidence:            new(0.95),
		Isolines:              new(Lines),
		Write:                 []string{CSV, GeoJSON, TIF, Pictures, Saved},
		Strict:                new(false),
		Seed:                  new(uint64(1)),
		Workers:               new(runtime.GOMAXPROCS(0)),
		Force:                 new(false),
		Quiet:                 new(false),
	}
	s.why = map[string]string{}
	for _, w := range words {
		if w.filled(&s) {
			s.why[w.Name] = byDefault
		}
	}
	return s
}

// Over returns s laid over base: what s has counts, and base fills in the rest. A list that s has replaces the list
// of base whole. Reasons recorded by Choose travel with their values.
func (s Settings) Over(base Settings) Settings {
	out := base
	out.why = maps.Clone(base.why)
	for _, w := range words {
		if !w.filled(&s) {
			continue
		}
		w.copy(&out, &s)
		delete(out.why, w.Name)
		if why := s.why[w.Name]; why != "" {
			if out.why == nil {
				out.why = map[string]string{}
			}
			out.why[w.Name] = why
		}
	}
	return out
}

// Choose sets a word to what the program chose itself and records why. A list is replaced by the one value. Choose
// panics on a word or value that does not exist, or without a reason: that is a fault of the caller, not of the data.
func (s *Settings) Choose(name, value, why string) {
	w, ok := Lookup(name)
	if !ok || why == "" {
		panic("plan: choice of an unknown word, or without a reason: " + name)
	}
	var fresh Settings
	if err := w.Set(&fresh, value); err != nil {
		panic("plan: " + err.Error())
	}
	w.copy(s, &fresh)
	s.why = maps.Clone(s.why)
	if s.why == nil {
		s.why = map[string]string{}
	}
	s.why[name] = why
}

// Said reports whether somebody said the word; a default or a choice of the program was not said.
func (s Settings) Said(name string) bool {
	w, ok := Lookup(name)
	return ok && w.filled(&s) && s.why[name] == ""
}

// Entry is one setting as it took effect.
type Entry struct {
	Key    string // the word with underscores
	Value  any    // string, float64, int, uint64, bool or []string
	Chosen bool   // the program chose the value itself, for a reason of its own
	Why    string // the reason of a choice; "default" for a default; empty for what was said
}

// Effective lists the settings that are in force, in the order of Words. It leaves out RunOnly words and defaults
// that have no bearing, and gives files by their base name, so that neither the machine nor the place of the files
// shows.
func (s Settings) Effective() []Entry {
	var list []Entry
	for _, w := range words {
		if w.RunOnly || !w.filled(&s) || (s.why[w.Name] == byDefault && s.moot(w.Name)) {
			continue
		}
		v := w.value(&s)
		if w.File {
			v = w.baseNames(v)
		}
		why := s.why[w.Name]
		list = append(list, Entry{Key: w.Key(), Value: v, Chosen: why != "" && why != byDefault, Why: why})
	}
	return list
}

// moot reports whether a default has no bearing on the run as it is.
func (s Settings) moot(name string) bool {
	switch name {
	case "cells-across":
		return s.CellSize != nil || s.At != nil
	case "max-knots", "shrink":
		return s.Surface != nil && *s.Surface == NoSurface
	case "smoothness", "smoothness-uncertainty":
		return !s.hasSmooths()
	case "extra-variation":
		d, _ := s.distribution()
		chosen := !s.Said("distribution") && (d == NegativeBinomial || d == BetaBinomial)
		return !chosen && !s.ChoosesVariation()
	case "isolines":
		return s.At != nil || !slices.Contains(s.Write, GeoJSON)
	case "per":
		d, _ := s.distribution()
		return d == Gaussian
	}
	return false
}

// hasSmooths reports whether anything has a penalty.
func (s Settings) hasSmooths() bool {
	return s.Surface == nil || *s.Surface != NoSurface || len(s.Curve)+len(s.CurvePer)+len(s.Group) > 0
}

// ChoosesVariation reports whether the data are to decide between the distribution of counts or positives and the one
// with extra variation. A distribution that was said stays, unless the choice was asked for as well; cross-validation
// cannot choose a shape.
func (s Settings) ChoosesVariation() bool {
	d, _ := s.distribution()
	free := !s.Said("distribution") || s.Said("extra-variation")
	gcv := s.Smoothness != nil && s.Smoothness.By == ByGCV
	auto := s.ExtraVariation == nil || *s.ExtraVariation == Auto
	return auto && free && !gcv && (d == Poisson || d == Binomial && s.link() == Logit)
}

// Denominator returns the kind of denominator that was named ("people", "area", "effort" or "expected") and its
// column, or two empty strings. Strips that are told by their length and width are areas; the column is that of the length.
func (s Settings) Denominator() (kind, column string) {
	for _, d := range s.denominators() {
		return d.kind, d.column
	}
	return "", ""
}

// Exposure is the columns that the denominator is multiplied from, beside its own: the width of a strip and the share that
// is detected, where they are columns.
func (s Settings) Exposure() []string {
	var list []string
	for _, a := range []*Amount{s.Width, s.Detection} {
		if a != nil && a.Column != "" {
			list = append(list, a.Column)
		}
	}
	return list
}

type denominator struct{ word, kind, column string }

func (s Settings) denominators() []denominator {
	var list []denominator
	for _, d := range []struct {
		word, kind string
		column     *string
	}{
		{"people", "people", s.People}, {"area", "area", s.Area}, {"length", "area", s.Length},
		{"effort", "effort", s.Effort}, {"expected", "expected", s.Expected},
	} {
		if d.column != nil {
			list = append(list, denominator{d.word, d.kind, *d.column})
		}
	}
	return list
}

// baseNames takes the folders from a path, or from each of a list.
func (w Word) baseNames(v any) any {
	list, several := v.([]string)
	if !several {
		return filepath.Base(v.(string))
	}
	for i, value := range list {
		label, path := w.split(value)
		list[i] = label + filepath.Base(path)
	}
	return list
}

// split parts a value into what stands before the path, and the path.
func (w Word) split(value string) (label, path string) {
	if w.Labelled {
		if at := strings.IndexByte(value, '='); at >= 0 {
			return value[:at+1], value[at+1:]
		}
	}
	return "", value
}

// Files returns the paths of the input files, in the order of Words.
func (s Settings) Files() []string {
	var list []string
	for _, w := range words {
		if w.File && w.filled(&s) {
			list = append(list, w.paths(&s)...)
		}
	}
	return list
}

// paths are the files that a word names.
func (w Word) paths(s *Settings) []string {
	var list []string
	for _, value := range w.values(s) {
		_, path := w.split(value)
		list = append(list, path)
	}
	return list
}

// values are what was said of a word about files.
func (w Word) values(s *Settings) []string {
	switch v := w.value(s).(type) {
	case string:
		return []string{v}
	case []string:
		return v
	}
	return nil
}

// RelativeTo returns s with every relative path of an input file taken from dir.
func (s Settings) RelativeTo(dir string) Settings {
	for _, w := range words {
		if !w.File || !w.filled(&s) {
			continue
		}
		var moved Settings
		for _, value := range w.values(&s) {
			label, path := w.split(value)
			if !filepath.IsAbs(path) {
				path = filepath.Join(dir, path)
			}
			if err := w.Set(&moved, label+path); err != nil {
				panic("plan: " + err.Error()) // a path that was accepted once is accepted with a folder before it
			}
		}
		w.copy(&s, &moved)
	}
	return s
}
