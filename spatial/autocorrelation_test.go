package spatial

import (
	"math"
	"math/rand/v2"
	"slices"
	"sort"
	"testing"
)

// TestReferenceMoran holds Moran's I, its moments and its neighbours against the reference (numpy; Cliff & Ord 1981).
func TestReferenceMoran(t *testing.T) {
	var want struct {
		Moran map[string]struct {
			Neighbours [][]int `json:"neighbours_of_first_three"`
			I          float64
			Expected   float64
			Variance   float64 `json:"variance_normality"`
		}
	}
	expected(t, "scoring/spatial.json", &want)
	at, z := places(t, "scoring/spatial.csv"), numbers(t, table(t, "scoring/spatial.csv")["z"])
	for name, k := range map[string]int{"k=4": 4, "k=8": 8} {
		w, got := want.Moran[name], Moran(at, z, k)
		near(t, name+": I", got.I, w.I, 1e-10)
		near(t, name+": expected", got.Expected, w.Expected, 1e-10)
		near(t, name+": variance", got.SD*got.SD, w.Variance, 1e-10)
		for i, list := range nearest(at, k)[:3] {
			if !slices.Equal(list, w.Neighbours[i]) {
				t.Errorf("%s: neighbours of %d are %v, want %v", name, i, list, w.Neighbours[i])
			}
		}
	}
}

// TestNearestAgainstSorting compares the grid's neighbours with those found by sorting all distances, for even, crowded,
// repeated and collinear places.
func TestNearestAgainstSorting(t *testing.T) {
	random := rand.New(rand.NewPCG(6, 1))
	for name, draw := range map[string]func() (float64, float64){
		"even":      func() (float64, float64) { return random.Float64(), random.Float64() },
		"crowded":   func() (float64, float64) { return math.Pow(random.Float64(), 9), math.Pow(random.Float64(), 9) },
		"repeated":  func() (float64, float64) { return float64(random.IntN(4)), float64(random.IntN(4)) },
		"collinear": func() (float64, float64) { x := random.Float64(); return 1e6 * x, 5 },
	} {
		var at Places
		for i := 0; i < 300; i++ {
			x, y := draw()
			at.X, at.Y = append(at.X, x), append(at.Y, y)
		}
		got := nearest(at, 7)
		for i := range at.X {
			order := make([]int, 0, 299)
			for j := range at.X {
				if j != i {
					order = append(order, j)
				}
			}
			d2 := func(j int) float64 { dx, dy := at.X[j]-at.X[i], at.Y[j]-at.Y[i]; return dx*dx + dy*dy }
			sort.SliceStable(order, func(a, b int) bool { return d2(order[a]) < d2(order[b]) })
			if !slices.Equal(got[i], order[:7]) {
				t.Fatalf("%s: neighbours of %d are %v, want %v", name, i, got[i], order[:7])
			}
		}
	}
}

// TestResidualsThatAreAlikeAreFound: a surface held far too smooth leaves residuals that are alike; the one the data
// choose does not.
func TestResidualsThatAreAlikeAreFound(t *testing.T) {
	d := simulated(400, 31)
	d.Covariates = nil
	for i := range d.Response {
		d.Response[i] = math.Sin(6*d.Places.X[i]) + 0.2*rand.New(rand.NewPCG(uint64(i), 2)).NormFloat64()
	}
	stiff := fit(t, Model{Distribution: "gaussian", MaxKnots: 60, Smoothness: given(1e6)}, d, Options{}).ResidualAutocorrelation(d.Places)
	if stiff.Z() < 10 {
		t.Errorf("a plane leaves z = %g", stiff.Z())
	}
	chosen := fit(t, Model{Distribution: "gaussian", MaxKnots: 60}, d, Options{}).ResidualAutocorrelation(d.Places)
	if chosen.Z() > 3 { // a fit takes neighbours' common part away, so below zero is usual
		t.Errorf("the chosen surface leaves z = %g", chosen.Z())
	}
}

// TestRepeatedVisitsAreNoNeighbours: many rows at few places are taken together, so that what a place has of its own does
// not count as likeness of neighbours, and crowds cost no time.
func TestRepeatedVisitsAreNoNeighbours(t *testing.T) {
	random := rand.New(rand.NewPCG(9, 9))
	var d Data
	for place := 0; place < 40; place++ {
		x, y, own := random.Float64(), random.Float64(), random.NormFloat64()
		for visit := 0; visit < 500; visit++ {
			d.Places.X, d.Places.Y = append(d.Places.X, x), append(d.Places.Y, y)
			d.Response = append(d.Response, own+0.5*random.NormFloat64())
		}
	}
	s := fit(t, Model{Distribution: "gaussian", MaxKnots: 10, Smoothness: given(1e9)}, d, Options{})
	if z := s.ResidualAutocorrelation(d.Places).Z(); math.Abs(z) > 3 {
		t.Errorf("z = %g for places that have nothing in common", z)
	}
	if z := Moran(d.Places, s.Rows().Quantile, residualNeighbours).Z(); z < 50 {
		t.Errorf("row by row z = %g", z)
	}
}
