package spatial

import (
	"math"
	"strings"

	"drumlin/basis2d"
)

// border holds the columns beside the surface. The free ones, which no penalty touches, are inside the fit orthogonal to
// one another and to the surface's free columns T, which keeps every digit of ill-conditioned covariates: with B the raw
// columns, the fit sees
//
//	Q = (B - T Mix) R^-1,   coefficients of B = R^-1 (coefficients of Q).
//
// The bound ones, of curves and groups, follow as they are; their penalties are the identity.
type border struct {
	Effects []fitted  // what the columns are
	Mix     []float64 // null x q, row-major, q the number of free columns
	R       []float64 // q x q, upper triangular, row-major
	null    int
	keep    int // free columns of each surface: its null space, or its constant alone
}

// fitted is an effect as the data had it.
type fitted struct {
	Effect
	Level  []string         // of a category, a group, or of the category that a curve is for each level of
	Lo, Hi float64          // range of a number over the rows
	Mean   float64          // and its mean
	Curve  []*basis2d.Curve // of a curve: one, or one for each level
	Unseen float64          // of a group: the variance of a level the data did not have, over phi
}

// free returns the number of columns no penalty touches.
func (f fitted) free() int {
	switch f.Role {
	case Category:
		return len(f.Level) - 1
	case Curve:
		return len(f.Curve)
	case Group:
		return 0
	}
	return 1
}

// bound returns the number of columns with a penalty.
func (f fitted) bound() (n int) {
	if f.Role == Group {
		return len(f.Level)
	}
	for _, c := range f.Curve {
		n += c.Dim() - 1
	}
	return n
}

// names returns the free columns' names: the covariate's for a slope, "name=level" for a step, "name straight" for the
// straight part of a curve.
func (f fitted) names() (names []string) {
	switch f.Role {
	case Linear:
		return []string{f.Name}
	case Category:
		for _, l := range f.Level[1:] {
			names = append(names, f.Name+"="+l)
		}
	case Curve:
		for k := range f.Curve {
			names = append(names, f.curveName(k)+" straight")
		}
	}
	return names
}

// curveName names a curve: "depth", or "depth, soil=loam" where there is one for each level.
func (f fitted) curveName(k int) string {
	if f.Per == "" {
		return f.Name
	}
	return f.Name + ", " + f.Per + "=" + f.Level[k]
}

// names returns the free columns' names.
func (b *border) names() (names []string) {
	for _, e := range b.Effects {
		names = append(names, e.names()...)
	}
	return names
}

// size returns the number of free columns.
func (b *border) size() (q int) {
	for _, e := range b.Effects {
		q += e.free()
	}
	return q
}

// bound returns the number of columns with a penalty.
func (b *border) bound() (n int) {
	for _, e := range b.Effects {
		n += e.bound()
	}
	return n
}

// newBorder collects the effects' levels, ranges and curves from the data. A level that no row has is dropped.
func newBorder(effects []Effect, z []Covariate, copies, keep int) (*border, error) {
	b := &border{null: copies * keep, keep: keep}
	for _, e := range effects {
		c, err := find(z, e.Name, e.numeric())
		if err != nil {
			return nil, err
		}
		f := fitted{Effect: e}
		switch e.Role {
		case Linear:
			err = f.setRange(c)
		case Category, Group:
			f.levels(c)
			if len(f.Level) < 2 {
				return nil, unfit("leave "+e.Name+" out", "covariate %q has one level only, %q: there is nothing to compare", e.Name, c.Level[c.Code[0]])
			}
		case Curve:
			if err = f.setRange(c); err == nil {
				err = f.setCurves(c, z)
			}
		}
		if err != nil {
			return nil, err
		}
		b.Effects = append(b.Effects, f)
	}
	return b, nil
}

func (f *fitted) setRange(c Covariate) error {
	f.Lo, f.Hi = math.Inf(1), math.Inf(-1)
	for i, v := range c.Number {
		if bad(v) {
			return unfit("leave the row out", "row %d: covariate %q is not a finite number", i+1, f.Name)
		}
		f.Lo, f.Hi, f.Mean = math.Min(f.Lo, v), math.Max(f.Hi, v), f.Mean+v/float64(len(c.Number))
	}
	return nil
}

