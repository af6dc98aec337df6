package isolines

import (
	"math"
	"reflect"
	"testing"

	"pgregory.net/rapid"
)

func TestRound(t *testing.T) {
	for _, c := range []struct {
		least, most float64
		about       int
		want        []float64
	}{
		{0, 10, 9, []float64{1, 2, 3, 4, 5, 6, 7, 8, 9}},
		{0, 10, 4, []float64{2, 4, 6, 8}},
		{0, 10, 1, []float64{5}},
		{0, 10, 3, []float64{2.5, 5, 7.5}},
		{-0.3, 0.3, 5, []float64{-0.2, -0.1, 0, 0.1, 0.2}},
		{0.1 + 0.2, 0.7, 3, []float64{0.4, 0.5, 0.6}}, // 0.30000000000000004
		{1013.2, 1019.9, 0, []float64{1014, 1015, 1016, 1017, 1018, 1019}},
		{0.9, 110, 0, []float64{1, 2, 5, 10, 20, 50, 100}},
		{1, 100, 0, []float64{2, 5, 10, 20, 50}},
		{3e-7, 4e4, 0, []float64{1e-6, 1e-4, 1e-2, 1, 100, 10000}},
		{3e-7, 4e4, 12, []float64{1e-6, 1e-5, 1e-4, 1e-3, 1e-2, 0.1, 1, 10, 100, 1000, 10000}},
		{1, 1, 0, nil}, {2, 1, 0, nil}, {nan, 1, 0, nil}, {0, inf, 0, nil}, {1, 1 + 1e-12, 0, nil},
	} {
		if got := Round(c.least, c.most, c.about); !reflect.DeepEqual(got, c.want) {
			t.Errorf("Round(%v, %v, %d) = %v, want %v", c.least, c.most, c.about, got, c.want)
		}
	}
}

// Whatever the range: levels ascend strictly inside it, are as many as asked for within a factor of 2.5, and are fit for Lines.
func TestRoundInside(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		value := rapid.OneOf(rapid.Float64Range(-1e3, 1e3), rapid.Float64Range(0, 1), rapid.Float64())
		least, most := value.Draw(t, "least"), value.Draw(t, "most")
		about := rapid.IntRange(0, 30).Draw(t, "about")
		level := Round(least, most, about)
		for i, v := range level {
			if !(v > least && v < most) || i > 0 && !(v > level[i-1]) {
				t.Fatalf("%v between %v and %v", level, least, most)
			}
		}
		if err := checkLevels("level", level, false); err != nil {
			t.Fatal(err)
		}
		narrow := !(most-least > 1e-8*max(math.Abs(least), math.Abs(most))) || most-least < 1e-290
		if about == 0 {
			about = DefaultLevels
		}
		if ratio := float64(len(level)) / float64(about); !narrow && !(least > 0 && most/least > wide) && !(ratio >= 0.4 && ratio <= 2.5) {
			t.Fatalf("%d levels between %v and %v for %d", len(level), least, most, about)
		}
	})
}
