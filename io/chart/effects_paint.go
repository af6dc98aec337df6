package chart

import (
	"image"
	"image/color"
	"image/draw"
	"math"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/clip"
	"gonum.org/v1/plot/vg"
)

// Tones of the effects: one hue, told apart by lightness alone, so that a grey copy loses nothing.
var (
	bandInk  = tone{87, 13, 235}.rgb()
	edgeInk  = tone{57, 26, 240}.rgb() // limits of a band, bars of levels
	crowdInk = tone{76, 20, 238}.rgb() // bars of a crowd
	lineInk  = tone{26, 34, 252}.rgb()
	zeroInk  = tone{42, 0, 0}.rgb()
	guideInk = tone{90, 0, 0}.rgb()
)

// Widths of lines and radii of dots in pixels.
const (
	estimateWidth = 4.5
	edgeWidth     = 1.6
	zeroWidth     = 2
	guideWidth    = 1.4
	barWidth      = 5
	dotSize       = 7.5
	baseSize      = 9
	arrowSize     = 9
)

// Ticks of observations: from how many on they are thinned, and the distance they then keep.
const (
	rugCrowd = 60
	rugApart = 4
	rugWidth = 1.6
)

func paintEffects(p effectsPage) *image.RGBA {
	sheet := newPen(int(p.w), int(p.h))
	for _, f := range p.plots {
		inner := newPen(int(f.x1-f.x0), int(f.y1-f.y0))
		f.paint(inner)
		at := image.Pt(int(f.x0), int(f.y0))
		draw.Draw(sheet.img, inner.img.Bounds().Add(at), inner.img, image.Point{}, draw.Src)
		page{frame: f.box, ticks: f.ticks}.paintFrame(sheet)
	}
	for _, k := range p.keys {
		paintEffectKey(sheet, k)
	}
	for _, r := range p.rules {
		sheet.fill(sheet.rect(r), stampInk)
	}
	for _, l := range p.labels {
		sheet.text(l, p.letters)
	}
	return sheet.img
}

func (f plot) paint(d pen) {
	switch f.form {
	case asCurve:
		f.paintCurve(d)
		f.paintRug(d)
	case asRows:
		f.paintRows(d)
	case asCrowd:
		f.paintCrowd(d)
	}
}

// paintCurve draws band, zero line and estimate from the lowest up.
func (f plot) paintCurve(d pen) {
	w, h := f.x1-f.x0, f.effect.pixels
	for _, r := range f.runs(func(i int) bool { return finite(f.panel.Estimate[i]) && f.interval(i) }) {
		lower, upper := f.trace(r, f.panel.Lower), f.trace(r, f.panel.Upper)
		window := orb.Bound{Max: orb.Point{w, h}}
		d.fill(d.chain(clip.Ring(window, loop(lower, upper))), bandInk)
		for _, limit := range []orb.LineString{lower, upper} {
			for _, part := range clip.LineString(window, limit) {
				d.stroke(d.chain(part), edgeWidth, edgeInk)
			}
		}
		if f.alone(r) {
			d.stroke(d.line(lower[0][0], min(lower[0][1], h), upper[0][0], upper[0][1]), barWidth, edgeInk)
		}
	}
	zero := h - f.effect.at(0)
	d.stroke(d.line(0, zero, w, zero), zeroWidth, zeroInk)
	full := discs(0, dotSize)
	for _, r := range f.runs(func(i int) bool { return finite(f.panel.Estimate[i]) }) {
		line := f.trace(r, f.panel.Estimate)
		d.stroke(d.chain(line), estimateWidth, lineInk)
		if f.alone(r) {
			stamp(d.img, &full, line[0][0], line[0][1], solid(lineInk))
		}
	}
}

func solid(c color.RGBA) func(int, int) color.RGBA { return func(int, int) color.RGBA { return c } }

// interval is true when both limits of i are given.
func (f plot) interval(i int) bool {
	return !math.IsNaN(f.panel.Lower[i]) && !math.IsNaN(f.panel.Upper[i])
}

// runs are the stretches of points from first to last (exclusive) for which ok holds.
func (f plot) runs(ok func(i int) bool) [][2]int {
	var all [][2]int
	for i := range f.panel.X {
		switch n := len(all); {
		case !ok(i):
		case n > 0 && all[n-1][1] == i:
			all[n-1][1] = i + 1
		default:
			all = append(all, [2]int{i, i + 1})
		}
	}
	return all
}

// alone is true for a run too narrow to be seen as a line.
func (f plot) alone(r [2]int) bool {
	return f.covariate.at(f.panel.X[r[1]-1])-f.covariate.at(f.panel.X[r[0]]) < 2
}

// trace is a run of values in pixels; points closer than half a pixel to the last one are passed over, but for the end.
func (f plot) trace(r [2]int, value []float64) orb.LineString {
	var line orb.LineString
	for i := r[0]; i < r[1]; i++ {
		q := orb.Point{f.covariate.at(f.panel.X[i]), f.effect.pixels - f.effect.at(value[i])}
		if n := len(line); n > 0 && i < r[1]-1 && math.Hypot(line[n-1][0]-q[0], line[n-1][1]-q[1]) < 0.5 {
			continue
		}
		line = append(line, q)
	}
	return line
}

