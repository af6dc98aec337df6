package chart

import (
	"image"
	"image/color"
	"image/draw"
	"math"
	"strings"

	"github.com/paulmach/orb"
	"github.com/paulmach/orb/clip"
	"gonum.org/v1/plot/vg"
)

// paint draws a page. The map is drawn on a picture of its own, so that the edge of the frame cuts whatever passes it.
func paint(p page) *image.RGBA {
	sheet := newPen(int(p.w), int(p.h))
	inner := newPen(p.view.w, p.view.h)
	p.paintMap(inner)
	at := image.Pt(int(p.frame.x0), int(p.frame.y0))
	draw.Draw(sheet.img, inner.img.Bounds().Add(at), inner.img, image.Point{}, draw.Src)
	p.paintFrame(sheet)
	p.paintLegend(sheet)
	p.paintMeasures(sheet)
	for _, r := range p.rules {
		sheet.fill(sheet.rect(r), stampInk)
	}
	for _, l := range p.labels {
		sheet.text(l, p.letters)
	}
	return sheet.img
}

func (p page) paintMap(d pen) {
	switch {
	case p.m.Shapes.given():
		p.paintShapes(d)
	case p.m.Value == nil:
		p.paintZones(d)
		p.paintOutline(d)
		p.paintDots(d.img, p.m.Dots)
	default:
		p.paintCells(d.img)
		p.paintZones(d)
		p.paintOutline(d)
	}
	p.paintObservations(d.img)
	for _, l := range p.names {
		path := d.letters(l, p.letters)
		d.stroke(path, 5, halo)
		d.fill(path, ink)
	}
	p.paintStamp(d)
}

// Period and width of the hatching, in pixels along a row.
const (
	hatchPeriod = 14
	hatchWidth  = 3
)

func hatchedAt(px, py int) bool { return (px+py)%hatchPeriod < hatchWidth }

// paintCells fills each pixel with the colour of the cell its centre lies in. Columns and rows are looked up once each.
func (p page) paintCells(img *image.RGBA) {
	l := p.m.Lattice
	class := make([]int8, len(p.m.Value))
	for k, v := range p.m.Value {
		class[k] = -1
		if l.In(k) {
			class[k] = int8(p.classes.of(v))
		}
	}
	fill, hatch := p.classes.colours()
	column := make([]int, p.view.w)
	for px := range column {
		x, _ := p.view.toPlane(float64(px)+0.5, 0)
		column[px] = cellAt(x, l.X0, l.Cell, l.NX)
	}
	for py := range p.view.h {
		_, y := p.view.toPlane(0, float64(py)+0.5)
		j := cellAt(y, l.Y0, l.Cell, l.NY)
		if j < 0 {
			continue
		}
		row, pix := class[j*l.NX:(j+1)*l.NX], img.Pix[py*img.Stride:]
		for px, i := range column {
			if i < 0 || row[i] < 0 {
				continue
			}
			c := fill[row[i]]
			if p.classes.hatched[row[i]] && hatchedAt(px, py) {
				c = hatch[row[i]]
			}
			pix[4*px], pix[4*px+1], pix[4*px+2] = c.R, c.G, c.B
		}
	}
}

// cellAt is the index of the cell that holds coordinate v, -1 outside.
func cellAt(v, origin, cell float64, n int) int {
	if i := math.Floor((v - origin) / cell); i >= 0 && i < float64(n) {
		return int(i)
	}
	return -1
}

// colouring returns the colour of a class at a pixel; class -1 is no value.
func (p page) colouring() func(class, px, py int) color.RGBA {
	fill, hatch := p.classes.colours()
	blank := func(int, int) color.RGBA { return paper }
	if p.m.Shapes.given() {
		blank = blankShape
	}
	return func(class, px, py int) color.RGBA {
		switch {
		case class < 0:
			return blank(px, py)
		case p.classes.hatched[class] && hatchedAt(px, py):
			return hatch[class]
		}
		return fill[class]
	}
}

func (p page) paintDots(img *image.RGBA, d Dots) {
	r := dotRadius(len(d.X), float64(p.view.w)*float64(p.view.h))
	ring, full := discs(0, r+1.6), discs(0, r)
	colour := p.colouring()
	for i := range d.X {
		x, y := p.view.toPixel(d.X[i], d.Y[i])
		stamp(img, &ring, x, y, func(int, int) color.RGBA { return ink })
		k := p.classes.of(d.Value[i])
		stamp(img, &full, x, y, func(px, py int) color.RGBA { return colour(k, px, py) })
	}
}

// dotRadius shrinks the dots as they crowd, so that they cover about a third of the map at most.
func dotRadius(n int, area float64) float64 {
	return min(max(0.33*math.Sqrt(area/float64(n)), 3), dotLargest)
}

const dotLargest = 13

// crowd is the number of observations from which marks are thinned.
const crowd = 600

