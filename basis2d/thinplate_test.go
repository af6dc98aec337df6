package basis2d

import (
	"errors"
	"flag"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"pgregory.net/rapid"
)

// Property tests draw the same cases in every run unless -rapid.seed says otherwise.
func init() { flag.Set("rapid.seed", "20250101") }

// scattered returns n seeded places in a box of the given size at the given corner.
func scattered(n int, corner, size float64, seed uint64) (x, y []float64) {
	random := rand.New(rand.NewPCG(seed, 2))
	x, y = make([]float64, n), make([]float64, n)
	for i := range x {
		x[i], y[i] = corner+size*random.Float64(), corner+size*random.Float64()
	}
	return x, y
}

func basis(t testing.TB, x, y []float64) *ThinPlate {
	t.Helper()
	b, err := NewThinPlate(x, y)
	if err != nil {
		t.Fatal(err)
	}
	return b
}

// eta is the thin-plate kernel of order 2 in the plane as the books write it: r^2 log r / (8 pi) (Wahba 1990).
func eta(r float64) float64 {
	if r == 0 {
		return 0
	}
	return r * r * math.Log(r) / (8 * math.Pi)
}

// radialCoefficients returns d_k, for knots in scaled coordinates, of the surface with penalised coefficients u.
func (t *ThinPlate) radialCoefficients(u []float64) []float64 {
	d := make([]float64, t.Dim())
	for k := range d {
		for j, v := range u {
			d[k] += t.Whiten[k*len(u)+j] * v
		}
	}
	return d
}

// TestPenaltyIsTheIdentity computes d'E d from the kernel by a route of its own, for every pair of columns.
func TestPenaltyIsTheIdentity(t *testing.T) {
	for _, c := range []struct {
		name         string
		n            int
		corner, size float64
	}{
		{"unit square", 60, 0, 1}, {"kilometres far from the origin", 40, 4e6, 3e4}, {"one penalised column", 4, 0, 1}, {"millimetres", 50, 0, 1e-3},
	} {
		t.Run(c.name, func(t *testing.T) {
			x, y := scattered(c.n, c.corner, c.size, 3)
			b := basis(t, x, y)
			wiggly := b.Dim() - Null
			w := mat.NewDense(b.Dim(), wiggly, b.Whiten)
			e := mat.NewDense(b.Dim(), b.Dim(), nil)
			for k := range x {
				for l := range x {
					e.Set(k, l, eta(math.Hypot(x[k]-x[l], y[k]-y[l])/b.Scale))
				}
			}
			var we, j mat.Dense
			we.Mul(w.T(), e)
			j.Mul(&we, w)
			for k := 0; k < wiggly; k++ {
				for l := 0; l < wiggly; l++ {
					want := 0.0
					if k == l {
						want = 1
					}
					if !(math.Abs(j.At(k, l)-want) < 1e-9) {
						t.Fatalf("d'E d of columns %d and %d is %.15g", k, l, j.At(k, l))
					}
				}
			}
			for l := 0; l < wiggly; l++ { // sum d = sum d x = sum d y = 0
				var s, sx, sy, size float64
				for k := range x {
					d := w.At(k, l)
					s, sx, sy, size = s+d, sx+d*(x[k]-b.CentreX)/b.Scale, sy+d*(y[k]-b.CentreY)/b.Scale, size+math.Abs(d)
				}
				if !(math.Abs(s)+math.Abs(sx)+math.Abs(sy) < 1e-12*size) {
					t.Errorf("column %d does not annihilate the constraint: %g, %g, %g of %g", l, s, sx, sy, size)
				}
			}
		})
	}
}

