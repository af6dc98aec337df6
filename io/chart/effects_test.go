package chart

import (
	"bytes"
	"errors"
	"fmt"
	"image"
	"image/color"
	"image/draw"
	"image/png"
	"io"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"strconv"
	"strings"
	"testing"

	"github.com/lucasb-eyer/go-colorful"
	"pgregory.net/rapid"
)

// curveOf is an invented curve at n values from x0 to x1: f of 0..1, give or take the half width.
func curveOf(name string, x0, x1 float64, n int, f, half func(u float64) float64) Panel {
	p := Panel{Name: name, Kind: Curve}
	for i := range n {
		u := float64(i) / float64(max(n-1, 1))
		v, h := f(u), half(u)
		p.X = append(p.X, x0+u*(x1-x0))
		p.Estimate, p.Lower, p.Upper = append(p.Estimate, v), append(p.Lower, v-h), append(p.Upper, v+h)
	}
	return p
}

// visits draws n observations between x0 and x1, denser towards x0.
func visits(x0, x1 float64, n int, seed uint64) []float64 {
	rng := rand.New(rand.NewPCG(seed, 3))
	var at []float64
	for range n {
		at = append(at, x0+(x1-x0)*math.Pow(rng.Float64(), 1.7))
	}
	return at
}

// levelsOf is an invented effect of levels, seeded.
func levelsOf(name string, kind PanelKind, labels []string, spread float64, seed uint64) Panel {
	rng := rand.New(rand.NewPCG(seed, 4))
	p := Panel{Name: name, Kind: kind, Label: labels}
	for range labels {
		v, h := spread*rng.NormFloat64(), spread*(0.4+rng.Float64())
		p.Estimate, p.Lower, p.Upper = append(p.Estimate, v), append(p.Lower, v-h), append(p.Upper, v+h)
	}
	return p
}

func numbered(word string, n int) []string {
	var all []string
	for i := range n {
		all = append(all, fmt.Sprintf("%s %d", word, i+1))
	}
	return all
}

func hump(u float64) float64   { return 1.1*math.Sin(3.3*u+0.3) - 0.6 }
func flared(u float64) float64 { return 0.15 + 1.6*math.Pow(math.Abs(u-0.42), 2.2) }

