package archive

import (
	"encoding/json"
	"fmt"
	"io"
	"math"

	"drumlin/basis2d"
	"drumlin/io/internal/sealed"
	"drumlin/spatial"
)

// Version is the layout this program writes, and the newest it reads.
const Version = 1

// Limit is the size in bytes of the largest file that Write makes and Read takes.
const Limit = 1 << 30

// headLimit is the size in bytes of the longest head: a thousand levels with long names come to a quarter of it. A list
// in JSON may need a hundred times its own length in memory, so a head cannot be as long as a file may be.
const headLimit = 2 << 20

var kind = sealed.Kind{Magic: "drumlin-surface\n", Version: Version, Limit: Limit, HeadLimit: headLimit,
	Name: "saved surface", Advice: "write the surface again with drumlin map"}

// Saved is a fitted surface with what is needed to report from it as the fit did.
type Saved struct {
	Surface   spatial.State
	Program   string // version of the program that wrote it
	Reporting Reporting
	// PlaceX and PlaceY are the distinct places of the observations in the plane, in metres: distances are taken to them.
	PlaceX, PlaceY []float64
}

// Reporting says how estimates are stated. Its numbers are finite.
type Reporting struct {
	CRS        string   // code of the plane
	Degrees    bool     // places come as longitude and latitude
	Response   string   // name of the column
	Factor     float64  // estimate = mean x Factor; above 0
	Unit       string   // of the estimate
	Threshold  *float64 // in the reporting unit; nil means none
	Reference  float64  // level, in the reporting unit, that relative risks are taken against; 0 means none
	Confidence float64  // of limits, between 0 and 1
}

// check returns an error for numbers that no estimate can be stated with.
func (r Reporting) check() error {
	if !(r.Factor > 0) || math.IsInf(r.Factor, 0) || !(r.Confidence > 0 && r.Confidence < 1) || !(r.Reference >= 0) {
		return fmt.Errorf("factor %g, confidence %g and reference %g cannot be reported with", r.Factor, r.Confidence, r.Reference)
	}
	return nil
}

// DamagedError says that a file is not a whole saved surface, and why.
type DamagedError = sealed.DamagedError

// NewerError says that a file was written by a later version of the program.
type NewerError = sealed.NewerError

// head is the JSON part. NaN has no JSON form, so numbers that a fit computed travel with the arrays.
type head struct {
	Program    string
	Reporting  Reporting
	Model      spatial.Model
	Report     spatial.Report
	HasBasis   bool
	Gaps       int
	Places     int
	Levels     []string // for each of which there is a surface
	Effects    []spatial.StateEffect
	ArrayNames []string
	Lengths    []int
}

// array is a named slice of a Saved.
type array struct {
	name  string
	value *[]float64
}

// arrays lists the slices of s in the order in which they are stored; scalars are the numbers that do not come in
// slices of their own.
func arrays(s *Saved, basis *basis2d.ThinPlate, scalars *[]float64) []array {
	return []array{
		{"scalars", scalars},
		{"knot_x", &basis.KnotX}, {"knot_y", &basis.KnotY}, {"whiten", &basis.Whiten},
		{"mix", &s.Surface.Mix}, {"r", &s.Surface.R}, {"beta", &s.Surface.Beta}, {"factor", &s.Surface.Factor}, {"spread", &s.Surface.Spread},
		{"place_x", &s.PlaceX}, {"place_y", &s.PlaceY},
	}
}