// TestPenaltyIsTheBendingOfTheSurface integrates f_xx^2 + 2 f_xy^2 + f_yy^2 over the plane by the midpoint rule. The
// plane is drawn together by x = 2 s t/(1 - t^2); the second derivatives have logarithmic poles at the knots, which
// limits the rule to about 1e-4.
func TestPenaltyIsTheBendingOfTheSurface(t *testing.T) {
	x, y := []float64{0.1, 0.9, 0.4, 0.75, 0.2}, []float64{0.2, 0.1, 0.85, 0.6, 0.7}
	for i := range x { // in units of 10, so that Scale is far from one
		x[i], y[i] = 10*x[i], 10*y[i]
	}
	b := basis(t, x, y)
	for _, u := range [][]float64{{1, 0}, {0, 1}, {0.8, -1.7}} {
		d := b.radialCoefficients(u)
		bend := func(px, py float64) float64 {
			var xx, xy, yy float64
			for k := range d {
				dx, dy := px-x[k], py-y[k]
				r2 := dx*dx + dy*dy
				l := math.Log(r2) + 1 // of 2 log r + 1
				xx += d[k] * (l + 2*dx*dx/r2)
				yy += d[k] * (l + 2*dy*dy/r2)
				xy += d[k] * 2 * dx * dy / r2
			}
			// d belongs to eta of scaled coordinates: eta(r/Scale) = eta(r)/Scale^2 + terms the constraint removes.
			f := 1 / (8 * math.Pi * b.Scale * b.Scale)
			return f * f * (xx*xx + 2*xy*xy + yy*yy)
		}
		const n = 900
		at, dt := make([]float64, n), make([]float64, n)
		for i := range at {
			v := (float64(i)+0.5)*2/n - 1
			at[i] = 2 * 2.5 * v / (1 - v*v)
			dt[i] = 2 * 2.5 * (1 + v*v) / ((1 - v*v) * (1 - v*v)) * 2 / n
		}
		var sum float64
		for i := range at {
			for j := range at {
				sum += bend(b.CentreX+at[i], b.CentreY+at[j]) * dt[i] * dt[j]
			}
		}
		want := (u[0]*u[0] + u[1]*u[1]) / (b.Scale * b.Scale)
		if !(math.Abs(sum/want-1) < 1e-3) {
			t.Errorf("u = %v: the integral is %g, the penalty says %g", u, sum, want)
		}
	}
}

// TestRowsAreTheSurface evaluates surfaces from the formula in the package's comment, at any stride.
func TestRowsAreTheSurface(t *testing.T) {
	x, y := scattered(25, -3, 8, 5)
	b := basis(t, x, y)
	px, py := scattered(300, -5, 12, 6)
	px, py = append(px, x...), append(py, y...)
	k := b.Dim()
	stride := k + 4
	rows := make([]float64, len(px)*stride)
	for i := range rows {
		rows[i] = -99
	}
	var scratch Spread
	b.RowsTo(rows, stride, px, py, &scratch)
	b.RowsTo(rows, stride, px[:7], py[:7], &scratch) // scratch may be larger than needed
	random := rand.New(rand.NewPCG(7, 7))
	beta := make([]float64, k)
	for j := range beta {
		beta[j] = random.NormFloat64()
	}
	d := b.radialCoefficients(beta[Null:])
	null := make([]float64, Null)
	for i := range px {
		row := rows[i*stride : (i+1)*stride]
		b.NullSpaceTo(null, px[i], py[i])
		want := 0.0
		for j, v := range []float64{1, (px[i] - b.CentreX) / b.Scale, (py[i] - b.CentreY) / b.Scale} {
			want += beta[j] * v
			if row[j] != v || null[j] != v {
				t.Fatalf("place %d, null-space column %d: %g and %g, want %g", i, j, row[j], null[j], v)
			}
		}
		for j := range d {
			want += d[j] * eta(math.Hypot(px[i]-x[j], py[i]-y[j])/b.Scale)
		}
		got := 0.0
		for j, v := range row[:k] {
			got += beta[j] * v
		}
		if !(math.Abs(got-want) < 1e-11*(1+math.Abs(want))) {
			t.Fatalf("place %d: %.15g, the formula says %.15g", i, got, want)
		}
		for _, v := range row[k:] {
			if v != -99 {
				t.Fatalf("place %d: values beyond the columns were touched", i)
			}
		}
	}
}

// TestColumnsSpanEverySurfaceThroughTheKnots solves for the values 1, x, y and random ones at the knots: with as many
// columns as knots there is one surface through any values, and planes need no penalised column.
func TestColumnsSpanEverySurfaceThroughTheKnots(t *testing.T) {
	x, y := scattered(50, 0, 1, 8)
	b := basis(t, x, y)
	k := b.Dim()
	rows := make([]float64, k*k)
	b.RowsTo(rows, k, x, y, &Spread{})
	var lu mat.LU
	lu.Factorize(mat.NewDense(k, k, rows))
	if c := lu.Cond(); !(c < 1e8) {
		t.Fatalf("condition number %g", c)
	}
	z := make([]float64, k)
	for i := range z {
		z[i] = 3 - 2*x[i] + 0.5*y[i]
	}
	var c mat.VecDense
	if err := lu.SolveVecTo(&c, false, mat.NewVecDense(k, z)); err != nil {
		t.Fatal(err)
	}
	for j := Null; j < k; j++ {
		if !(math.Abs(c.AtVec(j)) < 1e-9) {
			t.Fatalf("a plane has %g in column %d", c.AtVec(j), j)
		}
	}
	if c0, c1, c2 := c.AtVec(0), c.AtVec(1), c.AtVec(2); math.Abs(c0-(3-2*b.CentreX+0.5*b.CentreY)) > 1e-10 || math.Abs(c1+2*b.Scale) > 1e-10 || math.Abs(c2-0.5*b.Scale) > 1e-10 {
		t.Errorf("the plane's coefficients are %g, %g, %g", c0, c1, c2)
	}
}

