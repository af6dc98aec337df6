package archive

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/json"
	"fmt"
	"io"
	"math"

	"drumlin/basis2d"
	"drumlin/spatial"
)

// Version is the layout this program writes, and the newest it reads.
const Version = 1

// magic names the kind of file.
const magic = "drumlin-surface\n"

// Limit is the size in bytes of the largest file that Write makes and Read takes.
const Limit = 1 << 30

// headLimit is the size in bytes of the longest head: a thousand levels with long names come to a quarter of it. A list
// in JSON may need a hundred times its own length in memory, so a head cannot be as long as a file may be.
const headLimit = 2 << 20

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

// DamagedError says that a file is not a whole saved surface. What says why; its subject is the file.
type DamagedError struct{ What string }

// Error returns What.
func (e *DamagedError) Error() string { return e.What }

// Hint says what to do about it.
func (e *DamagedError) Hint() string { return "write the surface again with drumlin map" }

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
	list, size := arrays(&s, basis, &scalars), 0
	for _, a := range list {
		h.ArrayNames, h.Lengths = append(h.ArrayNames, a.name), append(h.Lengths, len(*a.value))
		size += 8 * len(*a.value)
	}
	text, err := json.Marshal(h)
	if err != nil {
		return err
	}
	if size += fixed + len(text) + sha256.Size; size > Limit || len(text) > headLimit {
		return &largeError{size}
	}
	return write(w, text, list)
}

// largeError says that a surface is too large to be kept.
type largeError struct{ size int }

func (e *largeError) Error() string {
	return fmt.Sprintf("a saved surface of %d MiB is more than is read back", (e.size+1<<20-1)>>20)
}

// Hint says what to do about it.
func (e *largeError) Hint() string {
	return "lower --max-knots, or leave saved out of --write"
}

// write writes the file's parts one after the other.
func write(w io.Writer, head []byte, list []array) error {
	sum := sha256.New()
	out := io.MultiWriter(w, sum)
	var b bytes.Buffer
	b.WriteString(magic)
	b.Write(binary.LittleEndian.AppendUint32(nil, Version))
	b.Write(binary.LittleEndian.AppendUint32(nil, uint32(len(head))))
	b.Write(head)
	for _, a := range list {
		for _, v := range *a.value {
			b.Write(binary.LittleEndian.AppendUint64(b.AvailableBuffer(), math.Float64bits(v)))
		}
		if _, err := b.WriteTo(out); err != nil {
			return err
		}
	}
	_, err := w.Write(sum.Sum(nil))
	return err
}

// Read reads a saved surface. Errors are *DamagedError for a file that is not one, is cut short, altered or too large,
// *NewerError for one of a later version, and those of r. Lengths that the file states are held against its size before
// anything is made of them. That the parts belong together is for spatial.Restore to say.
func Read(r io.Reader) (Saved, error) { return readUpTo(r, Limit) }

func readUpTo(r io.Reader, limit int) (Saved, error) {
	raw, err := io.ReadAll(io.LimitReader(r, int64(limit)+1))
	if err != nil {
		return Saved{}, err
	}
	if len(raw) > limit {
		return Saved{}, damaged("it is larger than %d MiB, which no saved surface is", limit>>20)
	}
	return parse(raw)
}

// NewerError says that a file was written by a later version of the program.
type NewerError struct{ Version uint32 } // of the layout

// Error says which layout the file has and which are known.
func (e *NewerError) Error() string {
	return fmt.Sprintf("it has layout %d, and this program knows layouts up to %d", e.Version, Version)
}

// Hint says what to do about it.
func (e *NewerError) Hint() string {
	return "use the version of drumlin that wrote it, or a later one"
}

func damaged(format string, args ...any) error {
	return &DamagedError{What: fmt.Sprintf(format, args...)}
}

const fixed = len(magic) + 8 // bytes before the head

func parse(raw []byte) (Saved, error) {
	if !bytes.HasPrefix(raw, []byte(magic)) {
		return Saved{}, damaged("it is not a saved surface")
	}
	if len(raw) < fixed+sha256.Size {
		return Saved{}, damaged("it is cut short")
	}
	if v := binary.LittleEndian.Uint32(raw[len(magic):]); v > Version {
		return Saved{}, &NewerError{v}
	} else if v == 0 {
		return Saved{}, damaged("it has layout 0, which there never was")
	}
	body := raw[:len(raw)-sha256.Size]
	if sum := sha256.Sum256(body); !bytes.Equal(sum[:], raw[len(body):]) {
		return Saved{}, damaged("it is cut short or altered: its checksum does not agree")
	}
	n := int64(binary.LittleEndian.Uint32(raw[len(magic)+4:]))
	if n > int64(len(body)-fixed) {
		return Saved{}, damaged("its head is longer than the file")
	}
	if n > headLimit {
		return Saved{}, damaged("its head is longer than %d MiB, which no head is", headLimit>>20)
	}
	var h head
	if err := json.Unmarshal(body[fixed:fixed+int(n)], &h); err != nil {
		return Saved{}, damaged("its head cannot be read: %v", err)
	}
	return h.assemble(body[fixed+int(n):])
}

// assemble cuts data into the head's arrays.
func (h head) assemble(data []byte) (Saved, error) {
	s := Saved{Program: h.Program, Reporting: h.Reporting}
	s.Surface = spatial.State{Model: h.Model, Report: h.Report, Gaps: h.Gaps, Places: h.Places, Level: h.Levels, Effect: h.Effects}
	basis := &basis2d.ThinPlate{}
	var scalars []float64
	list := arrays(&s, basis, &scalars)
	if len(h.Lengths) != len(list) || len(h.ArrayNames) != len(list) {
		return Saved{}, damaged("it has %d arrays, not %d", len(h.Lengths), len(list))
	}
	for k, a := range list {
		n := h.Lengths[k]
		if h.ArrayNames[k] != a.name || n < 0 || n > len(data)/8 {
			return Saved{}, damaged("its array %q does not fit the file", h.ArrayNames[k])
		}
		*a.value = numbers(data[:8*n])
		data = data[8*n:]
	}
	if len(data) != 0 {
		return Saved{}, damaged("it holds %d bytes too many", len(data))
	}
	rest := scalars
	for _, p := range []any{&basis.CentreX, &basis.CentreY, &basis.Scale, &s.Surface.Phi, &s.Surface.Report, &s.Surface.Effect} {
		if !give(p, &rest) {
			return Saved{}, damaged("its numbers are too few")
		}
	}
	if len(rest) != 0 || len(s.PlaceX) != len(s.PlaceY) {
		return Saved{}, damaged("its arrays do not belong together")
	}
	if err := s.Reporting.check(); err != nil {
		return Saved{}, damaged("%v", err)
	}
	if h.HasBasis {
		s.Surface.Basis = basis
	}
	return s, nil
}

func numbers(data []byte) []float64 {
	if len(data) == 0 {
		return nil
	}
	v := make([]float64, len(data)/8)
	for i := range v {
		v[i] = math.Float64frombits(binary.LittleEndian.Uint64(data[8*i:]))
	}
	return v
}
