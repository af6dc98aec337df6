package draft

import (
	"errors"
	"fmt"
	"math"

	"github.com/paulmach/orb"

	"drumlin/grids"
)

// Validate returns an error for the first thing in d that does not belong together: a lattice that cannot be drawn, cells
// that are not in it or out of order, columns of unequal length, a chance without a threshold. The values themselves may
// be any numbers.
func (d Draft) Validate() error {
	if err := d.check(); err != nil {
		return fmt.Errorf("draft: %w", err)
	}
	return nil
}

func (d Draft) check() error {
	for _, check := range []func() error{d.checkLattice, d.checkCells, d.checkColumns, d.checkShapes, d.checkNumbers} {
		if err := check(); err != nil {
			return err
		}
	}
	return nil
}

func (d Draft) checkLattice() error {
	l := d.Lattice
	switch {
	case l.Mask != nil:
		return errors.New("the lattice has a mask beside the cells")
	case d.Cells == nil:
		return nil
	case l.NX < 1 || l.NY < 1 || l.NX > grids.MostCells/l.NY:
		return fmt.Errorf("a lattice of %d x %d cells cannot be drawn", l.NX, l.NY)
	case !(l.Cell > 0):
		return fmt.Errorf("cells of side %g cannot be drawn", l.Cell)
	}
	return nil
}

func (d Draft) checkCells() error {
	if d.Cells == nil {
		return nil
	}
	all := d.Lattice.Cells()
	for k, c := range d.Cells {
		if c < 0 || int(c) >= all {
			return fmt.Errorf("cell %d is not one of the lattice's %d", c, all)
		}
		if k > 0 && c <= d.Cells[k-1] {
			return fmt.Errorf("cell %d stands behind cell %d", c, d.Cells[k-1])
		}
	}
	if len(d.X) != len(d.Cells) {
		return fmt.Errorf("%d cells have %d places", len(d.Cells), len(d.X))
	}
	return nil
}

func (d Draft) checkColumns() error {
	n := len(d.X)
	for _, c := range d.columns(new([]float64)) {
		if v := *c.value; !c.apart && len(v) != n && !(c.may && v == nil) {
			return fmt.Errorf("%d places have %d values of %s", n, len(v), c.name)
		}
	}
	if len(d.PlaceX) != len(d.PlaceY) {
		return fmt.Errorf("observations have %d x and %d y", len(d.PlaceX), len(d.PlaceY))
	}
	if (d.Chance != nil) != (d.Threshold != nil) {
		return errors.New("a chance and a threshold go together")
	}
	return nil
}

func (d Draft) checkShapes() error {
	n := len(d.ShapeOf)
	switch {
	case len(d.ShapeEstimate) != n || (d.ShapeEstimate == nil) != (d.ShapeOf == nil):
		return fmt.Errorf("%d shapes of places have %d estimates", n, len(d.ShapeEstimate))
	case d.ShapeName != nil && (len(d.ShapeName) != n || d.ShapeOf == nil):
		return fmt.Errorf("%d shapes of places have %d names", n, len(d.ShapeName))
	case d.ShapeRelative != nil && (len(d.ShapeRelative) != n || d.ShapeOf == nil):
		return fmt.Errorf("%d shapes of places have %d relative risks", n, len(d.ShapeRelative))
	}
	for i, g := range d.ShapeOf {
		switch g.(type) {
		case orb.Point, orb.MultiPoint, orb.LineString, orb.MultiLineString, orb.Polygon, orb.MultiPolygon:
		case nil:
			return fmt.Errorf("place %d has no shape", i+1)
		default:
			return fmt.Errorf("place %d is a %s, which cannot be drawn", i+1, g.GeoJSONType())
		}
	}
	return nil
}

// checkNumbers returns an error for numbers that are said in texts and must be some.
func (d Draft) checkNumbers() error {
	if d.Spread != StandardError && d.Spread != Variation {
		return fmt.Errorf("the uncertainty cannot be shown as %q", d.Spread)
	}
	l := d.Lattice
	numbers := []struct {
		name  string
		value float64
	}{{"factor", d.Factor}, {"reference", d.Reference}, {"cell", l.Cell}, {"west", l.X0}, {"south", l.Y0}}
	if d.Threshold != nil {
		numbers = append(numbers, struct {
			name  string
			value float64
		}{"threshold", *d.Threshold})
	}
	for _, n := range numbers {
		if math.IsNaN(n.value) || math.IsInf(n.value, 0) {
			return fmt.Errorf("the %s is %g", n.name, n.value)
		}
	}
	return nil
}