// effectsGallery is a page for each thing that can be drawn; names and numbers are invented.
func effectsGallery() map[string]Effects {
	const doubles = "log scale: +0.69 doubles the level"
	all := map[string]Effects{}
	depth := curveOf("depth", 0.2, 31, 120, hump, flared)
	depth.At = visits(0.2, 31, 45, 1)
	slope := curveOf("slope", 0, 48, 2, func(u float64) float64 { return 0.5 - u }, func(u float64) float64 { return 0.08 + 0.5*math.Abs(u-0.5) })
	slope.Kind, slope.At = Line, visits(0, 48, 900, 2)
	soil := levelsOf("soil", Levels, []string{"clay", "loam", "peat", "sand over gravel with standing water in spring"}, 0.7, 5)
	soil.Base, soil.Estimate[1], soil.Lower[1], soil.Upper[1] = "loam", 0, 0, 0
	observer := levelsOf("observer", Group, []string{"Asker", "Brandt", "Colm", "Dube", "Eriksen", "Farrow", "Groot", "Halloran", "Iqbal"}, 0.3, 6)
	plots := levelsOf("plot", Group, numbered("Plot", 160), 0.5, 7)
	peat := curveOf("depth, soil = sand over gravel with standing water in spring", 3, 19, 60, func(u float64) float64 { return 0.4*hump(u) + 0.3 }, flared)
	peat.At = visits(3, 19, 20, 8)
	gap := depth
	gap.Name, gap.Estimate = "distance to the dyke", append([]float64{}, depth.Estimate...)
	for i := 60; i < 75; i++ {
		gap.Estimate[i] = math.NaN()
	}
	gap.Estimate[110], gap.Estimate[112] = math.NaN(), math.Inf(1)
	scaled := func(p Panel) Panel { p.Scale = doubles; return p }

	all["one-curve"] = Effects{Title: "Effects on stems per hectare", Subtitle: "95 % intervals", Panels: []Panel{scaled(depth)}}
	all["two"] = Effects{Title: "Effects on stems per hectare", Subtitle: "95 % intervals", Panels: []Panel{scaled(depth), scaled(soil)}, SharedScale: true}
	all["six-shared"] = Effects{Title: "Effects on stems per hectare, Harrow valley forest", Subtitle: "95 % intervals, each effect with the others held", SharedScale: true,
		Panels: []Panel{scaled(depth), scaled(slope), scaled(soil), scaled(observer), scaled(plots), scaled(peat)},
		Foot:   []string{"Counts vary more than a Poisson model allows: intervals are too narrow by a factor of 1.4."}}
	own := all["six-shared"]
	own.SharedScale, own.Panels = false, []Panel{scaled(depth), slope, scaled(gap), observer, plots, scaled(peat)}
	all["six-own"] = own
	all["twelve-and-more"] = Effects{Title: "Effects on the prevalence of malaria, Tavish coast", Subtitle: "90 % intervals", SharedScale: true,
		Panels: []Panel{depth, slope, soil, observer, plots, peat, gap, depth, slope, soil, observer, plots, depth, slope, peat}}
	wild := levelsOf("district", Levels, []string{"Lower Marsh", "Ostrava Reach", "Pellworm", "High Tavish", "Inner Harrow"}, 0.5, 9)
	wild.Lower[2], wild.Upper[2] = -4000, 3500
	wild.Upper[3] = math.Inf(1)
	wild.Estimate[4] = math.NaN()
	all["wide-intervals"] = Effects{Title: "A district without a single case", Panels: []Panel{scaled(wild), scaled(depth)}, SharedScale: true}
	all["forty-levels"] = Effects{Title: "Group of forty", Panels: []Panel{levelsOf("village", Group, numbered("Village", 40), 0.4, 10), depth, soil}}
	all["tall-categories"] = Effects{Title: "Long categories", Panels: []Panel{levelsOf("land use", Levels, numbered("Kind of use number", 30), 0.4, 11), levelsOf("many", Levels, numbered("Use", 55), 0.4, 12), depth, soil}}
	long := strings.Repeat("proportion of the plot covered by reeds higher than two metres, ", 5) + "first visit"
	prefix := "Municipal administrative district of the northern and western coast, "
	all["long-names"] = Effects{Title: "Density of breeding pairs of the long-tailed marsh warbler on the northern and western reed beds, all visits of the spring survey taken together, both observers", SharedScale: true,
		Panels: []Panel{func() Panel {
			p := depth
			p.Name, p.Scale = long, "logit scale: "+strings.Repeat("+1 multiplies the odds by 2.7 ", 8)
			return p
		}(),
			levelsOf("Wasserschutzgebietsverordnungsdurchführungsbestimmung", Levels, []string{prefix + "part A", prefix + "part B", strings.Repeat("W", 90), ""}, 2, 13), scaled(depth)}}
	tiny := curveOf("trace gas", 1e-12, 9e-12, 50, func(u float64) float64 { return 1e-12 * hump(u) }, func(u float64) float64 { return 1e-13 })
	huge := curveOf("distance", 0, 1e12, 50, func(u float64) float64 { return 1e12 * hump(u) }, func(u float64) float64 { return 3e11 })
	east := curveOf("easting", 431200.5, 431207.5, 50, hump, flared)
	year := curveOf("year", 1987, 2021, 35, hump, flared)
	year.At = []float64{1987, 1990, 1994, 1994, 2003, 2021}
	same := curveOf("identical values", 7, 7, 9, func(u float64) float64 { return 0.4 }, func(u float64) float64 { return 0.2 })
	same.At = []float64{7, 7, 7}
	all["numbers"] = Effects{Title: "Very small and very large numbers", Panels: []Panel{tiny, huge, east, year, same}}
	none := curveOf("nothing estimated", 0, 1, 5, func(float64) float64 { return math.NaN() }, flared)
	one := levelsOf("one level", Levels, []string{"only"}, 1, 14)
	zero := curveOf("no effect at all", 0, 1, 30, func(float64) float64 { return 0 }, func(float64) float64 { return 0 })
	single := curveOf("one point", 3, 3, 1, func(float64) float64 { return 0.7 }, func(float64) float64 { return 0.4 })
	all["rims"] = Effects{Title: "At the rim", Panels: []Panel{none, one, zero, single}}
	return all
}