// setCurves makes the curve's basis, or one for each level of the category it is per.
func (f *fitted) setCurves(c Covariate, z []Covariate) error {
	if f.Per == "" {
		curve, err := basis2d.NewCurve(c.Number, basis2d.DefaultFunctions)
		if err != nil {
			advice := "use --linear for it"
			if f.Lo == f.Hi {
				advice = "leave it out"
			}
			return unfit(advice, "a curve of %q: %v", f.Name, err)
		}
		f.Curve = []*basis2d.Curve{curve}
		return nil
	}
	per, err := find(z, f.Per, false)
	if err != nil {
		return err
	}
	code := f.levels(per)
	values := make([][]float64, len(f.Level))
	for i, k := range code {
		values[k] = append(values[k], c.Number[i])
	}
	for k, v := range values {
		curve, err := basis2d.NewCurve(v, basis2d.DefaultFunctions)
		if err != nil {
			return unfit("use one curve for all levels, or leave the level out", "a curve of %q for %s=%s: %v", f.Name, f.Per, f.Level[k], err)
		}
		f.Curve = append(f.Curve, curve)
	}
	return nil
}

// find returns the covariate of that name, numbers or a category as asked.
func find(covariates []Covariate, name string, number bool) (Covariate, error) {
	for _, c := range covariates {
		if c.Name != name {
			continue
		}
		if number && c.Number == nil || !number && c.Code == nil {
			return c, unfit("", "covariate %q is not of the kind its effect needs", name)
		}
		return c, nil
	}
	return Covariate{}, unfit("", "there is no covariate %q", name)
}

// levels keeps the levels that occur, in their order, and returns the rows' codes among them.
func (f *fitted) levels(c Covariate) []int32 {
	seen := make([]bool, len(c.Level))
	for _, k := range c.Code {
		seen[k] = true
	}
	to := make([]int32, len(c.Level))
	for l, s := range seen {
		if s {
			to[l] = int32(len(f.Level))
			f.Level = append(f.Level, c.Level[l])
		}
	}
	code := make([]int32, len(c.Code))
	for i, k := range c.Code {
		code[i] = to[k]
	}
	return code
}

// orthogonalise makes the columns null (n values each) and raw orthonormal in turn by Gram-Schmidt, done twice for
// orthogonality to rounding (Giraud, Langou & Rozloznik 2005), and keeps the transform of raw. It overwrites raw with
// the columns that the fit sees, of mean square one. A column left with less than least of its own spread is named in
// the error.
func (b *border) orthogonalise(null, raw [][]float64, least float64, c *core) error {
	t, q := len(null), len(raw)
	all := make([][]float64, 0, t+q)
	r := make([][]float64, t+q) // columns of the triangular factor
	names := append(nullNames(t, b.keep), b.names()...)
	for j := 0; j < t+q; j++ {
		var v []float64
		if j < t {
			v = append([]float64(nil), null[j]...)
		} else {
			v = raw[j-t]
		}
		r[j] = make([]float64, t+q)
		own, level := spread(v), math.Abs(mean(v))*math.Sqrt(float64(len(v)))
		if j < t && j%b.keep == 0 {
			own = math.Sqrt(dot(v, v))
		}
		for pass := 0; pass < 2; pass++ {
			for k, u := range all {
				c := dot(u, v)
				r[j][k] += c
				for i := range v {
					v[i] -= c * u[i]
				}
			}
		}
		norm := math.Sqrt(dot(v, v))
		if constant := own <= 1e-12*level; constant || !(norm > least*own) {
			return b.dependent(j, t, names, r, own, constant, c)
		}
		r[j][j] = norm
		for i := range v {
			v[i] /= norm
		}
		all = append(all, v)
	}
	b.remember(r, t, q, float64(len(all[0])))
	for _, v := range raw {
		for i := range v {
			v[i] *= math.Sqrt(float64(len(v)))
		}
	}
	return nil
}

