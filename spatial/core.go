package spatial

import (
	"math"

	"drumlin/basis2d"
)

// core is the surface's share of the model matrix: a constant, one thin-plate surface, or one for each level of a
// category, each with its own constant.
type core struct {
	basis *basis2d.ThinPlate // nil: a constant
	per   string             // the category, or empty
	level []string           // its levels, in the order of their surfaces
}

// copies returns how many surfaces there are.
func (c *core) copies() int { return max(1, len(c.level)) }

// width returns the columns of one surface.
func (c *core) width() int {
	if c.basis == nil {
		return 1
	}
	return c.basis.Dim()
}

// null returns how many of them, the first ones, do not bend.
func (c *core) null() int { return min(c.width(), basis2d.Null) }

func (c *core) columns() int { return c.copies() * c.width() }

// levels returns a function that tells which surface row i belongs to, or -1 for a level there is none for.
func (c *core) levels(z []Covariate) (func(i int) int, error) {
	if c.per == "" {
		return func(int) int { return 0 }, nil
	}
	cov, err := find(z, c.per, false)
	if err != nil {
		return nil, err
	}
	to := lookUp(cov.Level, c.level)
	return func(i int) int { return to[cov.Code[i]] }, nil
}

// rowsTo writes the surface's columns at places (x, y) to dst, row-major; of tells which surface the k-th belongs to. A
// place that belongs to none gets NaN.
func (c *core) rowsTo(dst []float64, stride int, x, y []float64, of func(k int) int, s *coreScratch) {
	w := c.width()
	if c.copies() == 1 && c.per == "" {
		c.oneTo(dst, stride, x, y, &s.spread)
		return
	}
	if len(s.rows) < len(x)*w {
		s.rows = make([]float64, len(x)*w)
	}
	c.oneTo(s.rows, w, x, y, &s.spread)
	for k := range x {
		row := dst[k*stride : k*stride+c.columns()]
		clear(row)
		if l := of(k); l >= 0 {
			copy(row[l*w:(l+1)*w], s.rows[k*w:(k+1)*w])
		} else {
			row[0] = math.NaN()
		}
	}
}

// coreScratch is one goroutine's space for rowsTo. The zero value is ready.
type coreScratch struct {
	spread basis2d.Spread
	rows   []float64
}

func (c *core) oneTo(dst []float64, stride int, x, y []float64, s *basis2d.Spread) {
	if c.basis != nil {
		c.basis.RowsTo(dst, stride, x, y, s)
		return
	}
	for i := range x {
		dst[i*stride] = 1
	}
}

// nullTo gathers, from the surface's columns of a row, those that keep of them per surface do not bend.
func (c *core) nullTo(t, row []float64, keep int) {
	for l := 0; l < c.copies(); l++ {
		copy(t[l*keep:(l+1)*keep], row[l*c.width():])
	}
}

// lookUp returns for each of names its index in known, or -1.
func lookUp(names, known []string) []int {
	at := make(map[string]int, len(known))
	for k, name := range known {
		at[name] = k
	}
	to := make([]int, len(names))
	for i, name := range names {
		k, ok := at[name]
		if !ok {
			k = -1
		}
		to[i] = k
	}
	return to
}