// effectsOf draws an arbitrary page: any number of panels of any kind, size of numbers, amount of text, gaps and limits.
func effectsOf(t *rapid.T) Effects {
	word := rapid.SampledFrom([]string{"depth", "of", "marsh", "kg⁻¹", "=", "1000", "people,", "Wasserschutzgebietsverordnung", "µg/m³", "standing", "WWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWWW"})
	text := func(name string, most int) string {
		return strings.Join(rapid.SliceOfN(word, 0, most).Draw(t, name), " ")
	}
	e := Effects{Title: "Effects " + text("title", 40), Subtitle: text("subtitle", 20), SharedScale: rapid.Bool().Draw(t, "shared")}
	scale := text("scale", 30)
	for range rapid.IntRange(1, 15).Draw(t, "panels") {
		p := panelOf(t, text)
		p.Name, p.Scale = "x "+text("name", 12), scale
		if rapid.IntRange(0, 3).Draw(t, "other scale") == 0 {
			p.Scale = text("own scale", 8)
		}
		e.Panels = append(e.Panels, p)
	}
	for range rapid.IntRange(0, 3).Draw(t, "foot") {
		e.Foot = append(e.Foot, text("caution", 30))
	}
	return e
}

func panelOf(t *rapid.T, text func(name string, most int) string) Panel {
	kind := PanelKind(rapid.IntRange(0, 3).Draw(t, "kind"))
	n := rapid.SampledFrom([]int{1, 2, 3, 7, 12, 13, 40, 41, 300}).Draw(t, "n")
	decade := math.Pow(10, rapid.Float64Range(-12, 12).Draw(t, "decade"))
	rng := rand.New(rand.NewPCG(rapid.Uint64().Draw(t, "seed"), 1))
	same, holes := rapid.Bool().Draw(t, "same"), rapid.IntRange(0, 3).Draw(t, "holes")
	p := Panel{Kind: kind}
	x := rapid.SampledFrom([]float64{0, -3, 431200.5, 1e12, -1e-12}).Draw(t, "x")
	step := rapid.SampledFrom([]float64{0, 1e-12, 0.37, 1e6}).Draw(t, "step")
	for i := range n {
		v, h := decade*rng.NormFloat64(), decade*rng.ExpFloat64()
		if same {
			v = decade
		}
		lower, upper := v-h, v+h
		switch r := rng.IntN(12); {
		case r < holes:
			v = math.NaN()
		case r == 10 && holes > 1:
			lower, upper = math.Inf(-1), 1e9*math.Abs(v)
		case r == 11 && holes > 1:
			lower = math.NaN()
		}
		p.Estimate, p.Lower, p.Upper = append(p.Estimate, v), append(p.Lower, lower), append(p.Upper, upper)
		if p.along() {
			p.X = append(p.X, x+float64(i)*step)
		} else {
			p.Label = append(p.Label, fmt.Sprint("level ", i))
		}
	}
	if !p.along() {
		p.Label[0] = text("label", 12)
		if kind == Levels && rapid.Bool().Draw(t, "base") {
			p.Base = "the base"
		}
		return p
	}
	for range rapid.SampledFrom([]int{0, 1, 50, 2000}).Draw(t, "observations") {
		p.At = append(p.At, x+rng.Float64()*step*float64(n))
	}
	return p
}

