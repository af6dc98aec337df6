package pipeline

import (
	"testing"

	"drumlin/io/summary"
)

// TestAmounts: whole numbers alone and amounts without a zero are told that another distribution is meant for them.
func TestAmounts(t *testing.T) {
	for name, c := range map[string]struct {
		response []float64
		want     summary.Level
	}{
		"amounts with zeros": {[]float64{0, 1.5, 2, 0}, summary.Clear},
		"counts":             {[]float64{0, 1, 2, 5}, summary.Look},
		"no zeros":           {[]float64{0.5, 1.5, 2}, summary.Look},
	} {
		if got := amounts(c.response); got.Level != c.want {
			t.Errorf("%s: %s, %s", name, got.Level, got.Sentence)
		}
	}
}
