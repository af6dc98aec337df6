package grids

import (
	"cmp"
	"errors"
	"fmt"
	"math"
	"slices"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// side is a straight piece of an outline with the area to its left, in metres from the corner of the bounding box.
type side struct{ a, b orb.Point }

// cut is a regular grid over the bounding box of an area.
type cut struct {
	side          []side
	ground        float64 // of the area, in the plane
	width, height float64 // of the bounding box
	nx, ny        int
	w, h          float64   // of a cell
	most          int       // passages of the outline through cells that are followed
	met           []portion // what the outline does on those; its room serves one try after the other
}

// portion is what of an area lies in a cell. Lengths are in cells, from the corner of the cell.
type portion struct {
	row, column int
	area        float64
	mx, my      float64 // the integrals of x and y over it
	rise        float64 // how far the outline within the cell goes up in all, and
	mrise       float64 // the integral of y along that, for the cells to the west
}

// errFine is what comes of a grid with more cells than are wanted.
var errFine = errors.New("too many cells")

func quadratureOfAreas(shape orb.MultiPolygon, sys crs.System, spacing float64) (Quadrature, error) {
	for i, polygon := range shape {
		if !usablePolygon(polygon) {
			return Quadrature{}, fmt.Errorf("polygon %d has a vertex that is not a finite place", i+1)
		}
	}
	bound := shape.Bound()
	grid := cut{side: sides(shape, bound.Min), width: bound.Max[0] - bound.Min[0], height: bound.Max[1] - bound.Min[1]}
	for _, s := range grid.side {
		grid.ground += (s.a[0] + s.b[0]) / 2 * (s.b[1] - s.a[1])
	}
	// Below that lies what rounding leaves of a line.
	if !(grid.ground > 1e-14*grid.width*grid.height) {
		return Quadrature{}, errors.New("the geometry has no area")
	}
	parts := grid.choose(spacing)
	var q Quadrature
	near := neighbourhood{grid: &grid, row: -1}
	for _, p := range parts {
		at := near.place(p)
		at = orb.Point{bound.Min[0] + at[0], bound.Min[1] + at[1]}
		scale, err := areaScale(sys, at)
		if err != nil {
			return Quadrature{}, err
		}
		q.add(at, p.area/scale)
	}
	return q.shared(), nil
}

// sides returns the sides of a shape, from an origin. The first ring of a polygon has the area within, the others are
// holes.
func sides(shape orb.MultiPolygon, origin orb.Point) []side {
	var all []side
	for _, polygon := range shape {
		for r, ring := range polygon {
			first, twice := len(all), 0.0
			for v := range ring {
				a, b := ring[v], ring[(v+1)%len(ring)]
				s := side{orb.Point{a[0] - origin[0], a[1] - origin[1]}, orb.Point{b[0] - origin[0], b[1] - origin[1]}}
				twice += (s.a[0] + s.b[0]) * (s.b[1] - s.a[1])
				if s.a != s.b {
					all = append(all, s)
				}
			}
			if twice > 0 != (r == 0) {
				for i := first; i < len(all); i++ {
					all[i].a, all[i].b = all[i].b, all[i].a
				}
			}
		}
	}
	return all
}

// choose sets the cells as large as spacing and the numbers of places allow, and returns the parts.
func (g *cut) choose(spacing float64) []portion {
	long := max(g.width, g.height)
	cell := min(spacing, long/3)
	// Cells that are full take at least this much.
	cell = max(cell, math.Sqrt(g.ground/mostPoints), long/(1<<40))
	parts, err := g.parts(cell)
	for err != nil || len(parts) > mostPoints {
		if err != nil {
			cell *= 2
		} else {
			cell *= max(1.02, math.Sqrt(float64(len(parts))/mostPoints))
		}
		parts, err = g.parts(cell)
	}
	for len(parts) < leastPoints {
		cell /= 2
		finer, err := g.parts(cell)
		if err != nil || g.nx > 1<<50 || g.ny > 1<<50 {
			break // an outline with so much length and so little area is not of this world
		}
		parts = finer
	}
	return parts
}

// parts lays cells of a size, or a little smaller, and returns the parts of the area in them by row and from east to
// west. Its error is errFine if they are many more than are wanted.
//
// By Green's theorem what lies in a cell follows from the outline within it and from how far the outline to the east of
// it goes up within its row. So cells are never clipped, and holes, islands and bays need no care of their own.
func (g *cut) parts(cell float64) ([]portion, error) {
	g.nx, g.ny = max(1, int(roundedUp(g.width/cell))), max(1, int(roundedUp(g.height/cell)))
	g.w, g.h = g.width/float64(g.nx), g.height/float64(g.ny)
	g.met = slices.Grow(g.met[:0], len(g.side))
	g.most = 4*len(g.side) + 1<<15
	for _, s := range g.side {
		g.met = g.along(g.met, s)
		if len(g.met) > g.most {
			return nil, errFine
		}
	}
	// Twice what is dropped at the end, so that the area scale does not drop more.
	least := 2 * leastShare * g.ground / (g.w * g.h)
	var found []portion
	err := sweep(g.met, least, func(p portion) error {
		if len(found) > 4*mostPoints {
			return errFine
		}
		found = append(found, p)
		return nil
	})
	return found, err
}

// sweep calls emit with what of an area lies in each cell, by row and from east to west, given what its outline does in
// the cells that it passes, which are put in order. Portions of least and below are left out.
func sweep(met []portion, least float64, emit func(portion) error) error {
	slices.SortStableFunc(met, func(a, b portion) int {
		return cmp.Or(cmp.Compare(a.row, b.row), cmp.Compare(b.column, a.column))
	})
	var east portion // all that the outline does to the east, in this row
	for i := 0; i < len(met); {
		if i == 0 || met[i].row != east.row {
			east = portion{row: met[i].row, column: met[i].column}
		}
		// Cells that no outline passes lie wholly to one side of it.
		for ; east.column > met[i].column && east.rise > least; east.column-- {
			if err := emit(portion{row: east.row, column: east.column, area: east.rise, mx: east.rise / 2, my: east.mrise}); err != nil {
				return err
			}
		}
		here := portion{row: met[i].row, column: met[i].column, area: east.rise, mx: east.rise / 2, my: east.mrise}
		for ; i < len(met) && met[i].row == here.row && met[i].column == here.column; i++ {
			here.take(met[i])
		}
		if here.area > least {
			if err := emit(here); err != nil {
				return err
			}
		}
		east.rise, east.mrise, east.column = east.rise+here.rise, east.mrise+here.mrise, here.column-1
	}
	return nil
}

// take adds what another piece of the outline does in the same cell.
func (p *portion) take(q portion) {
	p.area += q.area
	p.mx += q.mx
	p.my += q.my
	p.rise += q.rise
	p.mrise += q.mrise
}

// along appends what a side does in every cell it passes. It is followed from its lower end, so that both directions
// come out the same.
func (g *cut) along(met []portion, s side) []portion {
	sign := 1.0
	if s.a[1] > s.b[1] {
		s.a, s.b, sign = s.b, s.a, -1
	}
	a := orb.Point{min(s.a[0]/g.w, float64(g.nx)), min(s.a[1]/g.h, float64(g.ny))}
	b := orb.Point{min(s.b[0]/g.w, float64(g.nx)), min(s.b[1]/g.h, float64(g.ny))}
	for from := a; from[1] < b[1] && len(met) <= g.most; {
		row := math.Floor(from[1])
		to := b
		if row+1 < b[1] {
			to = orb.Point{between(a[1], a[0], b[1], b[0], row+1), row + 1}
		}
		met = g.across(met, from, to, row, sign)
		from = to
	}
	return met
}

// across appends what a piece of a side does in the cells of one row, which it goes up.
func (g *cut) across(met []portion, a, b orb.Point, row, sign float64) []portion {
	west, east := a, b
	if west[0] > east[0] {
		west, east = east, west
		sign = -sign // the piece is followed from its western end, which may go down
	}
	for from := west; ; {
		column := math.Floor(from[0])
		to := east
		if column+1 < east[0] {
			to = orb.Point{column + 1, between(west[0], west[1], east[0], east[1], column+1)}
		}
		p := passage(from[0]-column, from[1]-row, to[0]-column, to[1]-row, sign)
		p.row, p.column = int(row), int(column)
		if n := len(met); n > 0 && met[n-1].row == p.row && met[n-1].column == p.column {
			met[n-1].take(p)
		} else {
			met = append(met, p)
		}
		if to == east || len(met) > g.most {
			return met
		}
		from = to
	}
}

// between is the value at v of the line that has the value p at a and q at b.
func between(a, p, b, q, v float64) float64 {
	return min(max(p+(v-a)/(b-a)*(q-p), min(p, q)), max(p, q))
}

// passage gives the line integrals along a piece of the outline from (xa, ya) to (xb, yb) that make up what lies to the
// west of it in its cell: of x dy, x^2/2 dy, x y dy, and of dy and y dy.
func passage(xa, ya, xb, yb, sign float64) portion {
	rise := sign * (yb - ya)
	return portion{
		area:  rise * (xa + xb) / 2,
		mx:    rise * (xa*xa + xa*xb + xb*xb) / 6,
		my:    rise * (2*xa*ya + 2*xb*yb + xa*yb + xb*ya) / 6,
		rise:  rise,
		mrise: rise * (ya + yb) / 2,
	}
}
