package chart

import (
	"math"
	"math/rand/v2"
	"slices"
	"testing"

	"pgregory.net/rapid"
)

// checkBreaks holds what every set of breaks promises: order, cover, number of classes, and that each edge is round: at most two digits
// long, or a multiple of a tenth of the power of ten of the narrowest class.
func checkBreaks(t interface{ Errorf(string, ...any) }, edge, value []float64) {
	if len(edge) < fewest+1 || len(edge) > most+1 {
		t.Errorf("%d edges: %v", len(edge), edge)
		return
	}
	lo, hi := span(value)
	if edge[0] > lo || edge[len(edge)-1] < hi {
		t.Errorf("%v does not cover %g to %g", edge, lo, hi)
	}
	narrowest := math.Inf(1)
	for i := 1; i < len(edge); i++ {
		narrowest = min(narrowest, edge[i]-edge[i-1])
	}
	if !(narrowest > 0) {
		t.Errorf("not increasing: %v", edge)
	}
	quantum := math.Pow(10, math.Floor(math.Log10(narrowest)+1e-9)-1)
	for _, e := range edge {
		if p := math.Pow(10, math.Floor(math.Log10(math.Abs(e)))-1); e == 0 || math.Abs(e/p-math.Round(e/p)) < 1e-6 {
			continue
		}
		if q := e / quantum; math.Abs(q-math.Round(q)) > 1e-3*max(1, math.Abs(q)*1e-9) {
			t.Errorf("%v is not round: %g in units of %g", edge, e, quantum)
		}
	}
}

func TestBreaksHoldForAnyValues(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		scale := math.Pow(10, rapid.Float64Range(-12, 12).Draw(t, "decade"))
		offset := rapid.SampledFrom([]float64{0, 0, 1, -3, 1000}).Draw(t, "offset")
		power := rapid.SampledFrom([]float64{1, 1, 3, 9}).Draw(t, "power")
		value := rapid.SliceOfN(rapid.Float64Range(-1, 1), 2, 60).Draw(t, "value")
		positive := rapid.Bool().Draw(t, "positive")
		for i, v := range value {
			if positive {
				v = math.Abs(v)
			}
			value[i] = scale * (offset + math.Copysign(math.Pow(math.Abs(v), power), v))
		}
		lo, hi := span(value)
		edge := Breaks(Level, value)
		if hi-lo <= 1e-9*max(math.Abs(lo), math.Abs(hi)) || hi-lo < 1e-290 {
			if edge != nil {
				t.Errorf("constant field has breaks %v", edge)
			}
			return
		}
		checkBreaks(t, edge, value)
	})
}

func TestBreaksByShape(t *testing.T) {
	rng := rand.New(rand.NewPCG(7, 7))
	draw := func(f func() float64) []float64 {
		v := make([]float64, 4000)
		for i := range v {
			v[i] = f()
		}
		return v
	}
	equal := func(edge []float64) bool {
		for i := 2; i < len(edge); i++ {
			if math.Abs((edge[i]-edge[i-1])/(edge[1]-edge[0])-1) > 1e-6 {
				return false
			}
		}
		return true
	}
	outlier := draw(func() float64 { return rng.NormFloat64() })
	outlier[17] = 1e6
	for _, c := range []struct {
		name    string
		value   []float64
		equal   bool
		fullest float64 // share of values allowed in one class
	}{
		{"even", draw(rng.Float64), true, 0.35},
		{"bell", draw(func() float64 { return 50 + 9*rng.NormFloat64() }), false, 0.4},
		{"log-normal", draw(func() float64 { return math.Exp(2 * rng.NormFloat64()) }), false, 0.45},
		{"eight decades", draw(func() float64 { return math.Pow(10, 8*rng.Float64()-4) }), false, 0.4},
		{"zeros and log-normal", draw(func() float64 { return max(0, math.Exp(1.5*rng.NormFloat64())-0.5) }), false, 0.6},
		{"one outlier with both signs", outlier, false, 0.6},
	} {
		edge := Breaks(Level, c.value)
		checkBreaks(t, edge, c.value)
		if equal(edge) != c.equal {
			t.Errorf("%s: equal steps %v, want %v: %v", c.name, equal(edge), c.equal, edge)
		}
		sample, fullest := sorted(c.value), 0
		for k := 1; k < len(edge); k++ {
			from, _ := slices.BinarySearch(sample, edge[k-1])
			to, _ := slices.BinarySearch(sample, edge[k])
			fullest = max(fullest, to-from)
		}
		if share := float64(fullest) / float64(len(sample)); share > c.fullest {
			t.Errorf("%s: %.2f of the values in one class of %v", c.name, share, edge)
		}
	}
}