// checkEffectsPage holds what a page promises: everything inside it, nothing on top of anything else, no text lost.
func checkEffectsPage(t interface{ Errorf(string, ...any) }, e Effects, p effectsPage) {
	all, name := p.boxes()
	for i, f := range p.plots {
		all = append(all, box{f.x0 - 1, f.y0 - 1, f.x1 + 1, f.y1 + tickLength})
		name = append(name, fmt.Sprintf("plot %d", i+1))
	}
	const slack = 1e-6 // sums of widths
	for i, b := range all {
		b = box{b.x0 + slack, b.y0 + slack, b.x1 - slack, b.y1 - slack}
		if !b.within(box{0, 0, p.w, p.h}) {
			t.Errorf("%s %v is not on the page of %g x %g", name[i], b, p.w, p.h)
		}
		for j := range i {
			if b.overlaps(all[j]) {
				t.Errorf("%s %v overlaps %s %v", name[i], b, name[j], all[j])
			}
		}
	}
	var b strings.Builder
	for _, l := range p.labels {
		b.WriteString(strings.Join(strings.Fields(l.text), ""))
	}
	written := b.String()
	texts := append([]string{e.Title, e.Subtitle}, e.Foot...)
	for _, q := range e.shown() {
		texts = append(texts, q.Name, q.Scale)
		for _, name := range q.Label {
			// A level's name stands there, or its page says where to find it.
			if !strings.Contains(written, strings.Join(strings.Fields(name), "")) && !strings.Contains(written, "infullineffects.csv") && !strings.Contains(written, "namedineffects.csv") {
				t.Errorf("level %q is lost", name)
			}
		}
	}
	for _, s := range texts {
		if !strings.Contains(written, strings.Join(strings.Fields(s), "")) {
			t.Errorf("%q is not written whole", s)
		}
	}
	for i, f := range p.plots {
		for _, v := range []float64{f.x0, f.x1, f.y0, f.y1} {
			if v != math.Floor(v) {
				t.Errorf("plot %d is not on whole pixels: %v", i+1, f.box)
			}
		}
		if f.x1-f.x0 < 150 || f.y1-f.y0 < leastPlot {
			t.Errorf("plot %d is %g x %g pixels", i+1, f.x1-f.x0, f.y1-f.y0)
		}
		if !(f.effect.lo < 0 && f.effect.hi > 0) {
			t.Errorf("plot %d: 0 is not within %g to %g", i+1, f.effect.lo, f.effect.hi)
		}
		for _, v := range f.panel.Estimate {
			if finite(v) && !(v > f.effect.lo && v < f.effect.hi) {
				t.Errorf("plot %d: the estimate %g is not within %g to %g", i+1, v, f.effect.lo, f.effect.hi)
			}
		}
	}
}

func TestEffectsNothingOverlapsNothingIsCut(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		e := effectsOf(t)
		if err := e.Validate(); err != nil {
			t.Fatal(err)
		}
		checkEffectsPage(t, e, newEffectsPage(e))
	})
}

// The rims of what is allowed are painted too, not only laid out: a few arbitrary pages, whatever is in them.
func TestEffectsPaintAnything(t *testing.T) {
	for seed := range 3 {
		e := rapid.Custom(effectsOf).Example(seed)
		p := newEffectsPage(e)
		checkInk(&named{t, fmt.Sprint("seed ", seed)}, p, paintEffects(p))
	}
}

// TestEffectsGallery lays out and paints every variant once; with -pictures it leaves them to be looked at.
func TestEffectsGallery(t *testing.T) {
	kinds := map[PanelKind]bool{}
	for name, e := range effectsGallery() {
		p := newEffectsPage(e)
		checkEffectsPage(&named{t, name}, e, p)
		if p.w != longSide || p.h > 1.1*longSide {
			t.Errorf("%s: %g x %g pixels", name, p.w, p.h)
		}
		for _, q := range e.Panels {
			kinds[q.Kind] = true
		}
		img := paintEffects(p)
		if *pictures != "" {
			var b bytes.Buffer
			if err := errors.Join(png.Encode(&b, img), os.WriteFile(filepath.Join(*pictures, "effects-"+name+".png"), b.Bytes(), 0o644)); err != nil {
				t.Fatal(err)
			}
		}
		checkInk(&named{t, name}, p, img)
	}
	if len(kinds) != 4 {
		t.Errorf("kinds drawn: %v", kinds)
	}
}

// checkInk is independent of the boxes' own arithmetic: on the painted page there is no ink outside the boxes. It wipes the boxes.
func checkInk(t interface{ Errorf(string, ...any) }, p effectsPage, img *image.RGBA) {
	all, _ := p.boxes()
	for _, f := range p.plots {
		all = append(all, box{f.x0 - tickLength, f.y0, f.x1, f.y1 + tickLength})
	}
	for _, b := range all {
		wiped := image.Rect(int(b.x0)-2, int(b.y0)-2, int(b.x1)+3, int(b.y1)+3)
		draw.Draw(img, wiped, image.White, image.Point{}, draw.Src)
	}
	for i := 0; i < len(img.Pix); i += 4 {
		if img.Pix[i] != 255 || img.Pix[i+1] != 255 || img.Pix[i+2] != 255 {
			t.Errorf("ink at (%d, %d)", i/4%img.Bounds().Dx(), i/4/img.Bounds().Dx())
			return
		}
	}
}

