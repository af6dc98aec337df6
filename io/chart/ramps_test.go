package chart

import (
	"fmt"
	"math"
	"testing"

	"github.com/lucasb-eyer/go-colorful"
)

type matrix [3][3]float64

func (m matrix) times(v [3]float64) (p [3]float64) {
	for i := range m {
		for j := range v {
			p[i] += m[i][j] * v[j]
		}
	}
	return p
}

// Matrices for complete dichromats on linear sRGB: Machado, Oliveira & Fernandes 2009, IEEE Trans. Vis. Comput. Graph.
// 15:1291-1298, severity 1.0. From memory; TestSimulationsKeepGrey checks that every row sums to 1.
var machado = map[string]matrix{
	"protanopia":   {{0.152286, 1.052583, -0.204868}, {0.114503, 0.786281, 0.099216}, {-0.003882, -0.048116, 1.051998}},
	"deuteranopia": {{0.367322, 0.860646, -0.227968}, {0.280085, 0.672501, 0.047413}, {-0.011820, 0.042940, 0.968881}},
	"tritanopia":   {{1.255528, -0.076749, -0.178779}, {-0.078411, 0.930809, 0.147602}, {0.004733, 0.691367, 0.303900}},
}

// Viénot, Brettel & Mollon 1999, Color Res. Appl. 24:243-252: linear RGB to cone responses, and what the missing
// cone is replaced by. From memory; checked like the above.
var vienotLMS = matrix{{17.8824, 43.5161, 4.11935}, {3.45565, 27.1554, 3.86714}, {0.0299566, 0.184309, 1.46709}}

var vienot = map[string]matrix{
	"protanopia":   {{0, 2.02344, -2.52581}, {0, 1, 0}, {0, 0, 1}},
	"deuteranopia": {{1, 0, 0}, {0.494207, 0, 1.24827}, {0, 0, 1}},
}

// inverse by cofactors.
func (m matrix) inverse() (inv matrix) {
	c := func(i, j int) float64 {
		a, b, d, e := (i+1)%3, (i+2)%3, (j+1)%3, (j+2)%3
		return m[a][d]*m[b][e] - m[a][e]*m[b][d]
	}
	det := m[0][0]*c(0, 0) + m[0][1]*c(0, 1) + m[0][2]*c(0, 2)
	for i := range m {
		for j := range m {
			inv[j][i] = c(i, j) / det
		}
	}
	return inv
}

// sights are the ways to see a colour: normal, and the simulations above.
func sights() map[string]func(colorful.Color) colorful.Color {
	linear := func(f func([3]float64) [3]float64) func(colorful.Color) colorful.Color {
		return func(c colorful.Color) colorful.Color {
			r, g, b := c.LinearRgb()
			v := f([3]float64{r, g, b})
			return colorful.LinearRgb(ramped(v[0]), ramped(v[1]), ramped(v[2]))
		}
	}
	all := map[string]func(colorful.Color) colorful.Color{"normal": func(c colorful.Color) colorful.Color { return c }}
	for name, m := range machado {
		all[name+", Machado"] = linear(m.times)
	}
	back := vienotLMS.inverse()
	for name, m := range vienot {
		all[name+", Viénot"] = linear(func(v [3]float64) [3]float64 { return back.times(m.times(vienotLMS.times(v))) })
	}
	return all
}

// A grey is the same grey for everybody; this catches a mistyped coefficient.
func TestSimulationsKeepGrey(t *testing.T) {
	for name, see := range sights() {
		for _, v := range []float64{0.1, 0.5, 0.9} {
			grey := colorful.Color{R: v, G: v, B: v}
			if d := 100 * grey.DistanceCIEDE2000(see(grey)); d > 1 {
				t.Errorf("%s moves grey %g by %.2f", name, v, d)
			}
		}
	}
}

func seen(t tone) colorful.Color {
	c, _ := colorful.MakeColor(t.rgb())
	return c
}

func lightness(t tone) float64 {
	l, _, _ := seen(t).Lab()
	return 100 * l
}

// Least steps between neighbouring classes, after rounding to 8 bits. A CIEDE2000 difference of 1 is about what can
// just be seen side by side; apart on a map far more is needed (common practice, no source).
func TestSequentialRamps(t *testing.T) {
	for _, c := range []struct {
		name         string
		ramp         ramp
		n            int
		step, differ float64
	}{
		{"level 5", levelRamp, 5, 16, 12.5}, {"level 7", levelRamp, 7, 11, 7.5}, {"level 11", levelRamp, 11, 6.4, 4.5},
		{"uncertainty 5", uncertaintyRamp, 5, 16, 12.5}, {"uncertainty 7", uncertaintyRamp, 7, 11, 7.5}, {"uncertainty 11", uncertaintyRamp, 11, 6.4, 4.5},
		{"chance 5", chanceRamp, 5, 16, 12.5},
	} {
		tones := c.ramp.tones(c.n)
		leastDiffer, at := math.Inf(1), ""
		for k := 1; k < len(tones); k++ {
			if step := lightness(tones[k-1]) - lightness(tones[k]); step < c.step {
				t.Errorf("%s: lightness falls by %.2f from class %d to %d, want %g", c.name, step, k-1, k, c.step)
			}
			for name, see := range sights() {
				if d := 100 * see(seen(tones[k-1])).DistanceCIEDE2000(see(seen(tones[k]))); d < leastDiffer {
					leastDiffer, at = d, fmt.Sprintf("classes %d and %d, %s", k-1, k, name)
				}
			}
		}
		if leastDiffer < c.differ {
			t.Errorf("%s: difference %.2f between %s, want %g", c.name, leastDiffer, at, c.differ)
		}
		t.Logf("%s: least difference %.2f (%s)", c.name, leastDiffer, at)
	}
}

