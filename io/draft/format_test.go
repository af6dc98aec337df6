package draft_test

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"encoding/json"
	"errors"
	"flag"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"github.com/google/go-cmp/cmp"
	"github.com/paulmach/orb"

	"drumlin/io/draft"
)

var update = flag.Bool("update", false, "write the stored draft under testdata afresh")

const (
	magic    = "drumlin-draft\n"
	headAt   = len(magic) + 8
	checksum = sha256.Size
)

func TestRoundTrip(t *testing.T) {
	for name, d := range drafts(t) {
		raw := write(t, d)
		got := read(t, raw)
		if diff := cmp.Diff(d, got, exactly...); diff != "" {
			t.Errorf("%s is not what was written (-written +read):\n%s", name, diff)
		}
		if diff := cmp.Diff(drafts(t)[name], d, exactly...); diff != "" {
			t.Errorf("%s: writing changed the draft itself:\n%s", name, diff)
		}
		if !bytes.Equal(write(t, got), raw) {
			t.Errorf("%s: read and written again, it differs", name)
		}
	}
}

// A field that is added to Draft must be stored as well: the full draft has none that is zero.
func TestEveryFieldIsInTheRoundTrip(t *testing.T) {
	v := reflect.ValueOf(full(t))
	for i := range v.NumField() {
		if v.Field(i).IsZero() {
			t.Errorf("the full draft leaves %s out", v.Type().Field(i).Name)
		}
	}
}

func TestPlacesFollowFromTheLattice(t *testing.T) {
	l := masked(t)
	_, x, y := l.Centres()
	raw := write(t, full(t))
	d := read(t, raw)
	if diff := cmp.Diff([][]float64{x, y}, [][]float64{d.X, d.Y}, exactly...); diff != "" {
		t.Errorf("centres (-lattice +draft):\n%s", diff)
	}
	moved := full(t)
	moved.Y[0] = math.Nextafter(moved.Y[0], 1e9)
	// The text of the head may differ by some digits of a length.
	if more := len(write(t, moved)) - len(raw); more < 16*len(x)-8 || more > 16*len(x)+8 {
		t.Errorf("%d places take %d bytes", len(x), more)
	}
}

// A text that is not UTF-8 is stored as it would be drawn.
func TestTextsThatAreNotUTF8(t *testing.T) {
	d := full(t)
	d.Title = "a\xffb"
	if got := read(t, write(t, d)).Title; got != "a\uFFFDb" {
		t.Errorf("%q", got)
	}
}

func refused(t testing.TB, raw []byte, what string) error {
	t.Helper()
	d, err := draft.Read(bytes.NewReader(raw))
	if err == nil {
		t.Fatalf("%s was taken", what)
	}
	if !cmp.Equal(d, draft.Draft{}, exactly...) {
		t.Fatalf("%s: half a draft came with the error", what)
	}
	return err
}

func TestCutShort(t *testing.T) {
	raw := write(t, own(t))
	for n := range raw {
		var damaged *draft.DamagedError
		if err := refused(t, raw[:n], "a file cut short"); !errors.As(err, &damaged) || damaged.Hint() == "" {
			t.Fatalf("cut to %d bytes: %v", n, err)
		}
	}
	refused(t, append(slices.Clone(raw), 0), "a file with a byte too many")
}

func TestEveryFlippedBit(t *testing.T) {
	raw := write(t, own(t))
	for i := range raw {
		for bit := range 8 {
			raw[i] ^= 1 << bit
			err := refused(t, raw, "a file with a flipped bit")
			raw[i] ^= 1 << bit
			var newer *draft.NewerError
			var damaged *draft.DamagedError
			inVersion := i >= len(magic) && i < len(magic)+4
			if !errors.As(err, &damaged) && !(inVersion && errors.As(err, &newer)) {
				t.Fatalf("byte %d, bit %d: %T %v", i, bit, err, err)
			}
		}
	}
}

// sealed puts the right checksum under a body.
func sealed(body []byte) []byte {
	sum := sha256.Sum256(body)
	return append(slices.Clone(body), sum[:]...)
}

// file makes a file of the given parts with the right checksum.
func file(version uint32, head string, arrays []byte) []byte {
	b := []byte(magic)
	b = binary.LittleEndian.AppendUint32(b, version)
	b = binary.LittleEndian.AppendUint32(b, uint32(len(head)))
	return sealed(append(append(b, head...), arrays...))
}

