package demo

import "math"

// bump is a smooth hill of a field, round and of Gaussian shape.
type bump struct{ x, y, height, reach float64 }

// field is a sum of bumps on a level: what nature is taken to be like. Heights add on the log scale.
type field struct {
	level float64
	bumps []bump
}

func (f field) at(x, y float64) float64 {
	v := f.level
	for _, b := range f.bumps {
		dx, dy := (x-b.x)/b.reach, (y-b.y)/b.reach
		v += b.height * math.Exp(-(dx*dx+dy*dy)/2)
	}
	return v
}