// columnsTo turns raw columns into those that the fit sees, in place; null are the surface's free ones.
func (b *border) columnsTo(raw, null [][]float64) {
	t, row, fit := make([]float64, len(null)), make([]float64, len(raw)), make([]float64, len(raw))
	for i := 0; len(raw) > 0 && i < len(raw[0]); i++ {
		for k := range null {
			t[k] = null[k][i]
		}
		for j := range raw {
			row[j] = raw[j][i]
		}
		b.rowTo(fit, t, row)
		for j := range raw {
			raw[j][i] = fit[j]
		}
	}
}

// nullNames names t free columns of surfaces, keep of each.
func nullNames(t, keep int) []string {
	names := make([]string, t)
	for k := range names {
		names[k] = []string{"intercept", "x", "y"}[k%keep]
	}
	return names
}

// spread returns the length of a column about its mean.
func spread(v []float64) float64 {
	m, ss := mean(v), 0.0
	for _, x := range v {
		ss += (x - m) * (x - m)
	}
	return math.Sqrt(ss)
}

func mean(v []float64) (m float64) {
	for _, x := range v {
		m += x / float64(len(v))
	}
	return m
}

// remember stores Mix = R_TT^-1 R_TB and R = R_BB/sqrt(n).
func (b *border) remember(r [][]float64, t, q int, n float64) {
	b.Mix, b.R = make([]float64, t*q), make([]float64, q*q)
	for j := 0; j < q; j++ {
		col := r[t+j]
		for k := t - 1; k >= 0; k-- {
			v := col[k]
			for l := k + 1; l < t; l++ {
				v -= r[l][k] * b.Mix[l*q+j]
			}
			b.Mix[k*q+j] = v / r[k][k]
		}
		for k := 0; k <= j; k++ {
			b.R[k*q+j] = col[t+k] / math.Sqrt(n)
		}
	}
}

// dependent says which column hangs on which.
func (b *border) dependent(j, t int, names []string, r [][]float64, own float64, constant bool, c *core) error {
	if j < t {
		level := ""
		if c.per != "" {
			level = c.per + "=" + c.level[j/b.keep]
		}
		return onOneLine(level)
	}
	if constant {
		return unfit("leave it out", "covariate %q has the same value in every row", names[j])
	}
	var on []string
	for k, size := range contributions(r, j) {
		if k > 0 && size > 1e-4*own {
			on = append(on, names[k])
		}
	}
	return unfit("leave one of them out", "covariate %q cannot be told apart from %s", names[j], strings.Join(on, ", "))
}

// contributions returns how much each of the columns before j, as they were, spreads the combination of them that makes
// column j, given the columns of the triangular factor.
func contributions(r [][]float64, j int) []float64 {
	c := append([]float64(nil), r[j][:j]...) // R^-1 r_j: coefficients of the columns themselves
	for k := j - 1; k >= 0; k-- {
		c[k] /= r[k][k]
		for l := 0; l < k; l++ {
			c[l] -= r[k][l] * c[k]
		}
	}
	for k := range c {
		spread := 0.0 // about the mean, which is the first column
		for l := 1; l <= k; l++ {
			spread += r[k][l] * r[k][l]
		}
		c[k] = math.Abs(c[k]) * math.Sqrt(spread)
	}
	return c
}

// rowTo writes the fit's columns for raw covariate values at a place with null-space values t; dst holds q values.
func (b *border) rowTo(dst, t, raw []float64) {
	q := len(dst)
	for j := range dst {
		v := raw[j]
		for k := 0; k < b.null; k++ {
			v -= t[k] * b.Mix[k*q+j]
		}
		for k := 0; k < j; k++ {
			v -= dst[k] * b.R[k*q+j]
		}
		dst[j] = v / b.R[j*q+j]
	}
}

// logDet returns log |det R|, with the straight parts of curves in the covariate's own unit.
func (b *border) logDet(q int) (l float64) {
	for j := 0; j < q; j++ {
		l += math.Log(math.Abs(b.R[j*q+j]))
	}
	for _, e := range b.Effects {
		for _, c := range e.Curve {
			l += math.Log(c.Scale)
		}
	}
	return l
}