// loop is the ring between two lines.
func loop(lower, upper orb.LineString) orb.Ring {
	ring := append(orb.Ring{}, lower...)
	for i := len(upper) - 1; i >= 0; i-- {
		ring = append(ring, upper[i])
	}
	return append(ring, lower[0])
}

// chain joins points given in pixels.
func (p pen) chain(line []orb.Point) vg.Path {
	var path vg.Path
	for i, q := range line {
		if i == 0 {
			path.Move(p.point(q[0], q[1]))
		} else {
			path.Line(p.point(q[0], q[1]))
		}
	}
	return path
}

// paintRug draws the observations' ticks in the strip below the curve.
func (f plot) paintRug(d pen) {
	h := f.y1 - f.y0
	taken := map[int]bool{}
	var path vg.Path
	for _, v := range f.panel.At {
		x := f.covariate.at(v)
		at := int(x)
		if len(f.panel.At) > rugCrowd {
			at = int(x / rugApart)
		}
		if !taken[at] {
			taken[at] = true
			path = append(path, d.line(x, h-rugHeight+6, x, h-3)...)
		}
	}
	d.stroke(path, rugWidth, softInk)
}

func (f plot) paintZero(d pen) {
	x := f.effect.at(0)
	d.stroke(d.line(x, 0, x, f.y1-f.y0), zeroWidth, zeroInk)
}

// paintRows draws a guide, a bar and a dot a level.
func (f plot) paintRows(d pen) {
	w := f.x1 - f.x0
	for i := range f.panel.Label {
		d.stroke(d.line(0, f.row[i], w, f.row[i]), guideWidth, guideInk)
	}
	f.paintZero(d)
	full := discs(0, dotSize)
	for i, v := range f.panel.Estimate {
		y := f.row[i]
		switch {
		case f.panel.Base != "" && f.panel.Label[i] == f.panel.Base:
			paintBase(d, f.effect.at(0), y)
		case finite(v):
			f.paintBar(d, i, y)
			stamp(d.img, &full, f.effect.at(v), y, solid(lineInk))
		}
	}
}

// paintBar draws the interval of a level, with an arrowhead where it goes on beyond the panel.
func (f plot) paintBar(d pen, i int, y float64) {
	if !f.interval(i) {
		return
	}
	w := f.x1 - f.x0
	from, to := f.effect.at(f.panel.Lower[i]), f.effect.at(f.panel.Upper[i])
	if from < 0 {
		d.fill(d.polygon([2]float64{1, y}, [2]float64{1 + 1.4*arrowSize, y - arrowSize}, [2]float64{1 + 1.4*arrowSize, y + arrowSize}), edgeInk)
		from = arrowSize
	}
	if to > w {
		d.fill(d.polygon([2]float64{w - 1, y}, [2]float64{w - 1 - 1.4*arrowSize, y - arrowSize}, [2]float64{w - 1 - 1.4*arrowSize, y + arrowSize}), edgeInk)
		to = w - arrowSize
	}
	d.stroke(d.line(from, y, to, y), barWidth, edgeInk)
}

// paintBase draws an open diamond.
func paintBase(d pen, x, y float64) {
	path := d.polygon([2]float64{x - baseSize, y}, [2]float64{x, y - baseSize}, [2]float64{x + baseSize, y}, [2]float64{x, y + baseSize})
	d.fill(path, paper)
	d.stroke(path, 2.4, ink)
}

// paintCrowd draws the levels as a staircase of dots; bars that would be thinner than a pixel run together into a band.
func (f plot) paintCrowd(d pen) {
	w := f.x1 - f.x0
	half := min(max(0.35*f.pitch, 0.5), barWidth/2.0)
	var bars vg.Path
	for i, v := range f.panel.Estimate {
		if finite(v) && f.interval(i) {
			y := f.row[i]
			bars = append(bars, d.rect(box{max(f.effect.at(f.panel.Lower[i]), 0), y - half, min(f.effect.at(f.panel.Upper[i]), w), y + half})...)
		}
	}
	d.fill(bars, crowdInk)
	f.paintZero(d)
	full := discs(0, min(max(0.45*f.pitch, 2), dotSize))
	for i, v := range f.panel.Estimate {
		if finite(v) {
			stamp(d.img, &full, f.effect.at(v), f.row[i], solid(lineInk))
		}
	}
}

func paintEffectKey(d pen, k key) {
	x, y := (k.x0+k.x1)/2, (k.y0+k.y1)/2
	switch k.kind {
	case keyAlong:
		d.fill(d.rect(box{k.x0, y - 11, k.x1, y + 11}), bandInk)
		d.stroke(d.line(k.x0, y-11, k.x1, y-11), edgeWidth, edgeInk)
		d.stroke(d.line(k.x0, y+11, k.x1, y+11), edgeWidth, edgeInk)
		d.stroke(d.line(k.x0, y, k.x1, y), estimateWidth, lineInk)
	case keyLevel:
		full := discs(0, dotSize)
		d.stroke(d.line(k.x0+2, y, k.x1-2, y), barWidth, edgeInk)
		stamp(d.img, &full, x, y, solid(lineInk))
	case keyBase:
		d.stroke(d.line(x, k.y0+2, x, k.y1-2), zeroWidth, zeroInk)
		paintBase(d, x, y)
	case keyRug:
		for _, at := range []float64{-20, -13, -9, 0, 4, 17} {
			d.stroke(d.line(x+at, y-6, x+at, y+6), rugWidth, softInk)
		}
	}
}
