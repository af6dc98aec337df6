package spatial

// design is the model matrix of the rows' points: the surface's columns, the free columns beside it, the bound ones.
type design struct {
	x, y    []float64
	core    *core
	owner   []int32         // of each point, the row whose covariates it has; nil where each is a row
	of      func(i int) int // which surface a row belongs to
	free    [][]float64     // orthogonal columns that the fit sees, one value a point
	bound   int
	fill    filler
	scratch []designScratch
}

// designScratch is one goroutine's space.
type designScratch struct {
	core coreScratch
	raw  []float64
}

func (d *design) Rows() int { return len(d.x) }

// row returns the row that point q belongs to.
func (d *design) row(q int) int {
	if d.owner == nil {
		return q
	}
	return int(d.owner[q])
}

func (d *design) Cols() int { return d.core.columns() + len(d.free) + d.bound }

func (d *design) BlockTo(dst []float64, from, to, worker int) {
	p, k, q := d.Cols(), d.core.columns(), len(d.free)
	w := &d.scratch[worker]
	d.core.rowsTo(dst, p, d.x[from:to], d.y[from:to], func(r int) int { return d.of(d.row(from + r)) }, &w.core)
	if w.raw == nil {
		w.raw = make([]float64, q)
	}
	for i := from; i < to; i++ {
		row := dst[(i-from)*p : (i-from+1)*p]
		if d.bound > 0 {
			d.fill(w.raw, row[k+q:], d.row(i))
		}
		for j, col := range d.free {
			row[k+j] = col[i]
		}
	}
}
