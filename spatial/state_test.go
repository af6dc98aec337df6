package spatial

import (
	"context"
	"fmt"
	"math"
	"math/rand/v2"
	"reflect"
	"runtime"
	"slices"
	"strconv"
	"sync"
	"testing"

	"drumlin/basis2d"
	"drumlin/spatial/response"

	"pgregory.net/rapid"
)

// covered is a fit with everything a state holds: surface, knots in a gap, a slope and a category.
func covered(t testing.TB, dist string, surface Kind, workers int) (s *Surface, at Places, z []Covariate) {
	t.Helper()
	d := sample(dist, 300, 201)
	random := rand.New(rand.NewPCG(202, 0))
	make := func(n int) []Covariate {
		soil := Covariate{Name: "soil", Level: []string{"clay", "loam", "sand"}}
		for i := 0; i < n; i++ {
			soil.Code = append(soil.Code, int32(random.IntN(3)))
		}
		return []Covariate{u2("depth", n, random), soil}
	}
	d.Covariates = make(300)
	for i := range d.Places.X {
		d.Places.X[i] *= 0.7 // the rest is a gap
	}
	m := Model{Distribution: dist, Surface: surface, MaxKnots: 60, Effects: []Effect{{Name: "depth", Role: Linear}, {Name: "soil", Role: Category}}}
	at = grid(31)
	s = fit(t, m, d, Options{Area: at, Workers: workers, Seed: 5})
	return s, at, make(at.Len())
}

// sameBits fails unless a and b are the same floats, bit by bit.
func sameBits(t testing.TB, what string, a, b []float64) {
	t.Helper()
	if len(a) != len(b) {
		t.Fatalf("%s: %d values and %d", what, len(a), len(b))
	}
	for i := range a {
		if math.Float64bits(a[i]) != math.Float64bits(b[i]) {
			t.Fatalf("%s: value %d is %v and %v", what, i, a[i], b[i])
		}
	}
}

// TestWorkersChangeNoBit compares whole fits, predictions, sums and residuals.
func TestWorkersChangeNoBit(t *testing.T) {
	for _, dist := range distributions {
		for _, surface := range []Kind{ThinPlate, None} {
			one, at, z := covered(t, dist, surface, 1)
			sets := []Share{{Index: []int32{3, 5, 900}, Weight: []float64{1, 0.5, 2}}, {}}
			for i := 0; i < at.Len(); i++ {
				sets[1].Index, sets[1].Weight = append(sets[1].Index, int32(i)), append(sets[1].Weight, 0.01)
			}
			eta, se := predict(t, one, at, z...)
			sums, err := one.Sums(context.Background(), at, z, sets, 50, 3)
			if err != nil {
				t.Fatal(err)
			}
			for _, workers := range []int{1, 2, 5} {
				more, _, _ := covered(t, dist, surface, workers)
				what := fmt.Sprintf("%s, %d workers: ", dist, workers)
				a, b := one.State(), more.State()
				sameBits(t, what+"coefficients", a.Beta, b.Beta)
				sameBits(t, what+"factor", a.Factor, b.Factor)
				sameBits(t, what+"dispersion", []float64{a.Phi}, []float64{b.Phi})
				if x, y := fmt.Sprint(a.Report), fmt.Sprint(b.Report); x != y { // the shortest text that tells floats apart, NaN too
					t.Errorf("%sreports differ:\n%s\n%s", what, x, y)
				}
				sameBits(t, what+"leverages", one.Rows().Leverage, more.Rows().Leverage)
				sameBits(t, what+"quantile residuals", one.Rows().Quantile, more.Rows().Quantile)
				e, v := predict(t, more, at, z...)
				sameBits(t, what+"predictions", eta, e)
				sameBits(t, what+"standard errors", se, v)
				other, err := more.Sums(context.Background(), at, z, sets, 50, 3)
				if err != nil {
					t.Fatal(err)
				}
				for k := range sums {
					sameBits(t, what+"sums", append([]float64{sums[k].Value, sums[k].Delta}, sums[k].Draws...), append([]float64{other[k].Value, other[k].Delta}, other[k].Draws...))
				}
			}
		}
	}
	// Neither does the number of processors, which matrix kernels look at.
	before, at, z := covered(t, "poisson", ThinPlate, 2)
	defer runtime.GOMAXPROCS(runtime.GOMAXPROCS(1))
	after, _, _ := covered(t, "poisson", ThinPlate, 2)
	sameBits(t, "factor on one processor", before.factor, after.factor)
	a, _ := predict(t, before, at, z...)
	b, _ := predict(t, after, at, z...)
	sameBits(t, "predictions on one processor", a, b)
}

// TestPredictionsAreSafeTogether runs them from several goroutines; the race detector sees the rest.
func TestPredictionsAreSafeTogether(t *testing.T) {
	s, at, z := covered(t, "poisson", ThinPlate, 2)
	eta, se := predict(t, s, at, z...)
	var wg sync.WaitGroup
	for range 6 {
		wg.Add(1)
		go func() {
			defer wg.Done()
			e, v := make([]float64, at.Len()), make([]float64, at.Len())
			if err := s.PredictTo(context.Background(), e, v, at, z); err != nil {
				t.Error(err)
			}
			if !slices.Equal(e, eta) || !slices.Equal(v, se) {
				t.Error("predictions made together differ from those made alone")
			}
		}()
	}
	wg.Wait()
}

