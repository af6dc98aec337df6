package grids

import (
	"fmt"
	"math"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// MostCells is how many cells a lattice may have.
const MostCells = 25_000_000

// DefaultAcross is the number of cells along the longer side of a lattice if nothing else is said.
const DefaultAcross = 100

// Spec says what lattice is wanted.
type Spec struct {
	X, Y []float64 // the observations, in the plane; the same place may come often
	// Spacing is how far apart observations lie, where X and Y are many points of each; 0 means their median spacing.
	Spacing float64
	Within  orb.MultiPolygon // study area in the plane; nil means the observations' own (see NewStudyArea)
	Cell    float64          // side of a cell in metres; 0 means that Across decides
	Across  int              // cells along the longer side of the study area's bounding box; 0 means DefaultAcross
}

// TooManyCellsError is the error of a lattice with more than MostCells cells.
type TooManyCellsError struct {
	Cell, NX, NY float64 // what was asked for; counts are floats since they may be beyond any integer
	Fits         float64 // the smallest side of a cell, in two digits, that would do
}

// Error says how many cells were asked for and what cell size would fit.
func (e *TooManyCellsError) Error() string {
	return fmt.Sprintf("cells of %.6g m make a lattice of %.0f x %.0f = %.0f cells, more than the %d it may have; a cell size of %.6g m would fit",
		e.Cell, e.NX, e.NY, e.NX*e.NY, MostCells, e.Fits)
}

// Hint says what to do about it.
func (e *TooManyCellsError) Hint() string {
	return fmt.Sprintf("ask for cells of %.6g m or larger", e.Fits)
}

// NoCellsError is the error of a lattice none of whose cells has its centre in the study area.
type NoCellsError struct {
	Cell float64 // side of a cell in metres
	Area float64 // of the study area's outline in the plane, in square metres
}

// Error says that the cells are too large.
func (e *NoCellsError) Error() string {
	return fmt.Sprintf("no cell of %.6g m has its centre in the study area of %.6g m2", e.Cell, e.Area)
}

// Hint suggests a smaller cell.
func (e *NoCellsError) Hint() string {
	return fmt.Sprintf("ask for smaller cells: %.2g m would give about a hundred, if the area is not too thin", math.Sqrt(e.Area)/10)
}

// NewLattice lays a lattice over a study area in the plane of sys and marks the cells that belong to it by their
// centres; at least one does. The south-west corner is that of the area's bounding box, so that an area made of whole
// cells is filled exactly; in the north and east the lattice may stand out by part of a cell. Errors are those of
// NewStudyArea, a study area that reaches off the plane, a cell size or count that is not positive, *TooManyCellsError
// and *NoCellsError.
func NewLattice(sys crs.System, spec Spec) (Lattice, error) {
	area, err := NewStudyArea(spec.X, spec.Y, spec.Within)
	if err != nil {
		return Lattice{}, err
	}
	if spec.Spacing > 0 && len(spec.Within) == 0 {
		area.Reach = spacingsAway * spec.Spacing
	}
	if err := onPlane(sys, area.Outline); err != nil {
		return Lattice{}, err
	}
	l, err := spec.cover(area.Outline.Bound())
	if err != nil {
		return Lattice{}, err
	}
	l.CRS = sys
	var cells int
	if l.Mask, cells = area.mask(l, spec.X, spec.Y); cells == 0 {
		return Lattice{}, &NoCellsError{Cell: l.Cell, Area: planeArea(area.Outline)}
	}
	return l, nil
}

// onPlane returns an error if a vertex lies where the plane of sys shows no place.
func onPlane(sys crs.System, outline orb.MultiPolygon) error {
	if !sys.Geographic() {
		return nil
	}
	for _, polygon := range outline {
		for _, ring := range polygon {
			for _, v := range ring {
				if lon, _ := sys.Inverse(v[0], v[1]); math.IsNaN(lon) {
					return fmt.Errorf("study area: easting %.10g, northing %.10g is not a place in %s", v[0], v[1], sys.Code())
				}
			}
		}
	}
	return nil
}

// cover sizes a lattice without mask over a bounding box.
func (s Spec) cover(b orb.Bound) (Lattice, error) {
	wide, high := b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]
	cell, err := s.side(math.Max(wide, high))
	if err != nil {
		return Lattice{}, err
	}
	nx, ny := count(wide, cell), count(high, cell)
	if nx*ny > MostCells {
		return Lattice{}, &TooManyCellsError{Cell: cell, NX: nx, NY: ny, Fits: fitting(wide, high, cell)}
	}
	l := Lattice{X0: b.Min[0], Y0: b.Min[1], Cell: cell, NX: int(nx), NY: int(ny)}
	largest := max(math.Abs(b.Min[0]), math.Abs(b.Min[1]), math.Abs(b.Max[0]), math.Abs(b.Max[1]))
	if math.Nextafter(largest, math.Inf(1))-largest > cell/1000 {
		return Lattice{}, fmt.Errorf("cells of %.6g m cannot be told apart at coordinates as large as %.6g", cell, largest)
	}
	return l, nil
}

func (s Spec) side(longer float64) (float64, error) {
	switch {
	case s.Cell != 0 && !(s.Cell > 0 && s.Cell <= farthest):
		return 0, fmt.Errorf("cell size: %v is not a length above 0", s.Cell)
	case s.Across < 0:
		return 0, fmt.Errorf("cells across: %d is not a number above 0", s.Across)
	case s.Cell > 0:
		return s.Cell, nil
	case s.Across > 0:
		return longer / float64(s.Across), nil
	}
	return longer / DefaultAcross, nil
}

// count is how many cells cover a length; a billionth of a cell standing over is rounding and gets no cell of its own.
func count(length, cell float64) float64 {
	return math.Max(1, math.Ceil(length/cell*(1-1e-9)))
}

// fitting is the smallest side of a cell above the given one, in two digits, that makes no more than MostCells.
func fitting(wide, high, cell float64) float64 {
	if least := math.Max(math.Sqrt(wide/MostCells)*math.Sqrt(high), math.Max(wide, high)/MostCells); cell < least {
		cell = least
	}
	unit := math.Pow(10, math.Floor(math.Log10(cell))-1)
	for tens := math.Ceil(cell / unit); ; tens++ {
		if side := tens * unit; count(wide, side)*count(high, side) <= MostCells {
			return side
		}
	}
}
