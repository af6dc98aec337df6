package chart

import (
	"image/color"
	"math"

	"github.com/lucasb-eyer/go-colorful"
)

// The ramps are built in CIE LCh (the polar form of CIE 1976 L*a*b*, D65). Lightness runs in equal steps, so a grey copy
// keeps the order and the distances of the classes; hue and chroma only help. Tests hold the smallest step of lightness and the
// smallest CIEDE2000 difference between neighbours, for normal and for the three dichromatic kinds of sight.

// A tone is a colour: lightness 0 to 100, chroma about 0 to 100, hue in degrees.
type tone struct{ l, c, h float64 }

// A ramp is a path through tones at equal distances; the first is for low values.
type ramp []tone

var (
	// levelRamp goes from pale sand over moss to a deep blue-green.
	levelRamp = ramp{{91, 26, 98}, {76, 46, 112}, {59, 46, 138}, {42, 34, 178}, {23, 24, 235}}
	// uncertaintyRamp goes from a pale rose grey over mauve to a dark wine red.
	uncertaintyRamp = ramp{{91, 7, 310}, {75, 26, 318}, {58, 44, 335}, {41, 50, 358}, {22, 38, 20}}
	// chanceRamp goes from a pale blue grey over ochre to a dark brown.
	chanceRamp = ramp{{91, 12, 230}, {78, 26, 100}, {63, 58, 74}, {45, 58, 55}, {23, 34, 45}}
	// The arms of the two-sided ramp leave a neutral light grey: towards blue below 1, towards rust above. Blue against orange-red is
	// the pair of hues that all three kinds of dichromats keep apart.
	belowRamp = ramp{{92, 2, 255}, {65, 34, 258}, {36, 48, 275}}
	aboveRamp = ramp{{92, 2, 60}, {65, 48, 56}, {36, 56, 44}}
)

// at returns the tone at t between 0 and 1 along the ramp. Hue takes the shorter way round.
func (r ramp) at(t float64) tone {
	s := min(max(t, 0), 1) * float64(len(r)-1)
	i := min(int(s), len(r)-2)
	f := s - float64(i)
	a, b := r[i], r[i+1]
	turn := math.Mod(b.h-a.h+540, 360) - 180
	// Lightness ignores the stops in between: equal steps from end to end.
	l := r[0].l + t*(r[len(r)-1].l-r[0].l)
	return tone{l, a.c + f*(b.c-a.c), math.Mod(a.h+f*turn+360, 360)}
}

// rgb is the tone as a screen colour. A tone the screen cannot show loses chroma, never lightness.
func (t tone) rgb() color.RGBA {
	show := func(c float64) colorful.Color { return colorful.Hcl(t.h, c/100, t.l/100) }
	c := t.c
	if !show(c).IsValid() {
		low, high := 0.0, c
		for range 30 {
			if c = (low + high) / 2; show(c).IsValid() {
				low = c
			} else {
				high = c
			}
		}
		c = low
	}
	r, g, b := show(c).Clamped().RGB255()
	return color.RGBA{r, g, b, 255}
}

// tones returns n tones from end to end of the ramp; a single one is taken from its lighter half.
func (r ramp) tones(n int) []tone {
	if n == 1 {
		return []tone{r.at(0.3)}
	}
	t := make([]tone, n)
	for k := range t {
		t[k] = r.at(float64(k) / float64(n-1))
	}
	return t
}

// twoSided returns tones for classes whose places on a signed scale are given: 0 is neutral, negative below, positive above,
// lightness depending on the magnitude only.
func twoSided(place []int) []tone {
	furthest := 1
	for _, p := range place {
		furthest = max(furthest, p, -p)
	}
	t := make([]tone, len(place))
	for k, p := range place {
		if p < 0 {
			t[k] = belowRamp.at(float64(-p) / float64(furthest))
		} else {
			t[k] = aboveRamp.at(float64(p) / float64(furthest))
		}
	}
	return t
}

// hatchOf is the colour of the hatching over a class: the same tone, darker or, where that is dark already, lighter.
func hatchOf(t tone) tone {
	if t.l < 50 {
		return tone{t.l + 26, t.c * 0.7, t.h}
	}
	return tone{t.l - 24, t.c, t.h}
}

// Colours of everything that is not a class.
var (
	paper   = color.RGBA{255, 255, 255, 255}
	ink     = color.RGBA{24, 24, 28, 255}
	softInk = color.RGBA{82, 82, 90, 255}
	halo    = color.RGBA{255, 255, 255, 255}
	// stampInk is also the rule beside a caution.
	stampInk = color.RGBA{150, 10, 30, 255}
)