// markRadius is the radius of an observation's ring.
func markRadius(n int) float64 {
	switch {
	case n <= 150:
		return 7
	case n <= crowd:
		return 5.5
	}
	return 3.8
}

// sparse is the side in pixels of the squares that hold one mark at most when they crowd: marks then cover less than a sixth of the map.
const sparse = 24

// paintObservations draws a dark ring with a light one on both sides of it: one of the two stands out on any colour.
// Of a crowd, marks close to one already drawn are left out.
func (p page) paintObservations(img *image.RGBA) {
	o := p.m.Observations
	n := o.count(p.view.bound())
	r := markRadius(n)
	taken := map[[2]int]bool{}
	light, dark := ringsOf(r)
	for i := range o.X {
		x, y := p.view.toPixel(o.X[i], o.Y[i])
		if x < -r || y < -r || x > float64(p.view.w)+r || y > float64(p.view.h)+r {
			continue
		}
		if n > crowd {
			at := [2]int{int(x) / sparse, int(y) / sparse}
			if taken[at] {
				continue
			}
			taken[at] = true
		}
		mark(img, &light, &dark, x, y)
	}
}

func ringsOf(r float64) (light, dark [quarters * quarters]disc) {
	return discs(r-2.6, r+2), discs(r-1.4, r+0.6)
}

func mark(img *image.RGBA, light, dark *[quarters * quarters]disc, x, y float64) {
	stamp(img, light, x, y, func(int, int) color.RGBA { return halo })
	stamp(img, dark, x, y, func(int, int) color.RGBA { return ink })
}

// Widths of lines on the map, and of the light line under each of them.
const (
	outlineWidth = 3.2
	outlineHalo  = 7
	zoneWidth    = 1.8
	zoneHalo     = 4.4
)

func (p page) paintZones(d pen) {
	var zones vg.Path
	for _, z := range p.m.Zones {
		zones = append(zones, p.rings(d, z.Area)...)
	}
	d.stroke(zones, zoneHalo, halo)
	d.stroke(zones, zoneWidth, ink)
}

func (p page) paintOutline(d pen) {
	outline := p.rings(d, p.m.Outline)
	d.stroke(outline, outlineHalo, halo)
	d.stroke(outline, outlineWidth, ink)
}

// rings traces an area's rings, cut a little outside the frame: coordinates far away would overflow the rasteriser.
// Vertices closer than half a pixel to the last one are passed over.
func (p page) rings(d pen, area orb.MultiPolygon) vg.Path {
	const beyond = 20
	window := orb.Bound{Min: orb.Point{-beyond, -beyond}, Max: orb.Point{float64(p.view.w) + beyond, float64(p.view.h) + beyond}}
	var path vg.Path
	for _, polygon := range area {
		for _, ring := range polygon {
			for _, line := range clip.LineString(window, p.pixels(ring)) {
				for i, q := range line {
					if i == 0 {
						path.Move(d.point(q[0], q[1]))
					} else {
						path.Line(d.point(q[0], q[1]))
					}
				}
				if len(line) > 2 && line[0] == line[len(line)-1] {
					path.Close()
				}
			}
		}
	}
	return path
}

func (p page) pixels(ring orb.Ring) orb.LineString {
	var line orb.LineString
	for i, v := range ring {
		x, y := p.view.toPixel(v[0], v[1])
		q := orb.Point{x, y}
		if n := len(line); n > 0 && i < len(ring)-1 && math.Hypot(line[n-1][0]-x, line[n-1][1]-y) < 0.5 {
			continue
		}
		line = append(line, q)
	}
	if n := len(line); n > 1 && line[0] != line[n-1] {
		line = append(line, line[0])
	}
	return line
}

func (p page) paintFrame(d pen) {
	f := p.frame
	d.stroke(d.rect(box{f.x0 - 1, f.y0 - 1, f.x1 + 1, f.y1 + 1}), 2, ink)
	for _, k := range p.ticks {
		switch k.edge {
		case bottom:
			d.stroke(d.line(f.x0+k.at, f.y1, f.x0+k.at, f.y1+tickLength), 2, ink)
		case top:
			d.stroke(d.line(f.x0+k.at, f.y0-tickLength, f.x0+k.at, f.y0), 2, ink)
		case left:
			d.stroke(d.line(f.x0-tickLength, f.y0+k.at, f.x0, f.y0+k.at), 2, ink)
		case right:
			d.stroke(d.line(f.x1, f.y0+k.at, f.x1+tickLength, f.y0+k.at), 2, ink)
		}
	}
}

func (p page) paintLegend(d pen) {
	colour := p.colouring()
	for _, s := range p.swatches {
		paintSwatch(d.img, s.box, func(px, py int) color.RGBA { return colour(s.class, px, py) })
		d.stroke(d.rect(s.box), 1.6, ink)
	}
	for _, k := range p.keys {
		p.paintKey(d, k)
	}
}