// parts takes a file apart.
func parts(raw []byte) (head string, arrays []byte) {
	n := int(binary.LittleEndian.Uint32(raw[len(magic)+4:]))
	return string(raw[headAt : headAt+n]), raw[headAt+n : len(raw)-checksum]
}

// edited is a file with the value of a key of its head replaced, and the right checksum.
func edited(t testing.TB, raw []byte, key, value string) []byte {
	t.Helper()
	text, arrays := parts(raw)
	var head map[string]json.RawMessage
	if err := json.Unmarshal([]byte(text), &head); err != nil {
		t.Fatal(err)
	}
	if _, ok := head[key]; !ok {
		t.Fatalf("the head has no %q", key)
	}
	head[key] = json.RawMessage(value)
	changed, err := json.Marshal(head)
	if err != nil {
		t.Fatal(err)
	}
	return file(draft.Version, string(changed), arrays)
}

// lastCount is a file with the last whole number of its arrays, which belong to the shapes, replaced.
func lastCount(raw []byte, n int32) []byte {
	body := slices.Clone(raw[:len(raw)-checksum])
	binary.LittleEndian.PutUint32(body[len(body)-4:], uint32(n))
	return sealed(body)
}

// firstKind is a file of the full draft with the kind of its first place replaced: it stands behind the counts of the
// outline and the zones.
func firstKind(t testing.TB, raw []byte, kind int32) []byte {
	t.Helper()
	d := full(t)
	zones := d
	zones.ShapeOf, zones.ShapeName, zones.ShapeEstimate, zones.ShapeRelative = nil, nil, nil, nil
	counts := func(raw []byte) (n int) {
		text, _ := parts(raw)
		var head struct{ Counts int }
		if err := json.Unmarshal([]byte(text), &head); err != nil {
			t.Fatal(err)
		}
		return head.Counts
	}
	all, before := counts(raw), counts(write(t, zones))
	body := slices.Clone(raw[:len(raw)-checksum])
	at := body[len(body)-4*(all-before):]
	if got := binary.LittleEndian.Uint32(at); got != 5 {
		t.Fatalf("kind %d stands where a polygon's should", got)
	}
	binary.LittleEndian.PutUint32(at, uint32(kind))
	return sealed(body)
}

// columnNames and lengthsOf are the first n of a file's.
func columnNames(t testing.TB, raw []byte, n int) string { return firstOf(t, raw, "ColumnNames", n) }
func lengthsOf(t testing.TB, raw []byte, n int) string   { return firstOf(t, raw, "Lengths", n) }

func firstOf(t testing.TB, raw []byte, key string, n int) string {
	t.Helper()
	text, _ := parts(raw)
	var head map[string]json.RawMessage
	var list []any
	if err := errors.Join(json.Unmarshal([]byte(text), &head), json.Unmarshal(head[key], &list)); err != nil {
		t.Fatal(err)
	}
	first, err := json.Marshal(list[:n])
	if err != nil {
		t.Fatal(err)
	}
	return string(first)
}

