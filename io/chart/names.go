package chart

import (
	"cmp"
	"slices"

	"github.com/paulmach/orb"
)

// A nameplate is a name where it would stand, and how much room there is.
type nameplate struct {
	label
	room  float64
	clear box // what no line or point may be in
}

// placeNames sets the names of zones and then those of shapes, the larger ones first. A name that would leave the frame or touch
// another is left out.
func (p page) placeNames() []label {
	placed := p.free(nil, p.zoneNames())
	return p.free(placed, p.shapeNames())
}

// zoneNames are the zones' names inside their zones.
func (p page) zoneNames() []nameplate {
	var all []nameplate
	for _, z := range p.m.Zones {
		lines := p.letters.wrap(z.Name, nameStyle, 1e9)
		if len(lines) == 0 {
			continue
		}
		x, y, room := p.widestSpan(z.Area)
		if room == 0 {
			continue
		}
		w, h := p.letters.width(lines[0], nameStyle), nameStyle.line()
		all = append(all, nameplate{label: label{box{x - w/2, y - h/2, x + w/2, y + h/2}, lines[0], nameStyle, ink}, room: room})
	}
	return all
}

// free adds those names to placed that stay within the frame and clear of one another, the ones with more room first.
func (p page) free(placed []label, all []nameplate) []label {
	slices.SortStableFunc(all, func(a, b nameplate) int { return cmp.Compare(b.room, a.room) })
	paper := box{4, 4, float64(p.view.w) - 4, float64(p.view.h) - 4}
	for _, n := range all {
		free := n.within(paper)
		for _, o := range placed {
			free = free && !n.overlaps(o.box)
		}
		if free {
			placed = append(placed, n.label)
		}
	}
	return placed
}

// widestSpan finds where an area is widest, along a few level lines across its part of the frame: the middle of that span
// in pixels and its width. The middle third is tried alone, for a name at the tip of a zone seems to belong to the next.
func (p page) widestSpan(area orb.MultiPolygon) (x, y, width float64) {
	b, ok := areaBound(area)
	if !ok {
		return 0, 0, 0
	}
	_, y0 := p.view.toPixel(b.Min[0], b.Max[1])
	_, y1 := p.view.toPixel(b.Max[0], b.Min[1])
	y0, y1 = max(y0, 0), min(y1, float64(p.view.h))
	for _, f := range []float64{0.5, 0.45, 0.55, 0.4, 0.6, 0.34, 0.66} {
		level := y0 + f*(y1-y0)
		at := p.cuts(area, level)
		for i := 0; i+1 < len(at); i += 2 {
			from, to := max(at[i], 0), min(at[i+1], float64(p.view.w))
			if to-from > width*1.05 {
				x, y, width = (from+to)/2, level, to-from
			}
		}
	}
	return x, y, width
}

// cuts returns where a level line meets the rings, in order; the area lies between the first and second, third and fourth, ...
func (p page) cuts(area orb.MultiPolygon, level float64) []float64 {
	var at []float64
	for _, polygon := range area {
		for _, ring := range polygon {
			for i := range ring {
				a, b := ring[i], ring[(i+1)%len(ring)]
				ax, ay := p.view.toPixel(a[0], a[1])
				bx, by := p.view.toPixel(b[0], b[1])
				if (ay > level) != (by > level) {
					at = append(at, ax+(level-ay)/(by-ay)*(bx-ax))
				}
			}
		}
	}
	slices.Sort(at)
	return at
}