func TestBreaksOfKnownRanges(t *testing.T) {
	line := func(lo, hi float64) []float64 {
		v := make([]float64, 101)
		for i := range v {
			v[i] = lo + (hi-lo)*float64(i)/100
		}
		return v
	}
	for _, c := range []struct {
		name  string
		kind  Kind
		value []float64
		want  []float64
	}{
		{"0 to 100", Level, line(0, 100), []float64{0, 20, 40, 60, 80, 100}},
		{"0.31 to 0.89", Uncertainty, line(0.31, 0.89), []float64{0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9}},
		{"below zero", Level, line(-2.9, 2.9), []float64{-3, -2, -1, 0, 1, 2, 3}},
		{"chance", Chance, line(0.4, 0.5), []float64{0, 0.05, 0.2, 0.8, 0.95, 1}},
		{"ratio close to 1", Ratio, line(0.99, 1.01), []float64{0.67, 0.8, 0.9, 0.95, 1.05, 1.1, 1.25, 1.5}},
		{"constant", Level, line(12.5, 12.5), nil},
		{"nothing", Level, []float64{math.NaN(), math.Inf(1)}, nil},
		{"no positive ratio", Ratio, []float64{0, -1}, nil},
	} {
		got := Breaks(c.kind, c.value)
		if len(got) != len(c.want) {
			t.Errorf("%s: %v, want %v", c.name, got, c.want)
			continue
		}
		for i := range got {
			if math.Abs(got[i]-c.want[i]) > 1e-12*math.Abs(c.want[i]) {
				t.Errorf("%s: %v, want %v", c.name, got, c.want)
			}
		}
	}
}

func TestRatioBreaksAreSymmetrical(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		spread := rapid.Float64Range(0.01, 25).Draw(t, "spread")
		value := rapid.SliceOfN(rapid.Float64Range(-spread, spread), 1, 50).Draw(t, "log ratio")
		for i := range value {
			value[i] = math.Exp(value[i])
		}
		edge := Breaks(Ratio, value)
		lo, hi := span(value)
		if len(edge) != 8 || !increasing(edge) || edge[0] > lo || edge[7] < hi {
			t.Fatalf("%v for %g to %g", edge, lo, hi)
		}
		for i := range edge {
			// Two digits hold a reciprocal to 1 %: 0.67 and 1.5, 0.33 and 3.
			if p := edge[i] * edge[7-i]; math.Abs(p-1) > 0.0101 && i > 0 && i < 7 {
				t.Fatalf("%g and %g are not reciprocal", edge[i], edge[7-i])
			}
		}
	})
}

func TestNumbers(t *testing.T) {
	for _, c := range []struct {
		value []float64
		want  []string
	}{
		{[]float64{0, 0.5, 1, 1.5}, []string{"0.0", "0.5", "1.0", "1.5"}},
		{[]float64{0.05, 0.1, 0.5, 1, 5, 10}, []string{"0.05", "0.1", "0.5", "1", "5", "10"}},
		{[]float64{-10, -5, 0}, []string{"−10", "−5", "0"}},
		{[]float64{1000, 10000, 1000000}, []string{"1000", "10\u202f000", "1\u202f000\u202f000"}},
		{[]float64{2e-12, 4e-12}, []string{"2×10⁻¹²", "4×10⁻¹²"}},
		{[]float64{0, -2.5e12}, []string{"0", "−2.5×10¹²"}},
		{[]float64{3 * 0.1}, []string{"0.3"}},
	} {
		if got := numbers(c.value); !slices.Equal(got, c.want) {
			t.Errorf("numbers(%v) = %q, want %q", c.value, got, c.want)
		}
	}
}
