package chart

import (
	"image/color"
	"math"
	"math/rand/v2"
	"slices"
	"strconv"
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
	"pgregory.net/rapid"

	"drumlin/grids"
)

func TestNewSample(t *testing.T) {
	tenth := []float64{9, 0, 8, 1, 7, 2, math.NaN(), 6, 3, math.Inf(1), 5, 4}
	for _, c := range []struct {
		name  string
		value []float64
		most  int
		want  Sample
	}{
		{"all of them", tenth, 10, Sample{[]float64{0, 1, 2, 3, 4, 5, 6, 7, 8, 9}, 1}},
		{"every other, with the ends", tenth, 5, Sample{[]float64{0, 3, 5, 7, 9}, 2}},
		{"stretches of 2 1/2", tenth, 4, Sample{[]float64{0, 3, 6, 9}, 2.5}},
		{"never fewer than 3", tenth, 0, Sample{[]float64{0, 5, 9}, 10.0 / 3}},
		{"nothing", []float64{math.NaN()}, 5, Sample{[]float64{}, 1}},
	} {
		if diff := cmp.Diff(c.want, NewSample(c.value, c.most)); diff != "" {
			t.Errorf("%s (-want +got):\n%s", c.name, diff)
		}
	}
	if tenth[0] != 9 || tenth[1] != 0 {
		t.Error("the values were put into another order")
	}
}

// regionsOf draws the values of some regions: different sizes and levels, both signs, many decades, ties.
func regionsOf(t *rapid.T) [][]float64 {
	scale := math.Pow(10, rapid.Float64Range(-12, 12).Draw(t, "decade"))
	offset := rapid.SampledFrom([]float64{0, 0, 1, -3, 1000}).Draw(t, "offset")
	power := rapid.SampledFrom([]float64{1, 1, 3, 9}).Draw(t, "power")
	positive, tied := rapid.Bool().Draw(t, "positive"), rapid.Bool().Draw(t, "tied")
	var regions [][]float64
	for range rapid.IntRange(1, 4).Draw(t, "regions") {
		level := rapid.Float64Range(0, 2).Draw(t, "level")
		value := rapid.SliceOfN(rapid.Float64Range(-1, 1), 1, 60).Draw(t, "value")
		for i, v := range value {
			if tied {
				v = math.Round(3*v) / 3
			}
			if positive {
				v = math.Abs(v)
			}
			value[i] = scale * (offset + level + math.Copysign(math.Pow(math.Abs(v), power), v))
		}
		regions = append(regions, value)
	}
	return regions
}

// digits counts those of v, a last 5 as a half.
func digits(v float64) float64 {
	mantissa, _, _ := strings.Cut(strconv.FormatFloat(math.Abs(v), 'e', -1, 64), "e")
	n := float64(len(strings.ReplaceAll(mantissa, ".", "")))
	if n > 1 && strings.HasSuffix(mantissa, "5") {
		n -= 0.5
	}
	return n
}

// The values themselves, counted one by one, say how the edges must lie: below each inner edge is about the share that
// it is for, no class of all maps together is empty, and no number with fewer digits would have done.
func TestSharedBreaksAgainstAllValues(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var samples []Sample
		var all []float64
		for _, value := range regionsOf(t) {
			samples, all = append(samples, NewSample(value, len(value))), append(all, value...)
		}
		slices.Sort(all)
		lo, hi := all[0], all[len(all)-1]
		edge := SharedBreaks(Level, samples)
		if hi-lo <= 1e-9*max(math.Abs(lo), math.Abs(hi)) {
			if edge != nil {
				t.Fatalf("equal values have breaks %v", edge)
			}
			return
		}
		slices.Reverse(samples)
		if again := SharedBreaks(Level, samples); !slices.Equal(edge, again) {
			t.Fatalf("%v, and %v for the samples in another order", edge, again)
		}
		if err := CheckShared(edge); err != nil {
			t.Fatal(err)
		}
		if edge[0] > lo || lo >= 0 && edge[0] < 0 {
			t.Fatalf("%v begins wrongly for values from %g", edge, lo)
		}
		p := pool(samples, finite)
		if inner := p.edges(lo, 1e-9*max(math.Abs(lo), math.Abs(hi))); len(inner) < 2 {
			if last := edge[len(edge)-1]; len(edge) < fewest || last > hi {
				t.Fatalf("%v for tied values from %g to %g", edge, lo, hi)
			}
			return
		}
		for k := range edge {
			if n := below(all, next(edge, k)) - below(all, edge[k]); n == 0 {
				t.Fatalf("class %d of %v holds none of the values", k, edge)
			}
		}
		if len(edge) == 6 {
			for k, c := range sharedClasses {
				checkInner(t, edge[k+1], all, c.share, c.tolerance)
			}
		}
	})
}

