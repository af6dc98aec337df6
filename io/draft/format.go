package draft

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
	"slices"

	"github.com/paulmach/orb"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/chart"
	"drumlin/io/internal/sealed"
)

// Version is the layout this program writes, and the newest it reads. A change of the layout, of a field of the head, or
// of what a number means is a new version.
const Version = 2

// The limits leave room for the largest lattice with all its columns, and for a hundred thousand zones with long names.
const (
	limit     = 4 << 30
	headLimit = 16 << 20
)

// kind is the frame of the file (package sealed). Its arrays are the columns in their order, then the numbers of the
// cells and those that say how vertices make shapes (flat).
var kind = sealed.Kind{Magic: "drumlin-draft\n", Version: Version, Limit: limit, HeadLimit: headLimit,
	Name: "draft of pictures", Advice: "have the region done again: drumlin batch with --redo and its name"}

// DamagedError says that a file is not a whole draft, and why.
type DamagedError = sealed.DamagedError

// NewerError says that a file was written by a later version of the program.
type NewerError = sealed.NewerError

// head is the JSON part: all that is not an array.
type head struct {
	Response, Unit         string
	Factor                 float64
	Ratio                  bool
	Spread                 string
	Threshold              *float64
	Reference              float64
	Title, Subtitle, Stamp string
	Foot                   []string
	CRS                    string // code; empty for none
	X0, Y0, Cell           float64
	NX, NY                 int
	ZoneNames              []string
	ShapeNames             []string
	ColumnNames            []string
	Lengths                []int // of the columns; absent for none
	Cells, Counts          int   // lengths; absent for none
}

// absent is the length of an array that is not there, which is not the same as one without elements.
const absent = -1

// column is a named slice of a Draft.
type column struct {
	name  string
	value *[]float64
	may   bool // be nil
	apart bool // not a value a place
	shape bool // a value a shape; not in layout 1
}

// columns lists the slices of d in the order in which they are stored; vertices are those of the shapes.
func (d *Draft) columns(vertices *[]float64) []column {
	return []column{
		{name: "x", value: &d.X}, {name: "y", value: &d.Y},
		{name: "estimate", value: &d.Estimate}, {name: "standard_error", value: &d.StandardError},
		{name: "lower", value: &d.Lower}, {name: "upper", value: &d.Upper}, {name: "cv", value: &d.CV}, {name: "nearest", value: &d.Nearest},
		{name: "chance", value: &d.Chance, may: true},
		{name: "relative", value: &d.Relative, may: true},
		{name: "relative_lower", value: &d.RelativeLower, may: true}, {name: "relative_upper", value: &d.RelativeUpper, may: true},
		{name: "place_x", value: &d.PlaceX, apart: true}, {name: "place_y", value: &d.PlaceY, apart: true},
		{name: "vertices", value: vertices, apart: true},
		{name: "shape_estimate", value: &d.ShapeEstimate, apart: true, shape: true},
		{name: "shape_relative", value: &d.ShapeRelative, apart: true, shape: true},
	}
}

// Write writes d to w; equal drafts give equal bytes. Numbers keep every bit, NaN too; what is not UTF-8 in a text is
// replaced, as it is when it is drawn. It returns an error, before anything is written, for a draft that is not valid or
// that Read would not take.
func Write(w io.Writer, d Draft) error {
	if err := d.Validate(); err != nil {
		return err
	}
	if d.onCentres() {
		d.X, d.Y = nil, nil // they follow from the lattice
	}
	shapes := flatten(d)
	h := head{Response: d.Response, Unit: d.Unit, Factor: d.Factor, Ratio: d.Ratio, Spread: d.Spread, Threshold: d.Threshold, Reference: d.Reference,
		Title: d.Title, Subtitle: d.Subtitle, Stamp: d.Stamp, Foot: d.Foot,
		X0: d.Lattice.X0, Y0: d.Lattice.Y0, Cell: d.Lattice.Cell, NX: d.Lattice.NX, NY: d.Lattice.NY,
		Cells: length(d.Cells), Counts: length(shapes.count), ShapeNames: d.ShapeName}
	if d.Lattice.CRS != nil {
		h.CRS = d.Lattice.CRS.Code()
	}
	if d.Zones != nil {
		h.ZoneNames = make([]string, len(d.Zones))
		for i, z := range d.Zones {
			h.ZoneNames[i] = z.Name
		}
	}
	var floats [][]float64
	count := 0
	for _, c := range d.columns(&shapes.vertex) {
		h.ColumnNames, h.Lengths = append(h.ColumnNames, c.name), append(h.Lengths, length(*c.value))
		floats, count = append(floats, *c.value), count+len(*c.value)
	}
	text, err := json.Marshal(h)
	if err != nil {
		return err
	}
	if size := kind.Size(len(text), count, len(d.Cells)+len(shapes.count)); size > limit || len(text) > headLimit {
		return fmt.Errorf("a draft of pictures of %d MiB, %d MiB of it texts, is more than is read back; larger cells or fewer zones would fit", size>>20, len(text)>>20)
	}
	return kind.Write(w, text, floats, [][]int32{d.Cells, shapes.count})
}

func length[T any](v []T) int {
	if v == nil {
		return absent
	}
	return len(v)
}

// onCentres reports whether the places are, to the bit, the centres of the cells.
func (d Draft) onCentres() bool {
	for k, c := range d.Cells {
		x, y := d.Lattice.Centre(int(c))
		if math.Float64bits(x) != math.Float64bits(d.X[k]) || math.Float64bits(y) != math.Float64bits(d.Y[k]) {
			return false
		}
	}
	return d.Cells != nil
}