// adversarial returns files with the right checksum whose contents are wrong.
func adversarial(t testing.TB) map[string][]byte {
	t.Helper()
	raw := write(t, full(t))
	head, arrays := parts(raw)
	var said struct{ Lengths []int }
	if err := json.Unmarshal([]byte(head), &said); err != nil {
		t.Fatal(err)
	}
	long := slices.Clone(raw[:len(raw)-checksum])
	binary.LittleEndian.PutUint32(long[len(magic)+4:], math.MaxUint32)
	list := map[string][]byte{
		"another kind of file":         []byte("drumlin-surface\n" + strings.Repeat("x", 100)),
		"layout 0":                     file(0, head, arrays),
		"a head of 4 GiB":              sealed(long),
		"no head":                      file(draft.Version, "", arrays),
		"a head that is no JSON":       file(draft.Version, "drumlin", arrays),
		"an empty head":                file(draft.Version, "{}", nil),
		"a deep head":                  file(draft.Version, `{"Foot":`+strings.Repeat("[", 200000), nil),
		"two heads":                    file(draft.Version, head+head, arrays),
		"half a number at the end":     file(draft.Version, head, arrays[:len(arrays)-3]),
		"a number too many":            file(draft.Version, head, append(slices.Clone(arrays), make([]byte, 8)...)),
		"no such system":               edited(t, raw, "CRS", `"EPSG:1"`),
		"degrees for a plane":          edited(t, raw, "CRS", `"EPSG:4326"`),
		"no lattice":                   edited(t, raw, "NX", "0"),
		"a lattice the wrong way":      edited(t, raw, "NX", "-7"),
		"a huge lattice":               edited(t, raw, "NX", "9223372036854775807"),
		"a lattice too narrow":         edited(t, raw, "NY", "4"),
		"cells without a side":         edited(t, raw, "Cell", "0"),
		"a factor out of range":        edited(t, raw, "Factor", "1e999"),
		"a chance without threshold":   edited(t, raw, "Threshold", "null"),
		"an unknown spread":            edited(t, raw, "Spread", `"range"`),
		"columns with other names":     edited(t, raw, "ColumnNames", `["x","y"]`),
		"no lengths":                   edited(t, raw, "Lengths", "null"),
		"fewer cells":                  edited(t, raw, "Cells", "3"),
		"more cells":                   edited(t, raw, "Cells", "4611686018427387907"),
		"no cells":                     edited(t, raw, "Cells", "-1"),
		"no counts":                    edited(t, raw, "Counts", "-1"),
		"a negative length":            edited(t, raw, "Counts", "-2"),
		"a zone too many":              edited(t, raw, "ZoneNames", `["a","b","c","d","e"]`),
		"a zone too few":               edited(t, raw, "ZoneNames", `["a","b","c"]`),
		"a name of a place too few":    edited(t, raw, "ShapeNames", `["a","b","c","d","e"]`),
		"a name of a place too many":   edited(t, raw, "ShapeNames", `["a","b","c","d","e","f","g"]`),
		"the columns of layout 1":      edited(t, edited(t, raw, "ColumnNames", columnNames(t, raw, 15)), "Lengths", lengthsOf(t, raw, 15)),
		"a place of another kind":      firstKind(t, raw, 1),
		"a place of no kind":           firstKind(t, raw, 7),
		"a place of kind 0":            firstKind(t, raw, 0),
		"a ring that is not there":     lastCount(raw, math.MaxInt32),
		"a ring of less than nothing":  lastCount(raw, -2),
		"a head of zones":              file(draft.Version, `{"ZoneNames":[""`+strings.Repeat(`,""`, 500000)+`]}`, nil),
		"a head of cautions":           file(draft.Version, `{"Foot":[""`+strings.Repeat(`,""`, 500000)+`]}`, nil),
		"a head of lengths":            file(draft.Version, `{"Lengths":[0`+strings.Repeat(`,0`, 500000)+`]}`, nil),
		"a head of more than is taken": file(draft.Version, `{}`+strings.Repeat(" ", 17<<20), nil),
	}
	for k := range said.Lengths {
		for _, n := range []int{-2, math.MinInt64, said.Lengths[k] + 1, 1 << 31, 1<<61 + said.Lengths[k], math.MaxInt64} {
			l := slices.Clone(said.Lengths)
			l[k] = n
			text, _ := json.Marshal(l)
			list["lengths "+string(text)] = edited(t, raw, "Lengths", string(text))
		}
	}
	return list
}