func below(ascending []float64, v float64) int {
	n, _ := slices.BinarySearch(ascending, v)
	return n
}

// next is the edge behind k; above the last there is none.
func next(edge []float64, k int) float64 {
	if k+1 < len(edge) {
		return edge[k+1]
	}
	return math.Inf(1)
}

// quantileOf is the least value that, with those below it, makes up a share: its rank is the share of n, rounded up.
func quantileOf(ascending []float64, share float64) float64 {
	return ascending[max(0, int(math.Ceil(share*float64(len(ascending))-1e-9))-1)]
}

func checkInner(t *rapid.T, edge float64, all []float64, share, tolerance float64) {
	from, to := quantileOf(all, share-tolerance), quantileOf(all, share+tolerance)
	if from == to {
		for _, v := range all {
			if v < to {
				from = v
			}
		}
	}
	if !(edge > from && edge <= to) {
		t.Fatalf("edge %g at %g is not above %g and up to %g", edge, share, from, to)
	}
	for n := 1.0; n < digits(edge); n++ {
		for _, size := range []float64{from, to, edge} {
			unit := math.Pow(10, math.Floor(math.Log10(math.Abs(size)))-n+1)
			for _, v := range []float64{math.Floor(edge/unit) * unit, math.Ceil(edge/unit) * unit} {
				if v, _ := strconv.ParseFloat(strconv.FormatFloat(v, 'g', 12, 64), 64); v > from && v <= to && digits(v) < digits(edge) {
					t.Fatalf("edge %v between %v and %v could be %v", edge, from, to, v)
				}
			}
		}
	}
}

// Thinned samples give the edges of all values, with the tolerance that thinning costs: each sample misses a rank by at
// most half a stretch.
func TestSharedBreaksOfThinnedSamples(t *testing.T) {
	rng := rand.New(rand.NewPCG(4, 2))
	var samples []Sample
	var all []float64
	for _, n := range []int{20000, 300, 4711, 100} {
		value, level := make([]float64, n), 3*rng.Float64()
		for i := range value {
			value[i] = math.Exp(level + rng.NormFloat64())
		}
		samples, all = append(samples, NewSample(value, 200)), append(all, value...)
	}
	slices.Sort(all)
	edge := SharedBreaks(Level, samples)
	if len(edge) != 6 || edge[0] != 0 {
		t.Fatalf("edges %v", edge)
	}
	for k, c := range sharedClasses {
		if share := float64(below(all, edge[k+1])) / float64(len(all)); math.Abs(share-c.share) > c.tolerance+0.5/200 {
			t.Errorf("%.4f of the values lie below edge %g, want about %g", share, edge[k+1], c.share)
		}
	}
}