func TestSameEffectsSameBytes(t *testing.T) {
	var a, b bytes.Buffer
	if err := errors.Join(effectsGallery()["six-own"].WritePNG(&a), effectsGallery()["six-own"].WritePNG(&b)); err != nil {
		t.Fatal(err)
	}
	if !bytes.Equal(a.Bytes(), b.Bytes()) {
		t.Error("two runs differ")
	}
}

// A ruler reads a painted axis as a person does: from the places and the texts of its outermost labels.
type ruler struct{ v0, p0, v1, p1 float64 }

func (r ruler) pixel(v float64) float64 { return r.p0 + (v-r.v0)/(r.v1-r.v0)*(r.p1-r.p0) }

// rulers reads the labels around a page's first plot.
func rulers(t *testing.T, p effectsPage) (across, up ruler) {
	t.Helper()
	f := p.plots[0]
	read := func(inside func(l label) bool, place func(l label) float64) ruler {
		var v, at []float64
		for _, l := range p.labels {
			if x, err := strconv.ParseFloat(strings.Replace(l.text, "−", "-", 1), 64); err == nil && inside(l) {
				v, at = append(v, x), append(at, place(l))
			}
		}
		if len(v) == 0 {
			return ruler{}
		}
		return ruler{v[0], at[0], v[len(v)-1], at[len(at)-1]}
	}
	across = read(func(l label) bool { return l.y0 > f.y1 && l.y0 < f.y1+2*tickRoom() && l.x0 < f.x1 }, func(l label) float64 { return (l.x0 + l.x1) / 2 })
	up = read(func(l label) bool { return l.x1 < f.x0 && l.y0 > f.y0-20 && l.y1 < f.y1+20 }, func(l label) float64 { return (l.y0 + l.y1) / 2 })
	if across.v0 == across.v1 {
		t.Fatalf("fewer than two numbers below the plot: %+v", across)
	}
	return across, up
}

func decodedEffects(t *testing.T, e Effects) image.Image {
	t.Helper()
	var b bytes.Buffer
	if err := e.WritePNG(&b); err != nil {
		t.Fatal(err)
	}
	img, err := png.Decode(&b)
	if err != nil {
		t.Fatal(err)
	}
	return img
}

// The band lies between the limits, the line on the estimate, the zero line at 0, and a gap is bare: read off the
// picture by its own tick labels.
func TestBandLiesWhereTheAxesSay(t *testing.T) {
	q := curveOf("depth", 0, 10, 101, func(u float64) float64 { return 2 + u }, func(u float64) float64 { return 0.5 + u })
	for i := 60; i <= 70; i++ {
		q.Estimate[i] = math.NaN()
	}
	q.At = []float64{1, 1, 2.5, 9}
	e := Effects{Title: "Band", Panels: []Panel{q}}
	img := decodedEffects(t, e)
	across, up := rulers(t, newEffectsPage(e))
	at := func(x, v float64) color.RGBA { return rgbaAt(img, across.pixel(x), up.pixel(v)) }
	for _, x := range []float64{0.7, 2, 3.3, 5.5, 7.5, 9.3} {
		u := x / 10
		estimate, half := 2+u, 0.5+u
		for _, c := range []struct {
			what string
			v    float64
			want color.RGBA
		}{
			{"estimate", estimate, lineInk},
			{"upper half of the band", estimate + half/2, bandInk},
			{"lower half of the band", estimate - half/2, bandInk},
			{"just within the upper limit", estimate + half - 0.04, bandInk},
			{"just within the lower limit", estimate - half + 0.04, bandInk},
			{"above the band", estimate + half + 0.04, paper},
			{"below the band", estimate - half - 0.04, paper},
			{"zero", 0, zeroInk},
		} {
			if got := at(x, c.v); got != c.want {
				t.Errorf("%s at x = %g, %g: colour %v, want %v", c.what, x, c.v, got, c.want)
			}
		}
	}
	for v := 0.1; v < 4; v += 0.05 {
		if got := at(6.5, v); got != paper {
			t.Errorf("in the gap at %g: colour %v", v, got)
		}
	}
	// The observations: as many dark columns in the strip as there are different values.
	p := newEffectsPage(e)
	f, ticks, before := p.plots[0], 0, false
	for x := f.x0 + 2; x < f.x1-2; x++ {
		dark := rgbaAt(img, x, f.y1-rugHeight/2).R < 200
		if dark && !before {
			ticks++
			if v := across.v0 + (x-across.p0)/(across.p1-across.p0)*(across.v1-across.v0); math.Abs(v-1) > 0.02 && math.Abs(v-2.5) > 0.02 && math.Abs(v-9) > 0.02 {
				t.Errorf("tick of an observation at %g", v)
			}
		}
		before = dark
	}
	if ticks != 3 {
		t.Errorf("%d ticks of observations, want 3", ticks)
	}
}

