package chart

import (
	"math"

	"github.com/paulmach/orb"
)

// Frame limits in pixels. A study area thinner than 1:20 is shown with blank paper beside it.
const (
	thinnest = 64
	slimmest = 20.0
)

// A view ties the plane to the pixels of the frame: px = w/2 + (x-cx)*scale, py = h/2 - (y-cy)*scale.
type view struct {
	cx, cy float64 // plane coordinates of the middle of the frame
	scale  float64 // pixels a metre, the same in both directions
	w, h   int     // pixels
}

func (v view) toPixel(x, y float64) (px, py float64) {
	return float64(v.w)/2 + (x-v.cx)*v.scale, float64(v.h)/2 - (y-v.cy)*v.scale
}

func (v view) toPlane(px, py float64) (x, y float64) {
	return v.cx + (px-float64(v.w)/2)/v.scale, v.cy - (py-float64(v.h)/2)/v.scale
}

// bound is what the frame shows of the plane.
func (v view) bound() orb.Bound {
	x0, y0 := v.toPlane(0, float64(v.h))
	x1, y1 := v.toPlane(float64(v.w), 0)
	return orb.Bound{Min: orb.Point{x0, y0}, Max: orb.Point{x1, y1}}
}

// extent is the part of the plane a map has to show: the cells within the mask, or the dots or shapes, and the study area,
// with a margin.
func extent(m Map) orb.Bound {
	var b orb.Bound
	switch {
	case m.Shapes.given():
		b = m.Shapes.bound()
	case m.Value == nil:
		b = pointBound(m.Dots.X, m.Dots.Y)
	default:
		b = cellBound(m)
	}
	if o, ok := areaBound(m.Outline); ok {
		b = b.Union(o)
	}
	w, h := b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]
	const nothing = 1e-9 // metres
	if side := max(w, h); side < nothing {
		w, h = 1, 1 // a single point: one metre around it, or what its coordinates still resolve
		if least := 1e-6 * max(math.Abs(b.Min[0]), math.Abs(b.Min[1])); least > 1 {
			w, h = least, least
		}
	} else {
		w, h = max(w, side/slimmest), max(h, side/slimmest)
	}
	margin := max(0.03*min(w, h), 0.01*max(w, h))
	if m.Value == nil && !m.Shapes.areasOnly() {
		margin *= 2 // marks are wider than the places they stand for
	}
	cx, cy := b.Min[0]/2+b.Max[0]/2, b.Min[1]/2+b.Max[1]/2
	return orb.Bound{Min: orb.Point{cx - w/2 - margin, cy - h/2 - margin}, Max: orb.Point{cx + w/2 + margin, cy + h/2 + margin}}
}

// cellBound is the box around the cells within the mask, or around all cells when there are none.
func cellBound(m Map) orb.Bound {
	l := m.Lattice
	i0, i1, j0, j1 := l.NX, -1, l.NY, -1
	if l.Mask != nil {
		for j := range l.NY {
			for i := range l.NX {
				if l.Mask[j*l.NX+i] {
					i0, i1, j0, j1 = min(i0, i), max(i1, i), min(j0, j), max(j1, j)
				}
			}
		}
	}
	if i1 < 0 {
		i0, i1, j0, j1 = 0, l.NX-1, 0, l.NY-1
	}
	return orb.Bound{
		Min: orb.Point{l.X0 + float64(i0)*l.Cell, l.Y0 + float64(j0)*l.Cell},
		Max: orb.Point{l.X0 + float64(i1+1)*l.Cell, l.Y0 + float64(j1+1)*l.Cell},
	}
}

func pointBound(x, y []float64) orb.Bound {
	b := orb.Bound{Min: orb.Point{math.Inf(1), math.Inf(1)}, Max: orb.Point{math.Inf(-1), math.Inf(-1)}}
	for i := range x {
		b.Min[0], b.Max[0] = min(b.Min[0], x[i]), max(b.Max[0], x[i])
		b.Min[1], b.Max[1] = min(b.Min[1], y[i]), max(b.Max[1], y[i])
	}
	return b
}

// areaBound is the box around all rings; ok is false when there is no vertex.
func areaBound(area orb.MultiPolygon) (b orb.Bound, ok bool) {
	for _, polygon := range area {
		for _, ring := range polygon {
			if len(ring) == 0 {
				continue
			}
			if rb := ring.Bound(); ok {
				b = b.Union(rb)
			} else {
				b, ok = rb, true
			}
		}
	}
	return b, ok
}

// fit returns the largest view of b within w x h pixels.
func fit(b orb.Bound, w, h float64) view {
	bw, bh := b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]
	scale := min(w/bw, h/bh)
	return view{
		cx: b.Min[0]/2 + b.Max[0]/2, cy: b.Min[1]/2 + b.Max[1]/2, scale: scale,
		w: max(int(bw*scale+0.5), thinnest), h: max(int(bh*scale+0.5), thinnest),
	}
}

// count is how many of the points lie within b.
func (p Points) count(b orb.Bound) int {
	n := 0
	for i := range p.X {
		if b.Contains(orb.Point{p.X[i], p.Y[i]}) {
			n++
		}
	}
	return n
}