func paintSwatch(img *image.RGBA, b box, colour func(px, py int) color.RGBA) {
	for py := int(b.y0 + 0.5); py < int(b.y1+0.5); py++ {
		for px := int(b.x0 + 0.5); px < int(b.x1+0.5); px++ {
			img.SetRGBA(px, py, colour(px, py))
		}
	}
}

func (p page) paintKey(d pen, k key) {
	x, y := (k.x0+k.x1)/2, (k.y0+k.y1)/2
	switch k.kind {
	case keyObservation:
		light, dark := ringsOf(markRadius(p.m.Observations.count(p.view.bound())))
		mark(d.img, &light, &dark, x, y)
	case keyOutline:
		d.stroke(d.line(k.x0, y, k.x1, y), outlineWidth, ink)
	case keyZone:
		d.stroke(d.line(k.x0, y, k.x1, y), zoneWidth, ink)
	}
}

func (p page) paintMeasures(d pen) {
	for i, b := range p.bars {
		c := ink
		if i%2 == 1 {
			c = paper
		}
		d.fill(d.rect(b), c)
		d.stroke(d.rect(b), 2, ink)
	}
	for _, b := range p.arrow {
		p.paintArrow(d, b)
	}
}

// paintArrow draws a letter N over a needle, dark on its western half.
func (p page) paintArrow(d pen, b box) {
	x := (b.x0 + b.x1) / 2
	w := p.letters.width("N", captionStyle)
	d.text(label{box{x - w/2, b.y0 - 4, x + w/2, b.y0}, "N", captionStyle, ink}, p.letters)
	tip, tail, notch := b.y0+30, b.y1-1, b.y1-11
	const half = 14
	d.fill(d.polygon([2]float64{x, tip}, [2]float64{x - half, tail}, [2]float64{x, notch}), ink)
	d.stroke(d.polygon([2]float64{x, tip}, [2]float64{x + half, tail}, [2]float64{x, notch}, [2]float64{x - half, tail}), 2, ink)
}

// stampOpacity is how much of the map a stamp hides.
const stampOpacity = 0.62

// paintStamp writes the warning along the rising diagonal, as large as fits. Letters and their light edge are drawn opaque on
// a layer of their own, which is then laid over the map: blended one by one they would show through each other.
func (p page) paintStamp(d pen) {
	s := p.stampSetting()
	if s.size == 0 {
		return
	}
	layer := newLayer(p.view.w, p.view.h)
	st := style{s.size, true}
	cos, sin := math.Cos(s.angle), math.Sin(s.angle)
	var path vg.Path
	for i, text := range s.lines {
		// Relative to the middle of the frame before turning: lines centred, baselines below one another.
		x0 := -p.letters.width(text, st) / 2
		y0 := (float64(i)-float64(len(s.lines))/2)*st.line() + baseline*s.size
		path = append(path, p.letters.path(text, st, func(x, y float64) vg.Point {
			u, v := x0+x, y0+y
			return layer.point(float64(p.view.w)/2+u*cos+v*sin, float64(p.view.h)/2-u*sin+v*cos)
		})...)
	}
	layer.stroke(path, max(5, s.size/10), halo)
	layer.fill(path, stampInk)
	opacity := stampOpacity * 255
	mask := image.NewUniform(color.Alpha{uint8(opacity)})
	draw.DrawMask(d.img, d.img.Bounds(), layer.img, image.Point{}, mask, image.Point{}, draw.Over)
}

// A stampSetting is how a stamp is broken, turned (radians, rising to the right) and sized (em in pixels).
type stampSetting struct {
	lines       []string
	angle, size float64
}

// stampSetting tries few and many lines and a few angles up to the diagonal, and takes the largest letters whose turned
// block stays within the frame.
func (p page) stampSetting() stampSetting {
	const share, largest = 0.96, 170
	w, h := float64(p.view.w), float64(p.view.h)
	measure := style{100, true}
	var best stampSetting
	for n := 1; n <= 6; n++ {
		lines := p.stampLines(measure, n)
		bw := p.letters.widest(lines, measure) / measure.size
		bh := float64(len(lines)) * lineHeight
		for _, turn := range []float64{1, 0.8, 0.6} {
			angle := math.Atan2(h, w) * turn
			cos, sin := math.Cos(angle), math.Sin(angle)
			size := min(share*w/(bw*cos+bh*sin), share*h/(bw*sin+bh*cos), largest)
			if len(lines) > 0 && size > best.size {
				best = stampSetting{lines, angle, size}
			}
		}
	}
	return best
}

// stampLines breaks the stamp into n lines; the words up to a first colon ("NOT FOR USE:") keep a line of their own.
func (p page) stampLines(st style, n int) []string {
	head, rest, colon := strings.Cut(p.m.Stamp, ":")
	if !colon || n == 1 || strings.TrimSpace(rest) == "" {
		return p.letters.balance(p.m.Stamp, st, n)
	}
	return append(p.letters.balance(head+":", st, 1), p.letters.balance(rest, st, n-1)...)
}