// Dots, bars and the base's mark stand in the row of their name at the value that the axis says.
func TestLevelsStandWhereTheAxisSays(t *testing.T) {
	q := Panel{Name: "soil", Kind: Levels, Label: []string{"clay", "peat", "sand", "silt"}, Base: "loam",
		Estimate: []float64{1.5, -1, math.NaN(), 0.2}, Lower: []float64{1, -2, 0, -900}, Upper: []float64{2, 0.5, 1, 700}}
	e := Effects{Title: "Levels", Panels: []Panel{q}}
	img := decodedEffects(t, e)
	p := newEffectsPage(e)
	across, _ := rulers(t, p)
	row := map[string]float64{}
	for _, l := range p.labels {
		row[l.text] = (l.y0 + l.y1) / 2
	}
	for _, c := range []struct {
		level string
		v     float64
		want  color.RGBA
	}{
		{"clay", 1.5, lineInk}, {"clay", 1.1, edgeInk}, {"clay", 1.9, edgeInk}, {"clay", 0.8, guideInk}, {"clay", 2.2, guideInk},
		{"peat", -1, lineInk}, {"peat", -1.9, edgeInk}, {"peat", 0.4, edgeInk}, {"peat", 0.8, guideInk},
		{"sand", 0.5, guideInk}, {"sand", -1, guideInk}, {"sand", 0, zeroInk},
		{"silt", 0.2, lineInk}, {"silt", -2, edgeInk}, {"silt", 2, edgeInk},
		{"loam", 0, paper}, {"loam", 1, guideInk},
	} {
		got := rgbaAt(img, across.pixel(c.v), row[c.level])
		if faint := c.want == guideInk && got.R >= guideInk.R && got.R < 255 && got.G == got.R; got != c.want && !faint {
			t.Errorf("%s at %g: colour %v, want %v", c.level, c.v, got, c.want)
		}
	}
	if row["loam"] > row["clay"] {
		t.Error("the base added to the levels is not the first row")
	}
	// silt goes on beyond the panel: its bar reaches both edges, and the page says so.
	f := p.plots[0]
	if a, b := rgbaAt(img, f.x0+8, row["silt"]), rgbaAt(img, f.x1-8, row["silt"]); a != edgeInk || b != edgeInk {
		t.Errorf("at the edges the endless bar is %v and %v", a, b)
	}
	// An arrowhead is wider than a bar: just inside its broad end there is ink beside the bar.
	for _, x := range []float64{f.x0 + 12, f.x1 - 12} {
		if got, plain := rgbaAt(img, x, row["silt"]+barWidth), rgbaAt(img, x, row["peat"]+barWidth); got != edgeInk || plain != paper {
			t.Errorf("at %g there is no arrowhead: colour %v, beside another bar %v", x, got, plain)
		}
	}
	if !says(p, "Intervals too wide for their panel end at its edge") {
		t.Error("nothing says that an interval is cut")
	}
}

func says(p effectsPage, text string) bool {
	all := ""
	for _, l := range p.labels {
		all += l.text + " "
	}
	return strings.Contains(all, text)
}