// TestRestoredSurfacePredictsTheSameBits goes through State and back, with slices copied as a store would.
func TestRestoredSurfacePredictsTheSameBits(t *testing.T) {
	for _, dist := range distributions {
		for _, surface := range []Kind{ThinPlate, None} {
			s, at, z := covered(t, dist, surface, 2)
			r, err := Restore(copied(s.State()), 3)
			if err != nil {
				t.Fatal(err)
			}
			eta, se := predict(t, s, at, z...)
			e, v := predict(t, r, at, z...)
			sameBits(t, dist+" predictions", eta, e)
			sameBits(t, dist+" standard errors", se, v)
			if !reflect.DeepEqual(s.Model(), r.Model()) || s.Quantile(0.9) != r.Quantile(0.9) || s.Chance(0.3, 0.2, 0.1) != r.Chance(0.3, 0.2, 0.1) || s.Mean(0.4) != r.Mean(0.4) {
				t.Errorf("%s: the model, quantiles or chances differ", dist)
			}
			if r.Rows() != nil {
				t.Errorf("%s: a restored surface has rows", dist)
			}
			before, after := s.State(), r.State()
			if !reflect.DeepEqual(before.Basis, after.Basis) {
				t.Errorf("%s: the basis of the restored surface differs", dist)
			}
			before.Basis, after.Basis = nil, nil
			if fmt.Sprint(before) != fmt.Sprint(after) {
				t.Errorf("%s: the state of the restored surface differs", dist)
			}
			sets := []Share{{Index: []int32{0, 1, 2}, Weight: []float64{1, 2, 3}}}
			a, err := s.Sums(context.Background(), at, z, sets, 20, 9)
			if err != nil {
				t.Fatal(err)
			}
			b, err := r.Sums(context.Background(), at, z, sets, 20, 9)
			if err != nil {
				t.Fatal(err)
			}
			sameBits(t, dist+" draws", a[0].Draws, b[0].Draws)
		}
	}
}

// copied returns a state that shares nothing with st.
func copied(st State) State {
	if st.Basis != nil {
		b := st.Basis
		st.Basis = &basis2d.ThinPlate{CentreX: b.CentreX, CentreY: b.CentreY, Scale: b.Scale, KnotX: slices.Clone(b.KnotX), KnotY: slices.Clone(b.KnotY), Whiten: slices.Clone(b.Whiten)}
	}
	st.Effect = slices.Clone(st.Effect)
	for i := range st.Effect {
		st.Effect[i].Level = slices.Clone(st.Effect[i].Level)
	}
	st.Mix, st.R, st.Beta, st.Factor = slices.Clone(st.Mix), slices.Clone(st.R), slices.Clone(st.Beta), slices.Clone(st.Factor)
	return st
}

// TestDamagedStatesAreRefused cuts and stretches each part of a state at random.
func TestDamagedStatesAreRefused(t *testing.T) {
	s, _, _ := covered(t, "gaussian", ThinPlate, 2)
	whole := s.State()
	resize := func(t *rapid.T, v *[]float64) {
		n := rapid.IntRange(0, len(*v)+3).Filter(func(n int) bool { return n != len(*v) }).Draw(t, "length")
		*v = append(*v, 1, 1, 1)[:n]
	}
	damages := map[string]func(*rapid.T, *State){
		"coefficients": func(t *rapid.T, st *State) { resize(t, &st.Beta) },
		"factor":       func(t *rapid.T, st *State) { resize(t, &st.Factor) },
		"mix":          func(t *rapid.T, st *State) { resize(t, &st.Mix) },
		"transform":    func(t *rapid.T, st *State) { resize(t, &st.R) },
		"knots' x":     func(t *rapid.T, st *State) { resize(t, &st.Basis.KnotX) },
		"knots' y":     func(t *rapid.T, st *State) { resize(t, &st.Basis.KnotY) },
		"whitening":    func(t *rapid.T, st *State) { resize(t, &st.Basis.Whiten) },
		"effects":      func(t *rapid.T, st *State) { st.Effect = st.Effect[:rapid.IntRange(0, 1).Draw(t, "effects")] },
		"levels": func(t *rapid.T, st *State) {
			st.Effect[1].Level = st.Effect[1].Level[:rapid.IntRange(0, 2).Draw(t, "levels")]
		},
		"role":         func(t *rapid.T, st *State) { st.Effect[0].Role = Role(rapid.IntRange(1, 9).Draw(t, "role")) },
		"basis":        func(t *rapid.T, st *State) { st.Basis = nil },
		"distribution": func(t *rapid.T, st *State) { st.Model.Distribution = rapid.StringN(0, 5, 5).Draw(t, "word") },
		"link":         func(t *rapid.T, st *State) { st.Model.Link = "power" },
		"factor's diagonal": func(t *rapid.T, st *State) {
			p := len(st.Beta)
			k := rapid.IntRange(0, p-1).Draw(t, "k")
			st.Factor[k*p+k] = rapid.SampledFrom([]float64{0, math.NaN(), math.Inf(1)}).Draw(t, "value")
		},
		"transform's diagonal": func(t *rapid.T, st *State) {
			k := rapid.IntRange(0, 2).Draw(t, "k")
			st.R[k*3+k] = rapid.SampledFrom([]float64{0, math.NaN(), math.Inf(-1)}).Draw(t, "value")
		},
		"dispersion": func(t *rapid.T, st *State) {
			st.Phi = rapid.SampledFrom([]float64{-1, math.NaN(), math.Inf(1)}).Draw(t, "value")
		},
		"a coefficient": func(t *rapid.T, st *State) {
			st.Beta[rapid.IntRange(0, len(st.Beta)-1).Draw(t, "k")] = math.NaN()
		},
		"degrees of freedom": func(t *rapid.T, st *State) { st.Report.DF = math.NaN() },
	}
	for name, damage := range damages {
		t.Run(name, rapid.MakeCheck(func(t *rapid.T) {
			st := copied(whole)
			damage(t, &st)
			if r, err := Restore(st, 1); err == nil || r != nil {
				t.Fatalf("restored: %v", err)
			}
		}))
	}
	if _, err := Restore(copied(whole), 1); err != nil {
		t.Errorf("the whole state: %v", err)
	}
	if _, err := Restore(State{}, 1); err == nil {
		t.Error("an empty state was restored")
	}
}

