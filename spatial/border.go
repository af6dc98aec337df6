package spatial

import (
	"math"
	"strings"
)

// border holds the unpenalised columns beside the surface. Inside the fit they are orthogonal to one another and to the
// surface's null space T, which keeps every digit of ill-conditioned covariates: with B the raw columns, the fit sees
//
//	Q = (B - T Mix) R^-1,   coefficients of B = R^-1 (coefficients of Q).
type border struct {
	Effects []fitted  // what the columns are
	Mix     []float64 // null x q, row-major
	R       []float64 // q x q, upper triangular, row-major
	null    int
}

// fitted is an effect as the data had it.
type fitted struct {
	Effect
	Level  []string // of a category; the first is the base
	Lo, Hi float64  // range of a number over the rows
}

func (f fitted) columns() int {
	if f.Role == Category {
		return len(f.Level) - 1
	}
	return 1
}

// names returns the coefficients' names: the covariate's for a slope, "name=level" for a step.
func (b *border) names() []string {
	var names []string
	for _, e := range b.Effects {
		if e.Role == Linear {
			names = append(names, e.Name)
			continue
		}
		for _, l := range e.Level[1:] {
			names = append(names, e.Name+"="+l)
		}
	}
	return names
}

func (b *border) size() int {
	q := 0
	for _, e := range b.Effects {
		q += e.columns()
	}
	return q
}

// newBorder collects the effects' levels from the data. A level that no row has is dropped.
func newBorder(effects []Effect, covariates []Covariate, null int) (*border, [][]float64, error) {
	b := &border{null: null}
	var raw [][]float64
	for _, e := range effects {
		c, err := find(covariates, e)
		if err != nil {
			return nil, nil, err
		}
		f := fitted{Effect: e}
		if e.Role == Linear {
			f.Lo, f.Hi = math.Inf(1), math.Inf(-1)
			for i, v := range c.Number {
				if bad(v) {
					return nil, nil, unfit("leave the row out", "row %d: covariate %q is not a finite number", i+1, e.Name)
				}
				f.Lo, f.Hi = math.Min(f.Lo, v), math.Max(f.Hi, v)
			}
			raw = append(raw, append([]float64(nil), c.Number...))
		} else {
			code := f.levels(c)
			if len(f.Level) < 2 {
				return nil, nil, unfit("leave --category "+e.Name+" out", "covariate %q has one level only, %q: there is nothing to compare", e.Name, c.Level[c.Code[0]])
			}
			for l := 1; l < len(f.Level); l++ {
				raw = append(raw, indicator(code, int32(l)))
			}
		}
		b.Effects = append(b.Effects, f)
	}
	return b, raw, nil
}

func find(covariates []Covariate, e Effect) (Covariate, error) {
	for _, c := range covariates {
		if c.Name != e.Name {
			continue
		}
		if e.Role == Linear && c.Number == nil || e.Role == Category && c.Code == nil {
			return c, unfit("", "covariate %q is not of the kind its effect needs", e.Name)
		}
		return c, nil
	}
	return Covariate{}, unfit("", "there is no covariate %q", e.Name)
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

func indicator(code []int32, level int32) []float64 {
	v := make([]float64, len(code))
	for i, k := range code {
		if k == level {
			v[i] = 1
		}
	}
	return v
}

// orthogonalise makes the columns null (n values each) and raw orthonormal in turn by Gram-Schmidt, done twice for
// orthogonality to rounding (Giraud, Langou & Rozloznik 2005), and keeps the transform of raw. It overwrites raw with
// the columns that the fit sees, of mean square one. A column left with less than least of its own spread is named in
// the error.
func (b *border) orthogonalise(null, raw [][]float64, least float64) error {
	t, q := len(null), len(raw)
	all := make([][]float64, 0, t+q)
	r := make([][]float64, t+q) // columns of the triangular factor
	names := append(nullNames[:t:t], b.names()...)
	for j := 0; j < t+q; j++ {
		var v []float64
		if j < t {
			v = append([]float64(nil), null[j]...)
		} else {
			v = raw[j-t]
		}
		r[j] = make([]float64, t+q)
		own := 0.0
		for pass := 0; pass < 2; pass++ {
			for k, u := range all {
				c := dot(u, v)
				r[j][k] += c
				for i := range v {
					v[i] -= c * u[i]
				}
				if k == 0 && pass == 0 { // spread about the mean, for a constant column comes first
					own = math.Sqrt(dot(v, v))
				}
			}
		}
		norm := math.Sqrt(dot(v, v))
		if j > 0 && !(norm > least*own) || norm == 0 || own == 0 && j > 0 {
			return b.dependent(j, t, names, r, own)
		}
		r[j][j] = norm
		for i := range v {
			v[i] /= norm
		}
		all = append(all, v)
	}
	b.keep(r, t, q, float64(len(all[0])))
	for j, v := range raw {
		_ = j
		for i := range v {
			v[i] *= math.Sqrt(float64(len(v)))
		}
	}
	return nil
}

var nullNames = []string{"intercept", "x", "y"}

// keep stores Mix = R_TT^-1 R_TB and R = R_BB/sqrt(n).
func (b *border) keep(r [][]float64, t, q int, n float64) {
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
func (b *border) dependent(j, t int, names []string, r [][]float64, own float64) error {
	if j < t {
		return unfit("a surface needs places spread in two directions: use --surface none, or more places",
			"the places lie on one line, so a surface over the plane cannot be had")
	}
	if own <= 1e-12*math.Abs(r[j][0]) {
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

// logDet returns log |det R|.
func (b *border) logDet(q int) (l float64) {
	for j := 0; j < q; j++ {
		l += math.Log(math.Abs(b.R[j*q+j]))
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

// values fits covariates at new places to the effects: a function that writes the raw columns of row i. An unknown
// level gives NaN.
func (b *border) values(z []Covariate) (func(dst []float64, i int), error) {
	var set []func(dst []float64, i int)
	at := 0
	for _, e := range b.Effects {
		c, err := find(z, e.Effect)
		if err != nil {
			return nil, err
		}
		first := at
		at += e.columns()
		if e.Role == Linear {
			set = append(set, func(dst []float64, i int) { dst[first] = c.Number[i] })
			continue
		}
		to := make([]int, len(c.Level))
		for l, name := range c.Level {
			to[l] = -1
			for k, known := range e.Level {
				if known == name {
					to[l] = k
				}
			}
		}
		set = append(set, func(dst []float64, i int) {
			level := to[c.Code[i]]
			for k := 1; k < len(e.Level); k++ {
				dst[first+k-1] = 0
				switch level {
				case k:
					dst[first+k-1] = 1
				case -1:
					dst[first+k-1] = math.NaN()
				}
			}
		})
	}
	return func(dst []float64, i int) {
		for _, f := range set {
			f(dst, i)
		}
	}, nil
}

func dot(a, b []float64) (s float64) {
	for i, v := range a {
		s += v * b[i]
	}
	return s
}
