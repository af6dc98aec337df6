package isolines

import (
	"fmt"
	"math"
	"slices"

	"github.com/paulmach/orb"

	"drumlin/grids"
)

// MostLevels is how many levels, or edges of bands, there may be.
const MostLevels = 1000

// surface is the function whose level sets are drawn. Half-steps of the lattice number the places where it is known: its
// corners have even numbers in both directions, the cells' centres odd ones, the middles of the cells' sides one of each.
type surface struct {
	nx, ny    int
	x, y      []float64 // coordinates of the half-steps, 2 nx + 1 and 2 ny + 1
	value     []float64 // one a cell
	level     []float64 // ascending
	class     []int16   // for each cell, within a rim of one: how many levels are at or below the value; -1 without one
	tolerance float64   // share of the difference between neighbours that is nothing

	ends map[orb.Point]bool // middles of cells' sides at the outer edge at which lines end; known after bands were scanned
}

// newSurface checks the lattice and classifies the values; the levels must have been checked.
func newSurface(l grids.Lattice, value, level []float64) (*surface, error) {
	if len(value) != l.Cells() || l.Mask != nil && len(l.Mask) != l.Cells() {
		panic("isolines: the lattice, its mask and the values differ in length")
	}
	s := &surface{nx: l.NX, ny: l.NY, value: value, level: level, ends: map[orb.Point]bool{}}
	s.x, s.y = halfSteps(l.X0, l.Cell, l.NX), halfSteps(l.Y0, l.Cell, l.NY)
	largest := max(math.Abs(s.x[0]), math.Abs(s.x[2*l.NX]), math.Abs(s.y[0]), math.Abs(s.y[2*l.NY]))
	digit := math.Nextafter(largest, math.Inf(1)) - largest
	if !(l.Cell > 0 && digit <= l.Cell/1000) { // also if one of them is NaN
		return nil, fmt.Errorf("cells of %v m cannot be told apart at coordinates as large as %v", l.Cell, largest)
	}
	s.tolerance = max(1e-12, 8*digit/l.Cell)
	s.class = make([]int16, (l.NX+2)*(l.NY+2))
	for c := range s.class {
		s.class[c] = -1
	}
	for k, v := range value {
		if l.In(k) && finite(v) {
			s.class[s.rimmed(k)] = int16(s.classOf(v))
		}
	}
	return s, nil
}

func halfSteps(origin, cell float64, n int) []float64 {
	c := make([]float64, 2*n+1)
	for p := range c {
		c[p] = origin + float64(float64(p)/2*cell)
	}
	return c
}

func finite(v float64) bool { return !math.IsNaN(v) && !math.IsInf(v, 0) }

// rimmed is the place of cell k among the classes.
func (s *surface) rimmed(k int) int { return (k/s.nx+1)*(s.nx+2) + k%s.nx + 1 }

// classOf is how many levels are at or below v.
func (s *surface) classOf(v float64) int {
	n, equal := slices.BinarySearch(s.level, v)
	if equal {
		n++
	}
	return n
}

// slack is the difference from the value of cell k that is nothing: a share of the largest difference from a neighbour.
// It belongs to the cell and not to the squares around it, so that all of these draw a line through its centre or none.
func (s *surface) slack(k int) float64 {
	v, r := s.value[k], s.rimmed(k)
	most := 0.0
	for dj := -1; dj <= 1; dj++ {
		for di := -1; di <= 1; di++ {
			if s.class[r+dj*(s.nx+2)+di] >= 0 {
				most = max(most, math.Abs(s.value[k+dj*s.nx+di]-v))
			}
		}
	}
	return s.tolerance * min(most, math.MaxFloat64)
}

// checkLevels returns an error unless there are no more than MostLevels, ascending; the first and last may be infinite if
// open is true.
func checkLevels(what string, level []float64, open bool) error {
	if len(level) > MostLevels {
		return fmt.Errorf("%ss: there are %d, more than the %d there may be", what, len(level), MostLevels)
	}
	for i, v := range level {
		endless := open && (i == 0 && math.IsInf(v, -1) || i == len(level)-1 && math.IsInf(v, 1))
		switch {
		case !finite(v) && !endless:
			return fmt.Errorf("%s %d: %v is not a finite number", what, i+1, v)
		case i > 0 && !(v > level[i-1]):
			return fmt.Errorf("%s %d: %v does not ascend from %v before it", what, i+1, v, level[i-1])
		}
	}
	return nil
}
