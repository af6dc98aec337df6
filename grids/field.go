package grids

import (
	"fmt"
	"math"
)

// Field is one value a cell of a lattice, in the lattice's order; NaN where there is none, outside the study area above
// all.
type Field struct {
	Lattice Lattice
	Name    string
	Value   []float64
}

// NewField returns a field of NaN on l.
func NewField(l Lattice, name string) Field {
	v := make([]float64, l.Cells())
	for k := range v {
		v[k] = math.NaN()
	}
	return Field{Lattice: l, Name: name, Value: v}
}

// Validate returns an error unless the field has as many values as its lattice has cells.
func (f Field) Validate() error {
	if len(f.Value) != f.Lattice.Cells() {
		return fmt.Errorf("field %q has %d values for %d cells", f.Name, len(f.Value), f.Lattice.Cells())
	}
	return nil
}

// At returns the value of the cell that holds a place; NaN off the lattice. The field must be valid (see Validate).
func (f Field) At(x, y float64) float64 {
	k, ok := f.Lattice.Locate(x, y)
	if !ok {
		return math.NaN()
	}
	return f.Value[k]
}

// Extremes returns the smallest and largest finite value; ok is false if there is none.
func (f Field) Extremes() (lowest, highest float64, ok bool) {
	for _, v := range f.Value {
		switch {
		case math.IsNaN(v) || math.IsInf(v, 0):
		case !ok:
			lowest, highest, ok = v, v, true
		default:
			lowest, highest = math.Min(lowest, v), math.Max(highest, v)
		}
	}
	return lowest, highest, ok
}