// The two sequential ramps must not be taken for one another: from the second class on their classes differ at equal lightness.
func TestUncertaintyDiffersFromLevel(t *testing.T) {
	level, uncertainty := levelRamp.tones(7), uncertaintyRamp.tones(7)
	for name, see := range sights() {
		for k := 1; k < 6; k++ { // the lowest and the highest class are near white and near black in both
			if d := 100 * see(seen(level[k])).DistanceCIEDE2000(see(seen(uncertainty[k]))); d < 7 {
				t.Errorf("class %d of both ramps differ by %.2f, %s", k, d, name)
			}
		}
	}
}

func TestTwoSidedRamp(t *testing.T) {
	tones := twoSided([]int{-3, -2, -1, 0, 1, 2, 3})
	for k := range 3 {
		below, above := tones[k], tones[6-k]
		if d := math.Abs(lightness(below) - lightness(above)); d > 1 {
			t.Errorf("arms at distance %d differ in lightness by %.2f", 3-k, d)
		}
		if step := lightness(tones[k+1]) - lightness(tones[k]); step < 15 {
			t.Errorf("lightness rises by %.2f from class %d to %d", step, k, k+1)
		}
		for name, see := range sights() {
			if d := 100 * see(seen(below)).DistanceCIEDE2000(see(seen(above))); d < 20 {
				t.Errorf("arms at distance %d differ by %.2f, %s", 3-k, d, name)
			}
			for _, j := range []int{k, 5 - k} {
				if d := 100 * see(seen(tones[j])).DistanceCIEDE2000(see(seen(tones[j+1]))); d < 11 {
					t.Errorf("classes %d and %d differ by %.2f, %s", j, j+1, d, name)
				}
			}
		}
	}
	if _, c, _ := seen(tones[3]).Hcl(); 100*c > 4 {
		t.Errorf("the middle has chroma %.2f", 100*c)
	}
}

// relativeLuminance and contrast as in WCAG 2.1 (W3C 2018); 3:1 is asked there of graphical objects (success criterion 1.4.11).
func relativeLuminance(c colorful.Color) float64 {
	r, g, b := c.LinearRgb()
	return 0.2126*r + 0.7152*g + 0.0722*b
}

func contrast(a, b colorful.Color) float64 {
	x, y := relativeLuminance(a)+0.05, relativeLuminance(b)+0.05
	return max(x, y) / min(x, y)
}

// Lines and marks are dark with a light edge: on every class at least one of the two stands out, and the two against each other.
func TestMarksStandOut(t *testing.T) {
	dark, _ := colorful.MakeColor(ink)
	light, _ := colorful.MakeColor(halo)
	red, _ := colorful.MakeColor(stampInk)
	soft, _ := colorful.MakeColor(softInk)
	if c := contrast(dark, light); c < 10 {
		t.Errorf("ink on its edge: %.1f", c)
	}
	if c := contrast(soft, light); c < 4.5 { // 1.4.3, text
		t.Errorf("soft ink on paper: %.1f", c)
	}
	if c := contrast(red, light); c < 4.5 {
		t.Errorf("stamp on paper: %.1f", c)
	}
	tones := twoSided([]int{-3, -2, -1, 0, 1, 2, 3})
	for _, r := range []ramp{levelRamp, uncertaintyRamp, chanceRamp} {
		for n := 1; n < maxEdges; n++ {
			tones = append(tones, r.tones(n)...)
		}
	}
	for _, tone := range tones {
		if c := max(contrast(dark, seen(tone)), contrast(light, seen(tone))); c < 3 {
			t.Errorf("marks on %+v: %.2f", tone, c)
		}
	}
}

// Paper must not look like the lowest class, nor hatching vanish on any class that carries it.
func TestPaperAndHatching(t *testing.T) {
	white := colorful.Color{R: 1, G: 1, B: 1}
	for _, r := range []ramp{levelRamp, uncertaintyRamp, chanceRamp, aboveRamp} {
		if d := 100 * white.DistanceCIEDE2000(seen(r.at(0))); d < 4.5 {
			t.Errorf("lowest class and paper differ by %.2f", d)
		}
	}
	for _, tone := range twoSided([]int{-3, -2, -1, 0})[:3] {
		if d := math.Abs(lightness(tone) - lightness(hatchOf(tone))); d < 15 {
			t.Errorf("hatching on %+v differs in lightness by %.2f", tone, d)
		}
	}
}

// A tone keeps its lightness when the screen cannot show its chroma.
func TestToneKeepsLightness(t *testing.T) {
	for _, r := range []ramp{levelRamp, uncertaintyRamp, chanceRamp, belowRamp, aboveRamp, {{50, 150, 0}, {60, 150, 120}}} {
		for i := 0; i <= 20; i++ {
			tone := r.at(float64(i) / 20)
			if d := math.Abs(lightness(tone) - tone.l); d > 0.6 {
				t.Errorf("%+v is shown with lightness %.2f", tone, lightness(tone))
			}
		}
	}
}