// Read reads a draft. Errors are *DamagedError for a file that is not one, is cut short or altered, or whose parts do not
// belong together, *NewerError for one of a later version, and those of r. Lengths that the file states are held against
// its size before anything is made of them.
func Read(r io.Reader) (Draft, error) {
	text, data, err := kind.Read(r)
	if err != nil {
		return Draft{}, err
	}
	var h head
	if err := json.Unmarshal(text, &h); err != nil {
		return Draft{}, kind.Damaged("its head cannot be read: %v", err)
	}
	d, err := h.assemble(data)
	if err != nil {
		return Draft{}, err
	}
	if err := d.check(); err != nil {
		return Draft{}, kind.Damaged("its parts do not belong together: %v", err)
	}
	return d, nil
}

// assemble makes a draft of the head and the bytes of the arrays.
func (h head) assemble(data []byte) (Draft, error) {
	d := Draft{Response: h.Response, Unit: h.Unit, Factor: h.Factor, Ratio: h.Ratio, Spread: h.Spread, Threshold: h.Threshold, Reference: h.Reference,
		Title: h.Title, Subtitle: h.Subtitle, Stamp: h.Stamp, Foot: h.Foot,
		Lattice: grids.Lattice{X0: h.X0, Y0: h.Y0, Cell: h.Cell, NX: h.NX, NY: h.NY}}
	if h.CRS != "" {
		system, err := crs.Parse(h.CRS)
		if err != nil {
			return Draft{}, kind.Damaged("%v", err)
		}
		d.Lattice.CRS = system
	}
	var shapes flat
	list := h.known(d.columns(&shapes.vertex))
	if len(h.Lengths) != len(list) || len(h.ColumnNames) != len(list) {
		return Draft{}, kind.Damaged("it has %d columns, not %d", len(h.Lengths), len(list))
	}
	for k, c := range list {
		part, ok := cut(&data, h.Lengths[k], 8)
		if h.ColumnNames[k] != c.name || !ok {
			return Draft{}, kind.Damaged("its column %q does not fit the file", h.ColumnNames[k])
		}
		*c.value = whole(h.Lengths[k], sealed.Floats(part))
	}
	cells, ok := cut(&data, h.Cells, 4)
	counts, also := cut(&data, h.Counts, 4)
	if !ok || !also || len(data) != 0 {
		return Draft{}, kind.Damaged("its cells or its shapes do not fit the file")
	}
	d.Cells, shapes.count = whole(h.Cells, sealed.Ints(cells)), sealed.Ints(counts)
	if h.NX >= 1 && h.Lengths[0] == absent && h.Lengths[1] == absent {
		d.X, d.Y = centres(d.Lattice, d.Cells)
	}
	if err := shapes.give(&d, h.ZoneNames); err != nil {
		return Draft{}, err
	}
	if err := shapes.giveShapes(&d, h.ShapeNames); err != nil {
		return Draft{}, err
	}
	if len(shapes.count) != 0 || len(shapes.vertex) != 0 {
		return Draft{}, kind.Damaged("its shapes have parts too many")
	}
	return d, nil
}

// known is list as the layout of the file has it: layout 1 ends before the columns of the shapes.
func (h *head) known(list []column) []column {
	first := slices.IndexFunc(list, func(c column) bool { return c.shape })
	if len(h.ColumnNames) == first {
		return list[:first]
	}
	return list
}

// cut takes n elements of some bytes each off data; it reports whether they are there.
func cut(data *[]byte, n, each int) (part []byte, ok bool) {
	if n == absent {
		return nil, true
	}
	if n < 0 || n > len(*data)/each {
		return nil, false
	}
	part, *data = (*data)[:each*n], (*data)[each*n:]
	return part, true
}

// whole tells an array without elements from one that is not there.
func whole[T any](n int, v []T) []T {
	if n == 0 {
		return []T{}
	}
	return v
}

// centres returns the centres of cells; nil for nil.
func centres(l grids.Lattice, cells []int32) (x, y []float64) {
	if cells == nil {
		return nil, nil
	}
	x, y = make([]float64, len(cells)), make([]float64, len(cells))
	for k, c := range cells {
		x[k], y[k] = l.Centre(int(c))
	}
	return x, y
}

// give sets the outline and the zones of d.
func (f *flat) give(d *Draft, names []string) error {
	var ok bool
	if d.Outline, ok = f.take(); !ok {
		return kind.Damaged("its outline does not fit the file")
	}
	if len(names) > len(f.count) {
		return kind.Damaged("it has %d zones and shapes for fewer", len(names))
	}
	if names != nil {
		d.Zones = make([]chart.Zone, len(names))
	}
	for i, name := range names {
		area, ok := f.take()
		if !ok {
			return kind.Damaged("its zone %d does not fit the file", i+1)
		}
		d.Zones[i] = chart.Zone{Name: name, Area: area}
	}
	return nil
}

// giveShapes sets the places of d that are shapes, one for each of their estimates.
func (f *flat) giveShapes(d *Draft, names []string) error {
	n := len(d.ShapeEstimate)
	if n > len(f.count) {
		return kind.Damaged("it has %d places with an estimate and shapes for fewer", n)
	}
	d.ShapeName = names
	if d.ShapeEstimate == nil {
		return nil
	}
	d.ShapeOf = make([]orb.Geometry, n)
	for i := range d.ShapeOf {
		var ok bool
		if d.ShapeOf[i], ok = f.takeShape(); !ok {
			return kind.Damaged("its place %d does not fit the file", i+1)
		}
	}
	return nil
}