func TestSharedBreaksOfKnownValues(t *testing.T) {
	line := func(lo, hi float64) []float64 {
		return field(grids.Lattice{NX: 1000, NY: 1}, func(u, _ float64) float64 { return lo + (hi-lo)*u })
	}
	risks := field(grids.Lattice{NX: 1000, NY: 1}, func(u, _ float64) float64 { return math.Exp(u - 0.5) })
	for _, c := range []struct {
		name    string
		kind    Kind
		regions [][]float64
		want    []float64
	}{
		{"two halves", Level, [][]float64{line(0, 50), line(50, 100)}, []float64{0, 20, 40, 60, 80, 95}},
		{"far from 0", Uncertainty, [][]float64{line(1000, 1001)}, []float64{1000, 1000.2, 1000.4, 1000.6, 1000.8, 1000.95}},
		{"below 0", Level, [][]float64{line(-3, 3)}, []float64{-3, -2, -0.6, 0.6, 2, 2.7}},
		{"the least is small against the spread", Level, [][]float64{line(15, 100)}, []float64{0, 30, 50, 70, 80, 95}},
		{"the least is not small", Level, [][]float64{line(30, 100)}, []float64{30, 45, 60, 70, 85, 96}},
		{"three levels", Level, [][]float64{line(5.123, 5.123), line(7.456, 7.456), line(9.9, 9.9)}, []float64{5, 7, 9}},
		{"a single value apart", Level, [][]float64{append(line(2, 2), 7)}, []float64{2, 3, 4, 5, 6}},
		{"a third at 0", Level, [][]float64{line(0, 0)[:500], line(1, 3)}, []float64{0, 1.2, 1.8, 2.5, 2.8}},
		{"constant", Level, [][]float64{line(4, 4), line(4, 4)}, nil},
		{"nothing", Level, [][]float64{{}, {math.NaN()}}, nil},
		{"chance", Chance, nil, []float64{0, 0.05, 0.2, 0.8, 0.95, 1}},
		{"ratio, with what lies far out", Ratio, [][]float64{risks, {1e-9, 1e9, 0, -1}}, Breaks(Ratio, risks[20:980])},
		{"equal ratios", Ratio, [][]float64{line(1, 1)}, []float64{0.67, 0.8, 0.9, 0.95, 1.05, 1.1, 1.25, 1.5}},
		{"no positive ratio", Ratio, [][]float64{{0, -1}}, nil},
	} {
		var samples []Sample
		for _, v := range c.regions {
			samples = append(samples, NewSample(v, 2000))
		}
		if diff := cmp.Diff(c.want, SharedBreaks(c.kind, samples)); diff != "" {
			t.Errorf("%s (-want +got):\n%s", c.name, diff)
		}
	}
}

// A value counts as often as it stands for.
func TestWeightedQuantiles(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var samples []Sample
		var all []float64
		for range rapid.IntRange(1, 4).Draw(t, "regions") {
			s := Sample{Value: rapid.SliceOfN(rapid.Float64Range(0, 9), 1, 9).Draw(t, "value"), Weight: float64(rapid.IntRange(1, 5).Draw(t, "weight"))}
			slices.Sort(s.Value)
			samples = append(samples, s)
			for _, v := range s.Value {
				all = append(all, slices.Repeat([]float64{v}, int(s.Weight))...)
			}
		}
		slices.Sort(all)
		share := float64(rapid.IntRange(0, 100).Draw(t, "percent")) / 100
		p := pool(samples, finite)
		want := all[0]
		for i, v := range all {
			if want = v; float64(i+1) >= share*float64(len(all))-1e-9 {
				break
			}
		}
		if got := p.quantile(share); got != want {
			t.Fatalf("quantile %g of %v is %g, want %g", share, all, got, want)
		}
	})
}

// Maps of one group have one legend, whatever their values: above the last edge, below it, all equal, none.
func TestSharedLegends(t *testing.T) {
	l := grids.Lattice{Cell: 1, NX: 3, NY: 1}
	none := math.NaN()
	for _, c := range []struct {
		kind  Kind
		edge  []float64
		value [][]float64
		want  string
	}{
		{Level, []float64{0, 5, 10, 20}, [][]float64{{1, 7, 99}, {1, 2, 3}, {4, 4, 4}, {20, 21, 22}, {none, none, none}}, "0 to 5; 5 to 10; 10 to 20; 20 and over"},
		{Uncertainty, []float64{0.5, 1}, [][]float64{{0.5, 0.6, 2}, {0.5, 0.7, 1}}, "0.5 to 1.0; 1.0 and over"},
		{Level, []float64{math.Inf(-1), 5, 10}, [][]float64{{-3, 7, 8}, {6, 7, 8}, {none, none, none}}, "under 5; 5 to 10; 10 and over"},
		{Ratio, []float64{0.33, 0.5, 0.8, 1.25, 2, 3}, [][]float64{{0.1, 1, 9}, {1, 1, 1}, {none, none, none}}, "under 0.5; 0.5 to 0.8; 0.8 to 1.25; 1.25 to 2; 2 and over"},
		{Chance, []float64{0, 1}, [][]float64{{0, 0.5, 1}, {0.5, 0.5, 0.5}, {none, none, none}}, "0 to 0.05; 0.05 to 0.2; 0.2 to 0.8; 0.8 to 0.95; 0.95 to 1"},
	} {
		var first classes
		for i, value := range c.value {
			got := cut(Map{Legend: "x", Kind: c.kind, Lattice: l, Value: value, Breaks: c.edge, Shared: true})
			if words := strings.Join(got.ranges(), "; "); words != c.want {
				t.Errorf("kind %d, values %v: %q, want %q", c.kind, value, words, c.want)
			}
			if i == 0 {
				first = got
			}
			if !slices.Equal(got.tone, first.tone) || !slices.Equal(got.hatched, first.hatched) || len(got.tone) != len(got.ranges()) {
				t.Errorf("kind %d, values %v: other colours than for %v", c.kind, value, c.value[0])
			}
		}
	}
	c := cut(Map{Legend: "x", Lattice: l, Value: []float64{1, 2, 30}, Breaks: []float64{0, 5, 10, 20}, Shared: true})
	for v, want := range map[float64]int{0: 0, 4.9: 0, 5: 1, 19: 2, 20: 3, 1e9: 3} {
		if got := c.of(v); got != want {
			t.Errorf("%g is in class %d, want %d", v, got, want)
		}
	}
	// What no edge reaches must not be said to lie between two.
	c = cut(Map{Legend: "x", Lattice: l, Value: []float64{-1, 2, 30}, Breaks: []float64{0, 5}, Shared: true})
	if got := strings.Join(c.ranges(), "; "); got != "under 5; 5 and over" {
		t.Errorf("a value below the first edge: %q", got)
	}
	if c = cut(Map{Legend: "x", Lattice: l, Value: []float64{4, 4, 4}, Shared: true}); strings.Join(c.ranges(), "") != "4 everywhere" {
		t.Errorf("shared without breaks: %q", c.ranges())
	}
}

