package spatial

import "slices"

// Places are where rows lie, in metres. With Start nil row i is the point (X[i], Y[i]). Else row i is the set of points
// Start[i] to Start[i+1], such as the inside of an area or the length of a transect: its mean for one unit of exposure is
// that of its points, point q counting with Share[q] in proportion to the row's sum. Share may be nil, which means equal
// shares. Covariates and exposure are the row's.
type Places struct {
	X, Y  []float64
	Start []int32
	Share []float64
}

// Len returns the number of rows.
func (p Places) Len() int {
	if p.Start != nil {
		return len(p.Start) - 1
	}
	return len(p.X)
}

// check panics if coordinates do not come in pairs, or starts and shares do not belong to them.
func (p Places) check() {
	if len(p.X) != len(p.Y) {
		panic(lengths)
	}
	if p.Start == nil {
		return
	}
	if n := len(p.Start); n == 0 || p.Start[0] != 0 || int(p.Start[n-1]) != len(p.X) || !slices.IsSorted(p.Start) {
		panic("spatial: starts of rows do not go up from the first point to the last")
	}
	if p.Share != nil && len(p.Share) != len(p.X) {
		panic(lengths)
	}
}

// share returns how much point q counts.
func (p Places) share(q int) float64 {
	if p.Share == nil {
		return 1
	}
	return p.Share[q]
}

// settled returns places whose rows' shares sum to one, without the points that count nothing. It returns an *Error for a
// row without points that count, or with a point that cannot be.
func (p Places) settled() (Places, error) {
	p.check()
	if p.Start == nil {
		return p, nil
	}
	s := Places{Start: []int32{0}}
	for i := range p.Len() {
		total := 0.0
		for q := p.Start[i]; q < p.Start[i+1]; q++ {
			v := p.share(int(q))
			if !(v >= 0) || bad(v) {
				return Places{}, unfit("give each point a share from 0 up", "row %d: a point with a share of %g", i+1, v)
			}
			if bad(p.X[q]) || bad(p.Y[q]) {
				return Places{}, unfit("leave the row out", "row %d: a point whose place is not a finite number", i+1)
			}
			total += v
		}
		if !positive(total) {
			return Places{}, unfit("leave the row out, or give it points", "row %d has no points that count", i+1)
		}
		for q := p.Start[i]; q < p.Start[i+1]; q++ {
			if v := p.share(int(q)) / total; v > 0 {
				s.X, s.Y, s.Share = append(s.X, p.X[q]), append(s.Y, p.Y[q]), append(s.Share, v)
			}
		}
		s.Start = append(s.Start, int32(len(s.X)))
	}
	return s, nil
}

// owners returns the row of each point, or nil where each is one.
func (p Places) owners() []int32 {
	if p.Start == nil {
		return nil
	}
	of := make([]int32, 0, len(p.X))
	for i := range p.Len() {
		for q := p.Start[i]; q < p.Start[i+1]; q++ {
			of = append(of, int32(i))
		}
	}
	return of
}

// centres returns one place for each row: the mean of its points by their shares.
func (p Places) centres() Places {
	if p.Start == nil {
		return p
	}
	c := Places{X: make([]float64, p.Len()), Y: make([]float64, p.Len())}
	for i := range c.X {
		total := 0.0
		for q := int(p.Start[i]); q < int(p.Start[i+1]); q++ {
			total += p.share(q)
		}
		for q := int(p.Start[i]); q < int(p.Start[i+1]); q++ {
			c.X[i] += p.share(q) / total * p.X[q]
			c.Y[i] += p.share(q) / total * p.Y[q]
		}
	}
	return c
}

// only returns the rows of the given indices.
func (p Places) only(rows []int) Places {
	if p.Start == nil {
		return Places{X: pick(p.X, rows), Y: pick(p.Y, rows)}
	}
	s := Places{Start: []int32{0}}
	for _, i := range rows {
		from, to := p.Start[i], p.Start[i+1]
		s.X, s.Y = append(s.X, p.X[from:to]...), append(s.Y, p.Y[from:to]...)
		if p.Share != nil {
			s.Share = append(s.Share, p.Share[from:to]...)
		}
		s.Start = append(s.Start, int32(len(s.X)))
	}
	return s
}

// only returns the covariate at the rows of the given indices.
func (c Covariate) only(rows []int) Covariate {
	return Covariate{Name: c.Name, Number: pick(c.Number, rows), Code: pick(c.Code, rows), Level: c.Level}
}

// pick returns the elements of the given indices, or nil of nil.
func pick[T any](v []T, rows []int) []T {
	if v == nil {
		return nil
	}
	p := make([]T, len(rows))
	for j, i := range rows {
		p[j] = v[i]
	}
	return p
}

// means returns the rows' means of columns with one value a point, shares settled.
func (p Places) means(columns [][]float64) [][]float64 {
	out := make([][]float64, len(columns))
	for j, c := range columns {
		out[j] = make([]float64, p.Len())
		for i := range out[j] {
			for q := p.Start[i]; q < p.Start[i+1]; q++ {
				out[j][i] += p.Share[q] * c[q]
			}
		}
	}
	return out
}