func TestGroupsAreOrdered(t *testing.T) {
	g := Panel{Name: "village", Kind: Group, Label: []string{"low", "none", "high", "middle"}, Estimate: []float64{-1, math.NaN(), 1, 0.1}, Lower: []float64{-2, 0, 0.5, -1}, Upper: []float64{0, 0, 2, 1}}
	p := newEffectsPage(Effects{Title: "t", Panels: []Panel{g}})
	if got := strings.Join(p.plots[0].panel.Label, " "); got != "high middle low none" {
		t.Errorf("rows %q", got)
	}
	if g.Label[0] != "low" {
		t.Error("the caller's levels were reordered")
	}
	many := levelsOf("village", Group, numbered("Village", 41), 1, 1)
	above, below := 0, 0
	for i := range many.Estimate {
		if many.Lower[i] > 0 {
			above++
		}
		if many.Upper[i] < 0 {
			below++
		}
	}
	p = newEffectsPage(Effects{Title: "t", Panels: []Panel{many}})
	if want := fmt.Sprintf("41 levels, highest first, named in effects.csv. Intervals above 0: %d, below 0: %d.", above, below); above*below == 0 || !says(p, want) {
		t.Errorf("nothing says %q", want)
	}
	if says(p, "Village 7 ") {
		t.Error("41 levels have names")
	}
	many.Label, many.Estimate, many.Lower, many.Upper = many.Label[:40], many.Estimate[:40], many.Lower[:40], many.Upper[:40]
	if !says(newEffectsPage(Effects{Title: "t", Panels: []Panel{many}}), "Village 7 ") {
		t.Error("40 levels have no names")
	}
}

func TestMorePanelsThanAPageHolds(t *testing.T) {
	one := curveOf("depth", 0, 1, 9, hump, flared)
	for n, want := range map[int]string{12: "", 13: "1 more effect is in effects.csv.", 40: "28 more effects are in effects.csv."} {
		e := Effects{Title: "t"}
		for range n {
			e.Panels = append(e.Panels, one)
		}
		p := newEffectsPage(e)
		if len(p.plots) != 12 || want != "" && !says(p, want) || want == "" && says(p, "more effect") {
			t.Errorf("%d panels: %d drawn, want 12 and %q", n, len(p.plots), want)
		}
		if p.h > longSide {
			t.Errorf("12 curves make a page %g high", p.h)
		}
	}
}

// With a shared scale every curve has the same ticks at the same heights, without it each has its own.
func TestSharedScale(t *testing.T) {
	small := curveOf("small", 0, 1, 9, func(u float64) float64 { return 0.1 * u }, func(float64) float64 { return 0.02 })
	large := curveOf("large", 0, 1, 9, func(u float64) float64 { return 30 * u }, func(float64) float64 { return 5 })
	factor := levelsOf("soil", Levels, []string{"clay", "peat"}, 1, 1)
	texts := func(shared bool) (left []string, p effectsPage) {
		p = newEffectsPage(Effects{Title: "t", Panels: []Panel{small, large, factor}, SharedScale: shared})
		for _, f := range p.plots[:2] {
			s := ""
			for _, k := range f.ticks {
				if k.text != "" && k.edge != bottom {
					s += fmt.Sprintf("%s at %.3f; ", k.text, k.at)
				}
			}
			left = append(left, s)
		}
		return left, p
	}
	left, p := texts(true)
	if left[0] != left[1] || p.plots[0].y1-p.plots[0].y0 != p.plots[1].y1-p.plots[1].y0 || !says(p, "All panels have the same scale for the effect.") {
		t.Errorf("shared: %q", left)
	}
	if a, b := p.plots[0].effect, p.plots[2].effect; a.lo != b.lo || a.hi != b.hi {
		t.Errorf("levels run over %g to %g, curves over %g to %g", b.lo, b.hi, a.lo, a.hi)
	}
	left, p = texts(false)
	if left[0] == left[1] || !says(p, "Each panel has its own scale for the effect.") {
		t.Errorf("not shared: %q", left)
	}
}

// The contrast of WCAG 2.1 (W3C 2018) depends on luminance alone, so what holds here holds for a grey copy; 3:1 is asked of graphical
// objects (success criterion 1.4.11), and the line, which carries the message, keeps the 4.5:1 of text.
func TestEffectsAreLegibleInGrey(t *testing.T) {
	for _, c := range []struct {
		what string
		a, b color.RGBA
		want float64
	}{
		{"line on its band", lineInk, bandInk, 4.5},
		{"limit beside paper", edgeInk, paper, 3},
		{"dot on its bar", lineInk, edgeInk, 3},
		{"dot on the bars of a crowd", lineInk, crowdInk, 3},
		{"zero line on a band", zeroInk, bandInk, 3},
		{"tick of an observation", softInk, paper, 3},
	} {
		a, _ := colorful.MakeColor(c.a)
		b, _ := colorful.MakeColor(c.b)
		if got := contrast(a, b); got < c.want {
			t.Errorf("%s: contrast %.2f, want %g", c.what, got, c.want)
		}
	}
}