// Reading makes room for what is there, not for what is promised: bytes allocated stay below a few times the file's
// own, and below some 50 times that for a head full of empty words, whose length has a limit of its own.
func TestAdversarialFiles(t *testing.T) {
	for name, raw := range adversarial(t) {
		factor := 8.0
		if strings.HasPrefix(name, "a head of ") || name == "a deep head" {
			factor = 50
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		err := refused(t, raw, name)
		runtime.ReadMemStats(&after)
		var damaged *draft.DamagedError
		if !errors.As(err, &damaged) {
			t.Errorf("%s: %T %v", name, err, err)
		}
		if strings.ContainsAny(err.Error(), "\n") || len(err.Error()) > 300 {
			t.Errorf("%s: the message is no line: %q", name, err)
		}
		spent := float64(after.TotalAlloc - before.TotalAlloc)
		if spent > factor*float64(len(raw))+16<<10 {
			t.Errorf("%s: %.0f bytes were allocated for a file of %d", name, spent, len(raw))
		}
	}
}

func TestNewer(t *testing.T) {
	head, arrays := parts(write(t, own(t)))
	var newer *draft.NewerError
	err := refused(t, file(draft.Version+1, head, arrays), "a later layout")
	if !errors.As(err, &newer) || newer.Version != draft.Version+1 || newer.Hint() == "" {
		t.Errorf("a later layout: %v", err)
	}
}

func TestValidate(t *testing.T) {
	for _, c := range []struct {
		name string
		bend func(d *draft.Draft)
		want string
	}{
		{"a mask", func(d *draft.Draft) { d.Lattice.Mask = make([]bool, 35) }, "mask beside the cells"},
		{"no lattice", func(d *draft.Draft) { d.Lattice.NX = 0 }, "0 x 5 cells"},
		{"a lattice beyond count", func(d *draft.Draft) { d.Lattice.NX = math.MaxInt }, "x 5 cells cannot be drawn"},
		{"no side", func(d *draft.Draft) { d.Lattice.Cell = math.NaN() }, "cells of side NaN"},
		{"a corner at infinity", func(d *draft.Draft) { d.Lattice.X0 = math.Inf(1) }, "the west is +Inf"},
		{"a cell too far", func(d *draft.Draft) { d.Cells[len(d.Cells)-1] = 35 }, "cell 35 is not one of the lattice's 35"},
		{"a cell below 0", func(d *draft.Draft) { d.Cells[0] = -1 }, "cell -1 is not"},
		{"a cell twice", func(d *draft.Draft) { d.Cells[1] = d.Cells[0] }, "stands behind cell"},
		{"a cell too few", func(d *draft.Draft) { d.Cells = d.Cells[1:] }, "cells have"},
		{"an estimate too few", func(d *draft.Draft) { d.Estimate = d.Estimate[1:] }, "values of estimate"},
		{"no limits", func(d *draft.Draft) { d.Lower = nil }, "0 values of lower"},
		{"a relative risk too few", func(d *draft.Draft) { d.Relative = d.Relative[1:] }, "values of relative"},
		{"a place too few", func(d *draft.Draft) { d.ShapeOf = d.ShapeOf[1:] }, "5 shapes of places have 6 estimates"},
		{"no places", func(d *draft.Draft) { d.ShapeOf = nil }, "0 shapes of places have 6 estimates"},
		{"places that are not there", func(d *draft.Draft) { d.ShapeOf, d.ShapeEstimate = nil, []float64{} }, "0 shapes of places have 0 estimates"},
		{"a name too few", func(d *draft.Draft) { d.ShapeName = d.ShapeName[1:] }, "6 shapes of places have 5 names"},
		{"names without places", func(d *draft.Draft) {
			d.ShapeOf, d.ShapeEstimate, d.ShapeRelative, d.ShapeName = nil, nil, nil, []string{}
		}, "0 shapes of places have 0 names"},
		{"risks too few", func(d *draft.Draft) { d.ShapeRelative = d.ShapeRelative[1:] }, "6 shapes of places have 5 relative"},
		{"a place without a shape", func(d *draft.Draft) { d.ShapeOf[2] = nil }, "place 3 has no shape"},
		{"a place of many kinds", func(d *draft.Draft) { d.ShapeOf[2] = orb.Collection{} }, "place 3 is a GeometryCollection"},
		{"observations", func(d *draft.Draft) { d.PlaceY = nil }, "3 x and 0 y"},
		{"no threshold", func(d *draft.Draft) { d.Threshold = nil }, "chance and a threshold"},
		{"no chance", func(d *draft.Draft) { d.Chance = nil }, "chance and a threshold"},
		{"no spread", func(d *draft.Draft) { d.Spread = "" }, `shown as ""`},
		{"a factor", func(d *draft.Draft) { d.Factor = math.NaN() }, "the factor is NaN"},
		{"a threshold", func(d *draft.Draft) { d.Threshold = new(math.Inf(1)) }, "the threshold is +Inf"},
	} {
		d := full(t)
		c.bend(&d)
		err := d.Validate()
		if err == nil || !strings.Contains(err.Error(), c.want) {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
		var b bytes.Buffer
		if err := draft.Write(&b, d); err == nil || b.Len() != 0 {
			t.Errorf("%s: error %v with %d bytes written", c.name, err, b.Len())
		}
	}
	for name, d := range drafts(t) {
		if err := d.Validate(); err != nil {
			t.Errorf("%s: %v", name, err)
		}
	}
	large := full(t)
	large.Title = strings.Repeat("x", 17<<20)
	var b bytes.Buffer
	if err := draft.Write(&b, large); err == nil || b.Len() != 0 {
		t.Errorf("a title of 17 MiB: error %v with %d bytes written", err, b.Len())
	}
}

// fullDisk takes some bytes and then no more.
type fullDisk struct{ room int }

var errFull = errors.New("no space left")

func (d *fullDisk) Write(p []byte) (int, error) {
	if len(p) > d.room {
		n := d.room
		d.room = 0
		return n, errFull
	}
	d.room -= len(p)
	return len(p), nil
}

func TestErrorsOfTheStreams(t *testing.T) {
	d := full(t)
	raw := write(t, d)
	for room := 0; room < len(raw); room += 97 {
		if err := draft.Write(&fullDisk{room}, d); !errors.Is(err, errFull) {
			t.Fatalf("a disk full after %d bytes: %v", room, err)
		}
	}
	if _, err := draft.Read(iotest.TimeoutReader(iotest.OneByteReader(bytes.NewReader(raw)))); !errors.Is(err, iotest.ErrTimeout) {
		t.Errorf("a reader that fails: %v", err)
	}
	got, err := draft.Read(iotest.HalfReader(bytes.NewReader(raw)))
	if diff := cmp.Diff(d, got, exactly...); err != nil || diff != "" {
		t.Errorf("a reader in pieces: %v\n%s", err, diff)
	}
}

// What was written once is read for as long as its layout is known. Layout 1 had no shapes of places.
func TestStoredFiles(t *testing.T) {
	now := full(t)
	before := now
	before.ShapeOf, before.ShapeName, before.ShapeEstimate, before.ShapeRelative = nil, nil, nil, nil
	path := func(layout int) string { return filepath.Join("testdata", fmt.Sprintf("layout%d.draft", layout)) }
	if *update {
		if err := os.WriteFile(path(draft.Version), write(t, now), 0o644); err != nil {
			t.Fatal(err)
		}
	}
	for layout, want := range map[int]draft.Draft{1: before, 2: now} {
		raw, err := os.ReadFile(path(layout))
		if err != nil {
			t.Fatal(err)
		}
		// Sines and roots differ between kinds of CPU in their last digit, so the draft is compared where it has none.
		d := read(t, raw)
		for _, v := range []*draft.Draft{&d, &want} {
			v.Estimate, v.Relative = nil, nil
		}
		if diff := cmp.Diff(want, d, exactly...); diff != "" {
			t.Errorf("layout %d (-made +stored):\n%s", layout, diff)
		}
		again := write(t, read(t, raw))
		if layout == draft.Version && !bytes.Equal(again, raw) {
			t.Error("read and written again, it differs")
		}
		if diff := cmp.Diff(read(t, raw), read(t, again), exactly...); diff != "" {
			t.Errorf("layout %d, written in the layout of today (-before +after):\n%s", layout, diff)
		}
	}
}

// FuzzRead reads bytes as they are, and once more under a checksum that is right, so that what lies behind it is reached.
// Whatever is taken must come back from another round and be drawn or refused without a panic.
func FuzzRead(f *testing.F) {
	for _, d := range drafts(f) {
		f.Add(write(f, d))
	}
	raw := write(f, own(f))
	head, arrays := parts(raw)
	f.Add(file(draft.Version, head, arrays[:len(arrays)-3]))
	f.Add(edited(f, raw, "Lengths", "[1,2]"))
	f.Add(lastCount(raw, 3))
	f.Fuzz(func(t *testing.T, raw []byte) {
		try(t, raw)
		if len(raw) > checksum {
			try(t, sealed(raw[:len(raw)-checksum]))
		}
	})
}

func try(t *testing.T, raw []byte) {
	d, err := draft.Read(bytes.NewReader(raw))
	if err != nil {
		var damaged *draft.DamagedError
		var newer *draft.NewerError
		if !errors.As(err, &damaged) && !errors.As(err, &newer) {
			t.Fatalf("%T %v", err, err)
		}
		return
	}
	again := read(t, write(t, d))
	if diff := cmp.Diff(d, again, exactly...); diff != "" {
		t.Fatalf("written and read again, it differs:\n%s", diff)
	}
	if d.Lattice.Cells() < 1e5 {
		for _, p := range d.Pictures() {
			_ = p.Validate()
		}
	}
}

// A ring's count says how many of the vertices are its own, so that shapes do not run into one another.
func TestShapesStayApart(t *testing.T) {
	d := own(t)
	ring := func(n int) orb.Ring {
		r := make(orb.Ring, n)
		for i := range r {
			r[i] = orb.Point{float64(n), float64(i)}
		}
		return r
	}
	d.Outline = orb.MultiPolygon{{ring(4), ring(0), ring(7)}, {}, {ring(5)}}
	if diff := cmp.Diff(d, read(t, write(t, d)), exactly...); diff != "" {
		t.Error(diff)
	}
}
