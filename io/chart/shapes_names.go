package chart

import (
	"math"

	"github.com/paulmach/orb"
)

// nameRoom is the least distance of a name from the edge of the area that it stands in.
const nameRoom = 3

// shapeNames are the names of shapes where there is room: of areas inside them, of lines and points beside them. None
// lies on a line or on a point.
func (p page) shapeNames() []nameplate {
	s := p.m.Shapes
	if s.Name == nil {
		return nil
	}
	taken := p.marks()
	var all []nameplate
	for i, g := range s.Geometry {
		lines := p.letters.wrap(s.Name[i], nameStyle, 1e9)
		if len(lines) == 0 {
			continue
		}
		w, h := p.letters.width(lines[0], nameStyle), nameStyle.line()
		for _, place := range p.nameBoxes(g, w, h) {
			if !taken.meets(place.clear) {
				place.label = label{place.box, lines[0], nameStyle, ink}
				all = append(all, place)
				break
			}
		}
	}
	return all
}

// nameBoxes lists the places for a name of w x h pixels, the best first.
func (p page) nameBoxes(g orb.Geometry, w, h float64) []nameplate {
	shape, _ := partsOf(g)
	if shape.area != nil {
		return p.boxesWithin(shape.area, w, h)
	}
	const off = dotLargest + nameRoom + occupied // from the middle of the mark, whose squares reach a little beyond it
	var list []nameplate
	for _, q := range p.onPage(anchors(shape)) {
		x, y := q[0], q[1]
		for _, side := range [][2]float64{{1, 0}, {-1, 0}, {0, -1}, {0, 1}} {
			cx, cy := x+side[0]*(off+w/2), y+side[1]*(off+h/2)
			at := box{cx - w/2, cy - h/2, cx + w/2, cy + h/2}
			// What lies as near to the name on its other side would seem to bear it.
			clear := box{at.x0 + min(side[0], 0)*off, at.y0 + min(side[1], 0)*off, at.x1 + max(side[0], 0)*off, at.y1 + max(side[1], 0)*off}
			list = append(list, nameplate{label: label{box: at}, clear: clear})
		}
	}
	return list
}

// anchors are the points of a line that its name may stand at, the middle first, or the points of a MultiPoint.
func anchors(shape parts) []orb.Point {
	const most = 12
	if len(shape.dots) > 0 {
		return shape.dots[:min(len(shape.dots), most)]
	}
	var list []orb.Point
	for _, line := range shape.lines {
		for _, share := range []float64{0.5, 0.35, 0.65, 0.2, 0.8, 0.05, 0.95} {
			if len(line) > 0 && len(list) < most {
				list = append(list, along(line, share))
			}
		}
	}
	return list
}

// along is the point at a share of the length of a line.
func along(line orb.LineString, share float64) orb.Point {
	total := 0.0
	for i := 1; i < len(line); i++ {
		total += math.Hypot(line[i][0]-line[i-1][0], line[i][1]-line[i-1][1])
	}
	left := share * total
	for i := 1; i < len(line); i++ {
		a, b := line[i-1], line[i]
		d := math.Hypot(b[0]-a[0], b[1]-a[1])
		if d > 0 && left <= d {
			return orb.Point{a[0] + left/d*(b[0]-a[0]), a[1] + left/d*(b[1]-a[1])}
		}
		left -= d
	}
	return line[len(line)-1]
}

// boxesWithin finds level boxes of w x h pixels that lie in an area, where it is wide; there may be none.
func (p page) boxesWithin(area orb.MultiPolygon, w, h float64) []nameplate {
	b, ok := areaBound(area)
	if !ok {
		return nil
	}
	x0, y0 := p.view.toPixel(b.Min[0], b.Max[1])
	x1, y1 := p.view.toPixel(b.Max[0], b.Min[1])
	if x1-x0 < w || y1-y0 < h {
		return nil
	}
	var list []nameplate
	for _, f := range []float64{0.5, 0.45, 0.55, 0.4, 0.6, 0.34, 0.66, 0.28, 0.72} {
		y := y0 + f*(y1-y0)
		if from, to := p.band(area, y-h/2, y+h/2); to-from >= w+2*nameRoom {
			x := (from + to) / 2
			at := box{x - w/2, y - h/2, x + w/2, y + h/2}
			place := nameplate{label: label{box: at}, room: to - from, clear: at}
			if len(list) > 0 && place.room > 1.05*list[0].room {
				list = append([]nameplate{place}, list...)
			} else {
				list = append(list, place)
			}
		}
	}
	return list
}

// band is the widest stretch that an area holds at a few levels between y0 and y1.
func (p page) band(area orb.MultiPolygon, y0, y1 float64) (from, to float64) {
	const levels = 5
	for k := range levels {
		at := p.cuts(area, y0+(y1-y0)*float64(k)/(levels-1))
		var left, right float64
		for i := 0; i+1 < len(at); i += 2 {
			l, r := at[i], at[i+1]
			if k > 0 {
				l, r = max(l, from), min(r, to)
			}
			if r-l > right-left {
				left, right = l, r
			}
		}
		from, to = left, right
	}
	return from, to
}

// squares are the squares of the page that lines and points lie on; the side is that of occupied.
type squares map[[2]int]bool

const occupied = 4

// marks are the squares that the lines and points of the map take.
func (p page) marks() squares {
	taken := squares{}
	const around = thickLine + casing
	add := func(x, y, r float64) {
		for i := squareOf(x - r); i <= squareOf(x+r); i++ {
			for j := squareOf(y - r); j <= squareOf(y+r); j++ {
				taken[[2]int{i, j}] = true
			}
		}
	}
	dots := p.m.Shapes.points()
	r := dotRadius(len(dots.X), float64(p.view.w)*float64(p.view.h))
	for i := range dots.X {
		x, y := p.view.toPixel(dots.X[i], dots.Y[i])
		add(x, y, r)
	}
	for _, g := range p.m.Shapes.Geometry {
		shape, _ := partsOf(g)
		for _, line := range shape.lines {
			points := p.onPage(line)
			for i := 1; i < len(points); i++ {
				a, b := points[i-1], points[i]
				steps := math.Ceil(math.Hypot(b[0]-a[0], b[1]-a[1]) / occupied)
				for s := 0.0; s <= steps; s++ {
					t := s / max(steps, 1)
					add(a[0]+t*(b[0]-a[0]), a[1]+t*(b[1]-a[1]), around)
				}
			}
		}
	}
	return taken
}

func squareOf(v float64) int { return int(math.Floor(v / occupied)) }

func (s squares) meets(b box) bool {
	for i := squareOf(b.x0); i <= squareOf(b.x1); i++ {
		for j := squareOf(b.y0); j <= squareOf(b.y1); j++ {
			if s[[2]int{i, j}] {
				return true
			}
		}
	}
	return false
}