func TestReaching(t *testing.T) {
	edge := []float64{1, 2, 3}
	samples := []Sample{{Value: []float64{1, 5}}, {}}
	if got := Reaching(edge, samples); !slices.Equal(got, edge) {
		t.Errorf("%v reaches all values, and became %v", edge, got)
	}
	got := Reaching(edge, append(samples, Sample{Value: []float64{0.9}}))
	if !slices.Equal(got, []float64{math.Inf(-1), 2, 3}) || edge[0] != 1 {
		t.Errorf("%v from %v", got, edge)
	}
	if err := CheckShared(got); err != nil {
		t.Error(err)
	}
}

// On the painted pages a colour means the same on all maps of a group, and the legends have the same words.
func TestSharedPictures(t *testing.T) {
	all := gallery(t)
	tones := map[int]color.RGBA{}
	var words []string
	for _, name := range []string{"shared-high", "shared-low", "shared-constant"} {
		m := all[name]
		p := newPage(m)
		img := decoded(t, m)
		seen := 0
		for _, s := range p.swatches {
			if s.class < 0 {
				continue
			}
			seen++
			tone := rgbaAt(img, s.x0+4, (s.y0+s.y1)/2)
			if known, ok := tones[s.class]; ok && known != tone {
				t.Errorf("%s: class %d is %v, on another map %v", name, s.class, tone, known)
			}
			tones[s.class] = tone
		}
		if seen != len(m.Breaks) {
			t.Errorf("%s: %d classes for %d edges", name, seen, len(m.Breaks))
		}
		if words == nil {
			words = p.classes.ranges()
		}
		if got := p.classes.ranges(); !slices.Equal(got, words) || !strings.HasSuffix(got[len(got)-1], "and over") {
			t.Errorf("%s: %q, want %q", name, got, words)
		}
		for k, v := range m.Value {
			if class := p.classes.of(v); m.Lattice.In(k) && k%97 == 0 {
				px, py := p.view.toPixel(m.Lattice.Centre(k))
				if got := rgbaAt(img, p.frame.x0+px, p.frame.y0+py); got != tones[class] && !nearMark(m, p, px, py) {
					t.Fatalf("%s: cell %d is %v, class %d is %v", name, k, got, class, tones[class])
				}
			}
		}
	}
}

// nearMark is true where an observation or the outline may hide a cell.
func nearMark(m Map, p page, px, py float64) bool {
	near := func(x, y float64) bool {
		qx, qy := p.view.toPixel(x, y)
		return math.Hypot(qx-px, qy-py) < 25
	}
	for i := range m.Observations.X {
		if near(m.Observations.X[i], m.Observations.Y[i]) {
			return true
		}
	}
	for _, v := range m.Outline[0][0] {
		if near(v[0], v[1]) {
			return true
		}
	}
	return false
}