// Write writes s to w; equal surfaces give equal bytes. It returns an error, before anything is written, for a surface
// that Read would not take.
func Write(w io.Writer, s Saved) error {
	if err := s.Reporting.check(); err != nil {
		return err
	}
	basis := &basis2d.ThinPlate{}
	if s.Surface.Basis != nil {
		copied := *s.Surface.Basis
		basis = &copied
	}
	var scalars []float64
	for _, p := range []*float64{&basis.CentreX, &basis.CentreY, &basis.Scale, &s.Surface.Phi} {
		take(p, &scalars)
	}
	take(&s.Surface.Report, &scalars)
	take(&s.Surface.Effect, &scalars)
	h := head{Program: s.Program, Reporting: s.Reporting, Model: s.Surface.Model, Report: s.Surface.Report,
		HasBasis: s.Surface.Basis != nil, Gaps: s.Surface.Gaps, Places: s.Surface.Places, Levels: s.Surface.Level, Effects: s.Surface.Effect}
	var floats [][]float64
	count := 0
	for _, a := range arrays(&s, basis, &scalars) {
		h.ArrayNames, h.Lengths = append(h.ArrayNames, a.name), append(h.Lengths, len(*a.value))
		floats, count = append(floats, *a.value), count+len(*a.value)
	}
	text, err := json.Marshal(h)
	if err != nil {
		return err
	}
	if size := kind.Size(len(text), count, 0); size > Limit || len(text) > headLimit {
		return &largeError{size}
	}
	return kind.Write(w, text, floats, nil)
}

// largeError says that a surface is too large to be kept.
type largeError struct{ size int64 }

func (e *largeError) Error() string {
	return fmt.Sprintf("a saved surface of %d MiB is more than is read back", (e.size+1<<20-1)>>20)
}

// Hint says what to do about it.
func (e *largeError) Hint() string {
	return "lower --max-knots, or leave saved out of --write"
}

// Read reads a saved surface. Errors are *DamagedError for a file that is not one, is cut short, altered or too large,
// *NewerError for one of a later version, and those of r. Lengths that the file states are held against its size before
// anything is made of them. That the parts belong together is for spatial.Restore to say.
func Read(r io.Reader) (Saved, error) { return readUpTo(r, Limit) }

func readUpTo(r io.Reader, limit int) (Saved, error) {
	limited := kind
	limited.Limit = int64(limit)
	text, data, err := limited.Read(r)
	if err != nil {
		return Saved{}, err
	}
	var h head
	if err := json.Unmarshal(text, &h); err != nil {
		return Saved{}, kind.Damaged("its head cannot be read: %v", err)
	}
	return h.assemble(data)
}

// assemble cuts data into the head's arrays.
func (h head) assemble(data []byte) (Saved, error) {
	s := Saved{Program: h.Program, Reporting: h.Reporting}
	s.Surface = spatial.State{Model: h.Model, Report: h.Report, Gaps: h.Gaps, Places: h.Places, Level: h.Levels, Effect: h.Effects}
	basis := &basis2d.ThinPlate{}
	var scalars []float64
	list := arrays(&s, basis, &scalars)
	if len(h.Lengths) != len(list) || len(h.ArrayNames) != len(list) {
		return Saved{}, kind.Damaged("it has %d arrays, not %d", len(h.Lengths), len(list))
	}
	for k, a := range list {
		n := h.Lengths[k]
		if h.ArrayNames[k] != a.name || n < 0 || n > len(data)/8 {
			return Saved{}, kind.Damaged("its array %q does not fit the file", h.ArrayNames[k])
		}
		*a.value = sealed.Floats(data[:8*n])
		data = data[8*n:]
	}
	if len(data) != 0 {
		return Saved{}, kind.Damaged("it holds %d bytes too many", len(data))
	}
	rest := scalars
	for _, p := range []any{&basis.CentreX, &basis.CentreY, &basis.Scale, &s.Surface.Phi, &s.Surface.Report, &s.Surface.Effect} {
		if !give(p, &rest) {
			return Saved{}, kind.Damaged("its numbers are too few")
		}
	}
	if len(rest) != 0 || len(s.PlaceX) != len(s.PlaceY) {
		return Saved{}, kind.Damaged("its arrays do not belong together")
	}
	if err := s.Reporting.check(); err != nil {
		return Saved{}, kind.Damaged("%v", err)
	}
	if h.HasBasis {
		s.Surface.Basis = basis
	}
	return s, nil
}