func TestKnotsThatMakeNoSurface(t *testing.T) {
	line := func(n int, a, b float64) (x, y []float64) {
		for i := 0; i < n; i++ {
			x, y = append(x, float64(i)), append(y, a+b*float64(i))
		}
		return x, y
	}
	lx, ly := line(30, 4, -0.7)
	far, _ := line(30, 0, 0)
	for i := range far {
		far[i] += 4e6
	}
	for _, c := range []struct {
		name, want string
		x, y       []float64
		is         error
	}{
		{"none", "a thin-plate surface needs at least 3 distinct places, there are 0", nil, nil, nil},
		{"two", "a thin-plate surface needs at least 3 distinct places, there are 2", []float64{0, 1}, []float64{0, 1}, nil},
		{"one place three times", "the knots of a thin-plate surface have no extent", []float64{2, 2, 2}, []float64{5, 5, 5}, nil},
		{"a slanting line", "the places lie on one line", lx, ly, ErrCollinear},
		{"a line far from the origin", "the places lie on one line", far, far, ErrCollinear},
		{"three on a line", "the places lie on one line", []float64{0, 1, 2}, []float64{0, 1, 2}, ErrCollinear},
		{"a place twice", "two of the 5 knots lie too close together", []float64{0, 1, 0, 1, 1}, []float64{0, 0, 1, 1, 1}, nil},
	} {
		t.Run(c.name, func(t *testing.T) {
			_, err := NewThinPlate(c.x, c.y)
			if err == nil || !strings.Contains(err.Error(), c.want) {
				t.Errorf("says %v, want %s", err, c.want)
			}
			if c.is != nil && !errors.Is(err, c.is) {
				t.Errorf("%v is not %v", err, c.is)
			}
		})
	}
}

// TestRestoreThinPlateGivesTheSameRows compares bits, and damages the stored parts in every way that can be seen.
func TestRestoreThinPlateGivesTheSameRows(t *testing.T) {
	x, y := scattered(30, 0, 1, 9)
	b := basis(t, x, y)
	stored := ThinPlate{CentreX: b.CentreX, CentreY: b.CentreY, Scale: b.Scale, KnotX: b.KnotX, KnotY: b.KnotY, Whiten: b.Whiten}
	r, err := RestoreThinPlate(stored)
	if err != nil {
		t.Fatal(err)
	}
	px, py := scattered(40, -1, 3, 10)
	rows := [2][]float64{make([]float64, 40*30), make([]float64, 40*30)}
	b.RowsTo(rows[0], 30, px, py, &Spread{})
	r.RowsTo(rows[1], 30, px, py, &Spread{})
	for i, v := range rows[0] {
		if v != rows[1][i] {
			t.Fatalf("value %d: %v and %v", i, v, rows[1][i])
		}
	}
	for name, damage := range map[string]func(*ThinPlate){
		"no knots":           func(t *ThinPlate) { t.KnotX, t.KnotY, t.Whiten = nil, nil, nil },
		"a knot short":       func(t *ThinPlate) { t.KnotX = t.KnotX[1:] },
		"a knot less":        func(t *ThinPlate) { t.KnotX, t.KnotY = t.KnotX[1:], t.KnotY[1:] },
		"transform cut":      func(t *ThinPlate) { t.Whiten = t.Whiten[1:] },
		"no scale":           func(t *ThinPlate) { t.Scale = 0 },
		"scale infinite":     func(t *ThinPlate) { t.Scale = math.Inf(1) },
		"scale not a number": func(t *ThinPlate) { t.Scale = math.NaN() },
	} {
		s := stored
		damage(&s)
		if _, err := RestoreThinPlate(s); err == nil {
			t.Errorf("%s: no error", name)
		}
	}
}

// TestRowsDoNotDependOnTheBlock: a place has the same columns whichever places come with it, to rounding.
func TestRowsDoNotDependOnTheBlock(t *testing.T) {
	x, y := scattered(40, 0, 1, 12)
	b := basis(t, x, y)
	rapid.Check(t, func(t *rapid.T) {
		n := rapid.IntRange(1, 60).Draw(t, "places")
		px, py := scattered(n, -0.5, 2, rapid.Uint64().Draw(t, "seed"))
		all, one := make([]float64, n*b.Dim()), make([]float64, b.Dim())
		b.RowsTo(all, b.Dim(), px, py, &Spread{})
		i := rapid.IntRange(0, n-1).Draw(t, "place")
		b.RowsTo(one, b.Dim(), px[i:i+1], py[i:i+1], &Spread{})
		for j, v := range one {
			if !(math.Abs(v-all[i*b.Dim()+j]) < 1e-12) {
				t.Fatalf("column %d: %v alone, %v among %d", j, v, all[i*b.Dim()+j], n)
			}
		}
	})
}
