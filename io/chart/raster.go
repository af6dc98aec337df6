package chart

import (
	"cmp"
	"image"
	"image/color"
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// A rowCrossing is where a ring meets the line through the centres of a row of pixels.
type rowCrossing struct {
	row int
	x   float64
}

// spans calls draw with the runs of pixels, from x0 up to and without x1, whose centres lie in a polygon given in pixels:
// even-odd, so that holes are left out whichever way their rings turn. A centre on an edge belongs to the polygon to the
// right of it or below it, so polygons that share an edge neither share a pixel nor lose one between them. Only pixels of
// a picture of w x h are drawn. Crossings is room that the next polygon may use again.
func spans(polygon orb.Polygon, w, h int, room []rowCrossing, draw func(y, x0, x1 int)) (crossings []rowCrossing) {
	found := room[:0]
	for _, ring := range polygon {
		for i := range ring {
			found = rowsCrossed(found, ring[i], ring[(i+1)%len(ring)], h)
		}
	}
	slices.SortFunc(found, func(a, b rowCrossing) int { return cmp.Or(cmp.Compare(a.row, b.row), cmp.Compare(a.x, b.x)) })
	// Rings are closed, so that the crossings of a row come in pairs.
	for c := 0; c+1 < len(found); c += 2 {
		x0, x1 := max(firstCentre(found[c].x), 0), min(firstCentre(found[c+1].x), w)
		if x0 < x1 {
			draw(found[c].row, x0, x1)
		}
	}
	return found
}

// rowsCrossed appends where the edge from a to b meets the rows. It is taken from its upper end, so that it comes out the
// same from both sides; the upper end belongs to it, the lower does not.
func rowsCrossed(found []rowCrossing, a, b orb.Point, h int) []rowCrossing {
	if a[1] > b[1] {
		a, b = b, a
	}
	for row := max(firstCentre(a[1]), 0); row < h; row++ {
		y := float64(row) + 0.5
		if y >= b[1] {
			break
		}
		found = append(found, rowCrossing{row, a[0] + (y-a[1])/(b[1]-a[1])*(b[0]-a[0])})
	}
	return found
}

// firstCentre is the first pixel whose centre is at or beyond v.
func firstCentre(v float64) int { return int(math.Ceil(v - 0.5)) }

// A coverage is what strokes cover of a picture: it is gathered first and coloured in one go, so that strokes that meet or
// lie on one another do not show through each other.
type coverage struct {
	w, h    int
	cover   []uint8
	touched []int32 // pixels with some coverage
}

func newCoverage(w, h int) *coverage { return &coverage{w: w, h: h, cover: make([]uint8, w*h)} }

// line strokes the way through points. Vertices closer than half a pixel to the last one are passed over. A line thinner
// than a pixel is drawn a pixel wide and paler.
func (c *coverage) line(points []orb.Point, width float64) {
	if len(points) == 0 {
		return
	}
	last, end := points[0], points[len(points)-1] // a single point becomes a round dot
	drawn := false
	for _, q := range points[1:] {
		if math.Hypot(q[0]-last[0], q[1]-last[1]) >= 0.5 {
			c.segment(last, q, width)
			last, drawn = q, true
		}
	}
	if !drawn || last != end {
		c.segment(last, end, width)
	}
}

// segment strokes the way from a to b with round ends.
func (c *coverage) segment(a, b orb.Point, width float64) {
	strength := 255 * min(width, 1)
	reach := max(width, 1)/2 + 0.5 // where coverage ends
	if a[1] > b[1] {
		a, b = b, a
	}
	dx, dy := b[0]-a[0], b[1]-a[1]
	length2 := dx*dx + dy*dy
	first, last := max(int(math.Floor(a[1]-reach)), 0), min(int(math.Ceil(b[1]+reach)), c.h-1)
	for row := first; row <= last; row++ {
		y := float64(row) + 0.5
		// Only the part of the segment within reach of the row can cover some of it.
		from, to := a[0], b[0]
		if dy > 0 {
			from, to = a[0]+dx*ramped((y-reach-a[1])/dy), a[0]+dx*ramped((y+reach-a[1])/dy)
		}
		left := max(int(math.Floor(min(from, to)-reach)), 0)
		right := min(int(math.Ceil(max(from, to)+reach)), c.w-1)
		for px := left; px <= right; px++ {
			x, t := float64(px)+0.5, 0.0
			if length2 > 0 {
				t = ramped(((x-a[0])*dx + (y-a[1])*dy) / length2)
			}
			offX, offY := x-a[0]-t*dx, y-a[1]-t*dy
			distance2 := offX*offX + offY*offY
			if distance2 >= reach*reach {
				continue
			}
			if v := uint8(strength*ramped(reach-math.Sqrt(distance2)) + 0.5); v > 0 {
				c.raise(row*c.w+px, v)
			}
		}
	}
}

func (c *coverage) raise(at int, v uint8) {
	if c.cover[at] == 0 {
		c.touched = append(c.touched, int32(at))
	}
	c.cover[at] = max(c.cover[at], v)
}

// lay colours what is covered, as much of it as opacity says, and empties the layer.
func (c *coverage) lay(img *image.RGBA, opacity float64, colour func(px, py int) color.RGBA) {
	for _, at := range c.touched {
		px, py := int(at)%c.w, int(at)/c.w
		blend(img, px, py, colour(px, py), opacity*float64(c.cover[at])/255)
		c.cover[at] = 0
	}
	c.touched = c.touched[:0]
}

// blend lays a colour over a pixel, share of it from 0 to 1.
func blend(img *image.RGBA, px, py int, c color.RGBA, share float64) {
	at := img.PixOffset(px, py)
	for ch, v := range [3]uint8{c.R, c.G, c.B} {
		old := float64(img.Pix[at+ch])
		img.Pix[at+ch] = uint8(old + share*(float64(v)-old) + 0.5)
	}
}
