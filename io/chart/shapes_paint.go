package chart

import (
	"cmp"
	"image"
	"image/color"
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// A figure is a shape on the page: its parts in pixels and what decides how they are drawn.
type figure struct {
	parts
	class     int
	size      float64 // pixels covered by areas
	length    float64 // of lines, in pixels
	around    float64 // length of the areas' edges, in pixels
	thickness float64 // of areas, in pixels: half the side of a square, the width of a long strip
}

// small is true for areas that an edge within them would hide.
func (f figure) small() bool { return len(f.area) > 0 && f.thickness < leastRimmed }

// slips is true for areas that may lie between the centres of pixels, whole or in parts.
func (f figure) slips() bool {
	strip := f.around > 20*f.thickness // a square has 8
	return f.thickness < 0.5 || strip && f.thickness < 1
}

// figures are the shapes as they lie on the page, in the order in which they are drawn: the larger first, so that a small
// one is never hidden by one that it lies on.
func (p page) figures() []figure {
	s := p.m.Shapes
	list := make([]figure, len(s.Geometry))
	for i, g := range s.Geometry {
		list[i] = p.figure(g)
		list[i].class = p.classes.of(s.Value[i])
	}
	slices.SortStableFunc(list, func(a, b figure) int { return cmp.Or(cmp.Compare(b.size, a.size), cmp.Compare(b.length, a.length)) })
	return list
}

func (p page) figure(g orb.Geometry) figure {
	metres, _ := partsOf(g)
	var f figure
	for _, polygon := range metres.area {
		var rings orb.Polygon
		for i, ring := range polygon {
			r := orb.Ring(p.onPage(ring))
			rings = append(rings, r)
			area, length := measure(r)
			if i > 0 {
				area = -area
			}
			f.size, f.around = f.size+area, f.around+length
		}
		f.area = append(f.area, rings)
	}
	if f.around > 0 {
		f.thickness = 2 * max(f.size, 0) / f.around
	}
	for _, line := range metres.lines {
		l := orb.LineString(p.onPage(line))
		f.lines = append(f.lines, l)
		for i := 1; i < len(l); i++ {
			f.length += math.Hypot(l[i][0]-l[i-1][0], l[i][1]-l[i-1][1])
		}
	}
	f.dots = p.onPage(metres.dots)
	return f
}

func (p page) onPage(points []orb.Point) []orb.Point {
	q := make([]orb.Point, len(points))
	for i, v := range points {
		q[i][0], q[i][1] = p.view.toPixel(v[0], v[1])
	}
	return q
}

// measure is the area within a ring and the way around it.
func measure(ring orb.Ring) (area, length float64) {
	for i, a := range ring {
		b := ring[(i+1)%len(ring)]
		area += (a[0]-ring[0][0])*(b[1]-ring[0][1]) - (b[0]-ring[0][0])*(a[1]-ring[0][1])
		length += math.Hypot(b[0]-a[0], b[1]-a[1])
	}
	return math.Abs(area) / 2, length
}

// paintShapes draws areas, then lines, then points. The outline of the study area, which is often that of the areas, lies
// under them: over them it would hide small ones.
func (p page) paintShapes(d pen) {
	figures := p.figures()
	width := outlineWidth
	if figures[0].size > 0 {
		width = outlineUnder
	}
	d.stroke(p.rings(d, p.m.Outline), width, ink)
	p.paintAreas(d.img, figures)
	p.paintZones(d)
	p.paintLines(d.img, figures)
	p.paintDots(d.img, p.m.Shapes.points())
}

// outlineUnder is the width of an outline that is half hidden by areas.
const outlineUnder = 4

// blankShape is the colour of a shape without a value: a light grey under lines that fall to the right, where those of
// relative risks rise.
func blankShape(px, py int) color.RGBA {
	const period = 9
	if (px-py)%period == 0 || (px-py-1)%period == 0 {
		return color.RGBA{176, 176, 180, 255}
	}
	return color.RGBA{244, 244, 245, 255}
}

// paintAreas fills the areas and then draws their edges. The small ones have theirs only under all areas, where they are
// seen on bare paper, and are filled once more over the edges of their neighbours.
func (p page) paintAreas(img *image.RGBA, figures []figure) {
	f := filler{img: img, w: p.view.w, h: p.view.h, colour: p.colouring(), filled: make([]bool, p.view.w*p.view.h)}
	p.paintUnder(img, figures)
	for _, one := range figures {
		f.fill(one)
	}
	p.paintEdges(img, figures, f.filled)
	for _, one := range figures {
		if one.small() {
			f.fill(one)
		}
		if one.small() && one.slips() {
			f.trace(one)
		}
	}
}

// A filler fills areas with the colours of their classes.
type filler struct {
	img    *image.RGBA
	w, h   int
	colour func(class, px, py int) color.RGBA
	filled []bool // by pixel: whether an area is there
	room   []rowCrossing
}

func (f *filler) fill(one figure) {
	for _, polygon := range one.area {
		f.room = spans(polygon, f.w, f.h, f.room, func(y, x0, x1 int) {
			for x := x0; x < x1; x++ {
				f.img.SetRGBA(x, y, f.colour(one.class, x, y))
				f.filled[y*f.w+x] = true
			}
		})
	}
}

// trace fills the pixels that the edge of an area passes through: there is always a mark, and a thin strip is not broken.
func (f *filler) trace(one figure) {
	for _, polygon := range one.area {
		for _, ring := range polygon {
			for i, a := range ring {
				b := ring[(i+1)%len(ring)]
				steps := math.Ceil(2 * math.Hypot(b[0]-a[0], b[1]-a[1]))
				for s := 0.0; s <= steps; s++ {
					t := s / max(steps, 1)
					x, y := int(math.Floor(a[0]+t*(b[0]-a[0]))), int(math.Floor(a[1]+t*(b[1]-a[1])))
					if image.Pt(x, y).In(f.img.Bounds()) {
						f.img.SetRGBA(x, y, f.colour(one.class, x, y))
					}
				}
			}
		}
	}
}

// Thickness in pixels from which areas have an edge that lies half within them, and from which it is as wide as any.
const (
	leastRimmed  = 2.5
	widelyRimmed = 24
)

// rimWidth is the width of the edge of an area, in pixels; below one it is paler instead. Edges of areas that are not
// large would else be all that is seen of them.
func (f figure) rimWidth() float64 {
	const least, most = 0.05, 1.7
	return min(most, least+(most-least)*(f.thickness-leastRimmed)/(widelyRimmed-leastRimmed))
}

// Opacity of the edges.
const (
	darkEdge  = 0.7
	lightEdge = 0.75
)

// paintUnder draws edges that the areas then hide but for their outer half: towards bare paper even a small area has a
// line that is seen.
func (p page) paintUnder(img *image.RGBA, figures []figure) {
	const width = 2.2
	edges := newCoverage(p.view.w, p.view.h)
	for _, f := range figures {
		for _, polygon := range f.area {
			for _, ring := range polygon {
				edges.line(closed(ring), width)
			}
		}
	}
	edges.lay(img, darkEdge, func(int, int) color.RGBA { return ink })
}

// paintEdges draws the edges of the areas: light between two of dark classes, dark around pale ones and where there is
// no area on the other side, for there a light line would only make the area seem smaller. Light lines come first: where a
// pale area meets a dark one, the edge is dark.
func (p page) paintEdges(img *image.RGBA, figures []figure, filled []bool) {
	light, dark := newCoverage(p.view.w, p.view.h), newCoverage(p.view.w, p.view.h)
	for _, f := range figures {
		if f.small() {
			continue
		}
		width := f.rimWidth()
		for _, polygon := range f.area {
			for _, ring := range polygon {
				ring = closed(ring)
				if !p.classes.dark(f.class) {
					dark.line(ring, width)
					continue
				}
				for piece := range pieces(ring) {
					if p.between(piece, filled) {
						light.line(piece, width)
					} else {
						dark.line(piece, width)
					}
				}
			}
		}
	}
	light.lay(img, lightEdge, func(int, int) color.RGBA { return halo })
	dark.lay(img, darkEdge, func(int, int) color.RGBA { return ink })
}

// pieces cuts the way through points into straight pieces of a few pixels.
func pieces(points []orb.Point) func(yield func([]orb.Point) bool) {
	const most = 6
	return func(yield func([]orb.Point) bool) {
		for i := 1; i < len(points); i++ {
			a, b := points[i-1], points[i]
			n := max(1, math.Ceil(math.Hypot(b[0]-a[0], b[1]-a[1])/most))
			at := func(k float64) orb.Point { return orb.Point{a[0] + k/n*(b[0]-a[0]), a[1] + k/n*(b[1]-a[1])} }
			for k := 0.0; k < n; k++ {
				if !yield([]orb.Point{at(k), at(k + 1)}) {
					return
				}
			}
		}
	}
}

// between reports whether there are areas on both sides of a straight piece of an edge.
func (p page) between(piece []orb.Point, filled []bool) bool {
	const off = 1.6
	a, b := piece[0], piece[1]
	dx, dy := b[0]-a[0], b[1]-a[1]
	length := math.Hypot(dx, dy)
	if length == 0 {
		return true
	}
	for _, side := range []float64{-off, off} {
		x := int(math.Floor((a[0]+b[0])/2 - side*dy/length))
		y := int(math.Floor((a[1]+b[1])/2 + side*dx/length))
		if x < 0 || y < 0 || x >= p.view.w || y >= p.view.h || !filled[y*p.view.w+x] {
			return false
		}
	}
	return true
}

// closed is a ring that ends where it begins.
func closed(ring orb.Ring) orb.Ring {
	if n := len(ring); n > 1 && ring[0] != ring[n-1] {
		return append(slices.Clip(ring), ring[0])
	}
	return ring
}

// dark is true for a class that a light line is seen on better than a dark one.
func (c classes) dark(class int) bool { return class >= 0 && c.tone[class].l < 55 }

// Half the width of lines, and what the dark casing adds to it on each side.
const (
	thickLine = 4.5
	thinLine  = 1.5
	casing    = 1.7
)

// paintLines draws each line in the colour of its class within a dark casing, without which pale ones would not be seen.
func (p page) paintLines(img *image.RGBA, figures []figure) {
	total := 0.0
	for _, f := range figures {
		total += f.length
	}
	half := lineHalf(total, float64(p.view.w)*float64(p.view.h))
	stroke, colour := newCoverage(p.view.w, p.view.h), p.colouring()
	for _, f := range figures {
		for _, line := range f.lines {
			stroke.line(line, 2*(half+casing))
		}
		stroke.lay(img, 1, func(int, int) color.RGBA { return ink })
		for _, line := range f.lines {
			stroke.line(line, 2*half)
		}
		stroke.lay(img, 1, func(px, py int) color.RGBA { return colour(f.class, px, py) })
	}
}

// lineHalf narrows the lines as they crowd, so that they cover about a third of the map at most.
func lineHalf(length, area float64) float64 {
	if length == 0 {
		return thickLine
	}
	return min(max(area/3/(2*length)-casing, thinLine), thickLine)
}

// points are the points among the shapes, each with the value of its shape.
func (s Shapes) points() Dots {
	var d Dots
	for i, g := range s.Geometry {
		p, _ := partsOf(g)
		for _, q := range p.dots {
			d.X, d.Y, d.Value = append(d.X, q[0]), append(d.Y, q[1]), append(d.Value, s.Value[i])
		}
	}
	return d
}