// functional returns g with g'(c) = the j-th coefficient of the raw columns, c the coefficients the fit sees.
func (b *border) functional(j, q int) []float64 {
	g := make([]float64, q) // row j of R^-1
	g[j] = 1 / b.R[j*q+j]
	for k := j + 1; k < q; k++ {
		v := 0.0
		for l := j; l < k; l++ {
			v -= g[l] * b.R[l*q+k]
		}
		g[k] = v / b.R[k*q+k]
	}
	return g
}

// filler writes the columns of row i before they are made orthogonal: free ones and bound ones. It returns what the
// variance of the linear predictor grows by, in multiples of phi, for groups that the data did not have.
type filler func(free, bound []float64, i int) (unseen float64)

// filler fits covariates to the effects. A level of a category that the data did not have gives NaN. A group may be
// missing from z: then the row is for a group of average level, without error.
func (b *border) filler(z []Covariate) (filler, error) {
	var set []filler
	freeAt, boundAt := 0, 0
	for _, e := range b.Effects {
		f, err := e.filler(z)
		if err != nil {
			return nil, err
		}
		f0, f1, b0, b1 := freeAt, freeAt+e.free(), boundAt, boundAt+e.bound()
		freeAt, boundAt = f1, b1
		set = append(set, func(free, bound []float64, i int) float64 { return f(free[f0:f1], bound[b0:b1], i) })
	}
	return func(free, bound []float64, i int) (unseen float64) {
		clear(free)
		clear(bound)
		for _, f := range set {
			unseen += f(free, bound, i)
		}
		return unseen
	}, nil
}

// filler writes one effect's columns, which come cleared.
func (f fitted) filler(z []Covariate) (filler, error) {
	if f.Role == Group && !has(z, f.Name) {
		return func(_, _ []float64, _ int) float64 { return 0 }, nil
	}
	c, err := find(z, f.Name, f.numeric())
	if err != nil {
		return nil, err
	}
	switch f.Role {
	case Linear:
		return func(free, _ []float64, i int) float64 { free[0] = c.Number[i]; return 0 }, nil
	case Category:
		to := lookUp(c.Level, f.Level)
		return func(free, _ []float64, i int) float64 {
			switch k := to[c.Code[i]]; {
			case k > 0:
				free[k-1] = 1
			case k < 0:
				free[0] = math.NaN()
			}
			return 0
		}, nil
	case Group:
		to := lookUp(c.Level, f.Level)
		return func(_, bound []float64, i int) float64 {
			k := to[c.Code[i]]
			if k < 0 {
				return f.Unseen
			}
			bound[k] = 1
			return 0
		}, nil
	}
	return f.curveFiller(c, z)
}

func (f fitted) curveFiller(c Covariate, z []Covariate) (filler, error) {
	of := func(int) int { return 0 }
	if f.Per != "" {
		per, err := find(z, f.Per, false)
		if err != nil {
			return nil, err
		}
		to := lookUp(per.Level, f.Level)
		of = func(i int) int { return to[per.Code[i]] }
	}
	bend := f.Curve[0].Dim() - 1
	return func(free, bound []float64, i int) float64 {
		k := of(i)
		if k < 0 {
			free[0] = math.NaN()
			return 0
		}
		var row [basis2d.DefaultFunctions]float64
		f.Curve[k].RowTo(row[:1+bend], c.Number[i])
		free[k] = row[0]
		copy(bound[k*bend:(k+1)*bend], row[1:])
		return 0
	}, nil
}

// setUnseen remembers the variance that an unseen level of a group has, over phi: one over its lambda.
func (b *border) setUnseen(list []smooth, lambda []float64) {
	for i, e := range b.Effects {
		for j, t := range list {
			if e.Role == Group && t.kind == GroupSmooth && t.name == "group "+e.Name {
				b.Effects[i].Unseen = 1 / lambda[j]
			}
		}
	}
}

func has(z []Covariate, name string) bool {
	for _, c := range z {
		if c.Name == name {
			return true
		}
	}
	return false
}

func dot(a, b []float64) (s float64) {
	for i, v := range a {
		s += v * b[i]
	}
	return s
}
