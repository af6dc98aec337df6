package isolines

import (
	"github.com/paulmach/orb"

	"drumlin/grids"
)

// Line is what a surface has of one level: paths in the plane of the lattice, in metres, as long as possible, with the
// higher side on their left. A closed path ends with its first point; the others begin and end at the edge of the cells.
type Line struct {
	Level float64
	Paths orb.MultiLineString
}

// Lines returns the lines of equal value at each of the levels that occur, which must ascend. There is one value a cell;
// cells outside the mask, NaN and infinite values are holes. What lies between the centres and at the edges, and what a value equal to a
// level does, the package's description says. Errors are levels that are not finite, do not ascend or are more than MostLevels,
// a lattice too fine for its coordinates, and *TooManyVerticesError. Lines panics if the values or the mask are not one a cell.
func Lines(l grids.Lattice, value []float64, levels []float64) ([]Line, error) {
	if err := checkLevels("level", levels, false); err != nil || l.Cells() == 0 {
		return nil, err
	}
	s, err := newSurface(l, value, levels)
	if err != nil {
		return nil, err
	}
	segments := make([][]segment, len(levels))
	err = s.scan(func(level int, g segment) { segments[level] = append(segments[level], g) }, nil)
	if err != nil {
		return nil, err
	}
	var lines []Line
	for i, level := range levels {
		line := Line{Level: level}
		n := newNetwork(segments[i])
		n.paths(func(path []int32) { line.Paths = append(line.Paths, n.points(path)) })
		if len(line.Paths) > 0 {
			lines = append(lines, line)
		}
		segments[i] = nil
	}
	return lines, nil
}