// TestReferenceQuantileResiduals holds the quantile residuals of the shared reference (Dunn & Smyth 1996; scipy,
// testdata/reference/scoring), with its own uniform numbers. Tolerance 1e-6 as stated there.
func TestReferenceQuantileResiduals(t *testing.T) {
	rows := table(t, "scoring/distributions.csv")
	var want struct {
		Residual []float64 `json:"quantile_residual"`
	}
	expected(t, "scoring/distributions.json", &want)
	seen := 0
	for i, name := range rows["distribution"] {
		if !slices.Contains(distributions, name) {
			continue
		}
		dist, err := response.New(name, "")
		if err != nil {
			t.Fatal(err)
		}
		seen++
		number := func(column string) float64 {
			v, err := strconv.ParseFloat(rows[column][i], 64)
			if err != nil {
				t.Fatal(err)
			}
			return v
		}
		o, mean := response.Obs{Y: number("y"), Trials: 1, Weight: 1}, number("mean")
		if name == "binomial" {
			o.Trials = number("trials")
			mean /= o.Trials
		}
		near(t, fmt.Sprintf("row %d, %s: residual", i+1, name), quantileResidual(dist, o, dist.Linear(mean), number("phi"), number("u")), want.Residual[i], 1e-6)
	}
	if seen < 20 {
		t.Errorf("%d rows", seen)
	}
}

// TestIntervalsAndChances: normal where the dispersion is known, else Student's t with n - df degrees of freedom. The
// quantiles are those of any table: 1.959964 and, for 10 degrees of freedom, 2.228139 (from memory).
func TestIntervalsAndChances(t *testing.T) {
	known := &Surface{dist: response.Poisson{}}
	near(t, "normal quantile", known.Quantile(0.95), 1.959963984540054, 1e-12)
	estimated := &Surface{dist: response.Gaussian{}, report: Report{Rows: 25, DF: 15}}
	near(t, "t quantile", estimated.Quantile(0.95), 2.228138851964939, 1e-9)
	for _, s := range []*Surface{known, estimated} {
		q := s.Quantile(0.9)
		near(t, "chance at the lower limit", s.Chance(1, 0.3, 1-0.3*q), 0.95, 1e-12)
		near(t, "chance at the upper limit", s.Chance(1, 0.3, 1+0.3*q), 0.05, 1e-12)
		near(t, "chance at the level", s.Chance(1, 0.3, 1), 0.5, 1e-15)
		if s.Chance(1, 0, 0.5) != 1 || s.Chance(1, 0, 1.5) != 0 {
			t.Error("chances without a standard error")
		}
	}
}

// TestQuantileResidualsAreNormal when the model is the truth: mean 0 and variance 1 within four standard errors.
func TestQuantileResidualsAreNormal(t *testing.T) {
	for _, dist := range distributions {
		s := fit(t, Model{Distribution: dist, MaxKnots: 80}, sample(dist, 2000, 203), Options{Seed: 11})
		n, mean, square := 0.0, 0.0, 0.0
		for _, v := range s.Rows().Quantile {
			n, mean, square = n+1, mean+v, square+v*v
		}
		df := s.Report().DF
		near(t, dist+" mean", mean/n, 0, 4/math.Sqrt(n))
		near(t, dist+" variance", square/(n-df), 1, 4*math.Sqrt(2/n))
	}
}