func TestEffectsValidate(t *testing.T) {
	good := func() Effects {
		return Effects{Title: "t", Panels: []Panel{
			{Name: "depth", Kind: Curve, X: []float64{1, 1, 2}, At: []float64{3}, Estimate: []float64{0, math.NaN(), 1}, Lower: []float64{-1, 0, math.NaN()}, Upper: []float64{1, 0, math.Inf(1)}},
			{Name: "soil", Kind: Levels, Label: []string{"a", "b"}, Base: "a", Estimate: []float64{0, 1}, Lower: []float64{0, 0}, Upper: []float64{0, 2}},
		}}
	}
	for _, c := range []struct {
		name string
		bend func(*Effects)
		want string
	}{
		{"no title", func(e *Effects) { e.Title = " " }, "needs a title"},
		{"no panels", func(e *Effects) { e.Panels = nil }, "no effects to draw"},
		{"kind", func(e *Effects) { e.Panels[0].Kind = 7 }, `panel 1 "depth": unknown kind of panel 7`},
		{"empty curve", func(e *Effects) { e.Panels[0] = Panel{Name: "none"} }, `panel 1 "none": 0 x`},
		{"empty levels", func(e *Effects) { e.Panels[1] = Panel{Name: "none", Kind: Group} }, `panel 2 "none": 0 labels`},
		{"x missing", func(e *Effects) { e.Panels[0].X = e.Panels[0].X[:2] }, "2 x, 3 estimates, 3 lower and 3 upper limits"},
		{"lower missing", func(e *Effects) { e.Panels[1].Lower = nil }, "2 labels, 2 estimates, 0 lower and 2 upper limits"},
		{"labels on a curve", func(e *Effects) { e.Panels[0].Label = []string{"a"} }, "a curve has no labels"},
		{"x on levels", func(e *Effects) { e.Panels[1].At = []float64{1} }, "levels have no x"},
		{"x falls", func(e *Effects) { e.Panels[0].X[2] = 0 }, "x must not decrease: number 3 is 0"},
		{"x is NaN", func(e *Effects) { e.Panels[0].X[1] = math.NaN() }, "number 2 is NaN"},
		{"observation at infinity", func(e *Effects) { e.Panels[0].At[0] = math.Inf(1) }, "observation 1 is at +Inf"},
		{"base of a curve", func(e *Effects) { e.Panels[0].Base = "a" }, `base level "a"`},
		{"base not 0", func(e *Effects) { e.Panels[1].Base = "b" }, `the base level "b" has the estimate 1`},
		{"base twice", func(e *Effects) { e.Panels[1].Label[1] = "a" }, `"a" stands there twice`},
		{"limits swapped", func(e *Effects) { e.Panels[1].Lower[1], e.Panels[1].Upper[1] = 2, 0 }, "estimate 2 is 1, outside its limits 2 and 0"},
		{"a book", func(e *Effects) { e.Panels[1].Name = strings.Repeat("word ", 5000) }, "letters of text"},
	} {
		e := good()
		c.bend(&e)
		var b bytes.Buffer
		err := e.WritePNG(&b)
		if err == nil || !strings.HasPrefix(err.Error(), "chart: ") || !strings.Contains(err.Error(), c.want) || b.Len() > 0 {
			t.Errorf("%s: error %v and %d bytes, want %q and none", c.name, err, b.Len(), c.want)
		}
	}
	if err := good().Validate(); err != nil {
		t.Error(err)
	}
}

func BenchmarkEffects(b *testing.B) {
	e := effectsGallery()["six-own"]
	b.Run("layout", func(b *testing.B) {
		for b.Loop() {
			newEffectsPage(e)
		}
	})
	b.Run("paint", func(b *testing.B) {
		for b.Loop() {
			paintEffects(newEffectsPage(e))
		}
	})
	b.Run("write", func(b *testing.B) {
		for b.Loop() {
			if err := e.WritePNG(io.Discard); err != nil {
				b.Fatal(err)
			}
		}
	})
}
