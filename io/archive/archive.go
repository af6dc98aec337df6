// Package archive stores a fitted surface in a file of its own kind, saved.surface, and reads it back.
//
// The file is, in this order: sixteen bytes that name the kind; the version of the layout and the length of the head, 32-bit
// each; the head, JSON with everything that is not an array of numbers; the arrays, 64-bit IEEE numbers one after the other
// in the order of the head's lengths; and the SHA-256 of all that. Integers and numbers are little-endian. Numbers are
// stored to the last bit, so that a surface read back predicts what the fitted one did.
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

// Limit is the size in bytes of the largest file that Read takes.
const Limit = 1 << 30

// Saved is a fitted surface with what is needed to report from it as the fit did.
type Saved struct {
	Surface   spatial.State
	Program   string // version of the program that wrote it
	Reporting Reporting
	// PlaceX and PlaceY are the distinct places of the observations in the plane: distances are taken to them.
	PlaceX, PlaceY []float64
}

// Reporting says how estimates are stated.
type Reporting struct {
	CRS        string // code of the plane
	Degrees    bool   // places come as longitude and latitude
	Response   string
	Factor     float64  // estimate = mean x Factor
	Unit       string   // of the estimate
	Threshold  *float64 // in the reporting unit
	Reference  float64  // level, in the reporting unit, that relative risks are taken against; 0 means none
	Confidence float64
}

// DamagedError says that a file is not a whole saved surface.
type DamagedError struct{ What string }

func (e *DamagedError) Error() string { return e.What }

// Hint says what to do about it.
func (e *DamagedError) Hint() string { return "write the surface again with drumlin map" }

// head is the JSON part. NaN has no JSON form, so the report's numbers that can be NaN travel with the arrays.
type head struct {
	Program    string
	Reporting  Reporting
	Model      spatial.Model
	Report     spatial.Report
	HasBasis   bool
	Gaps       int
	Places     int
	Effects    []spatial.StateEffect
	ArrayNames []string
	Lengths    []int
}

// array is a named slice of a Saved.
type array struct {
	name  string
	value *[]float64
}

// arrays lists the slices of s in the order in which they are stored. scalars stands for single numbers that must keep
// every bit and may be NaN.
func arrays(s *Saved, basis *basis2d.ThinPlate, scalars *[]float64) []array {
	return []array{
		{"scalars", scalars},
		{"knot_x", &basis.KnotX}, {"knot_y", &basis.KnotY}, {"whiten", &basis.Whiten},
		{"mix", &s.Surface.Mix}, {"r", &s.Surface.R}, {"beta", &s.Surface.Beta}, {"factor", &s.Surface.Factor},
		{"place_x", &s.PlaceX}, {"place_y", &s.PlaceY},
	}
}

// scalarsOf lists pointers to the single numbers stored among the arrays.
func scalarsOf(s *Saved, basis *basis2d.ThinPlate) []*float64 {
	r := &s.Surface.Report
	return []*float64{&basis.CentreX, &basis.CentreY, &basis.Scale, &s.Surface.Phi, &r.Lambda, &r.CriterionValue, &r.Pearson,
		&r.Dispersion, &r.DevianceShare, &r.LogLikelihood, &r.AIC, &r.ProjectedGradient, &r.Deviance, &r.ConstantDev, &r.DF, &r.SurfaceDF}
}

// Write writes s to w.
func Write(w io.Writer, s Saved) error {
	basis := &basis2d.ThinPlate{}
	if s.Surface.Basis != nil {
		copied := *s.Surface.Basis
		basis = &copied
	}
	var scalars []float64
	for _, p := range scalarsOf(&s, basis) {
		scalars = append(scalars, *p)
		*p = 0 // they travel with the arrays
	}
	h := head{Program: s.Program, Reporting: s.Reporting, Model: s.Surface.Model, Report: s.Surface.Report,
		HasBasis: s.Surface.Basis != nil, Gaps: s.Surface.Gaps, Places: s.Surface.Places, Effects: s.Surface.Effect}
	list := arrays(&s, basis, &scalars)
	for _, a := range list {
		h.ArrayNames, h.Lengths = append(h.ArrayNames, a.name), append(h.Lengths, len(*a.value))
	}
	text, err := json.Marshal(h)
	if err != nil {
		return err
	}
	sum := sha256.New()
	out := io.MultiWriter(w, sum)
	var b bytes.Buffer
	b.WriteString(magic)
	b.Write(binary.LittleEndian.AppendUint32(nil, Version))
	b.Write(binary.LittleEndian.AppendUint32(nil, uint32(len(text))))
	b.Write(text)
	for _, a := range list {
		for _, v := range *a.value {
			b.Write(binary.LittleEndian.AppendUint64(b.AvailableBuffer(), math.Float64bits(v)))
		}
		if _, err := b.WriteTo(out); err != nil {
			return err
		}
	}
	_, err = w.Write(sum.Sum(nil))
	return err
}

// Read reads a saved surface. Errors are *DamagedError for a file that is not one, is cut short, altered or too large,
// and *NewerError for one of a later version.
func Read(r io.Reader) (Saved, error) {
	raw, err := io.ReadAll(io.LimitReader(r, Limit+1))
	if err != nil {
		return Saved{}, err
	}
	if len(raw) > Limit {
		return Saved{}, damaged("it is larger than %d MiB, which no saved surface is", Limit>>20)
	}
	return parse(raw)
}

// NewerError says that a file was written by a later version of the program.
type NewerError struct{ Version uint32 }

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
	var h head
	if err := json.Unmarshal(body[fixed:fixed+int(n)], &h); err != nil {
		return Saved{}, damaged("its head cannot be read: %v", err)
	}
	return h.assemble(body[fixed+int(n):])
}

// assemble cuts data into the head's arrays.
func (h head) assemble(data []byte) (Saved, error) {
	s := Saved{Program: h.Program, Reporting: h.Reporting}
	s.Surface = spatial.State{Model: h.Model, Report: h.Report, Gaps: h.Gaps, Places: h.Places, Effect: h.Effects}
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
	targets := scalarsOf(&s, basis)
	if len(scalars) != len(targets) || len(s.PlaceX) != len(s.PlaceY) {
		return Saved{}, damaged("its arrays do not belong together")
	}
	for k, p := range targets {
		*p = scalars[k]
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
