package chart

import (
	"image"
	"image/color"
	"math"

	"gonum.org/v1/plot/vg"
	"gonum.org/v1/plot/vg/vgimg"
)

// A pen draws lines and letters on a picture; its coordinates are pixels, y down. The canvas works in points with y up, at
// one point a pixel.
type pen struct {
	canvas *vgimg.Canvas
	img    *image.RGBA // what the canvas draws on
	h      float64
}

// newPen starts a picture on white paper, newLayer on nothing.
func newPen(w, h int) pen   { return newPenOn(w, h, paper) }
func newLayer(w, h int) pen { return newPenOn(w, h, color.Transparent) }

func newPenOn(w, h int, ground color.Color) pen {
	c := vgimg.NewWith(vgimg.UseWH(vg.Length(w), vg.Length(h)), vgimg.UseDPI(int(vg.Inch)), vgimg.UseBackgroundColor(ground))
	// The canvas draws on a copy of its own, so it is asked for its picture afterwards.
	return pen{c, c.Image().(*image.RGBA), float64(h)}
}

func (p pen) point(x, y float64) vg.Point { return vg.Point{X: vg.Length(x), Y: vg.Length(p.h - y)} }

func (p pen) fill(path vg.Path, c color.Color) {
	if len(path) > 0 {
		p.canvas.SetColor(c)
		p.canvas.Fill(path)
	}
}

func (p pen) stroke(path vg.Path, width float64, c color.Color) {
	if len(path) > 0 {
		p.canvas.SetColor(c)
		p.canvas.SetLineWidth(vg.Length(width))
		p.canvas.Stroke(path)
	}
}

func (p pen) polygon(xy ...[2]float64) vg.Path {
	var path vg.Path
	for i, q := range xy {
		if i == 0 {
			path.Move(p.point(q[0], q[1]))
		} else {
			path.Line(p.point(q[0], q[1]))
		}
	}
	path.Close()
	return path
}

func (p pen) rect(b box) vg.Path {
	return p.polygon([2]float64{b.x0, b.y0}, [2]float64{b.x1, b.y0}, [2]float64{b.x1, b.y1}, [2]float64{b.x0, b.y1})
}

func (p pen) line(x0, y0, x1, y1 float64) vg.Path {
	var path vg.Path
	path.Move(p.point(x0, y0))
	path.Line(p.point(x1, y1))
	return path
}

func (p pen) text(l label, letters *letters) {
	p.fill(p.letters(l, letters), l.colour)
}

func (p pen) letters(l label, letters *letters) vg.Path {
	x0, y0 := l.x0, l.y0+baseline*l.style.size
	return letters.path(l.text, l.style, func(x, y float64) vg.Point { return p.point(x0+x, y0+y) })
}

// A disc is the coverage of a round mark, 0 to 1, over a square of pixels around its centre; its centre is rounded to a
// quarter of a pixel, so that a few masks serve any number of marks.
type disc struct {
	reach int // pixels from the centre pixel to the border of the square
	cover []float64
}

const quarters = 4

// discs makes the masks of a ring between radii inner and outer (inner 0 is a full disc) for each quarter-pixel offset.
func discs(inner, outer float64) [quarters * quarters]disc {
	var all [quarters * quarters]disc
	reach := int(outer) + 2
	side := 2*reach + 1
	for k := range all {
		dx, dy := float64(k%quarters)/quarters, float64(k/quarters)/quarters
		d := disc{reach, make([]float64, side*side)}
		for i := range d.cover {
			// Pixel centres are at half; the mark stands at (dx, dy) in the middle pixel.
			x, y := float64(i%side-reach)+0.5-dx, float64(i/side-reach)+0.5-dy
			r := math.Hypot(x, y)
			d.cover[i] = ramped(outer+0.5-r) - ramped(inner+0.5-r)
			if inner == 0 {
				d.cover[i] = ramped(outer + 0.5 - r)
			}
		}
		all[k] = d
	}
	return all
}

func ramped(v float64) float64 { return min(max(v, 0), 1) }

// stamp blends a mark at (x, y) into img; the colour may depend on the pixel.
func stamp(img *image.RGBA, masks *[quarters * quarters]disc, x, y float64, colour func(px, py int) color.RGBA) {
	fx, fy := math.Floor(x), math.Floor(y)
	k := int((y-fy)*quarters)*quarters + int((x-fx)*quarters)
	d := masks[k]
	side := 2*d.reach + 1
	b := img.Bounds()
	for i, a := range d.cover {
		px, py := int(fx)+i%side-d.reach, int(fy)+i/side-d.reach
		if a == 0 || px < b.Min.X || py < b.Min.Y || px >= b.Max.X || py >= b.Max.Y {
			continue
		}
		blend(img, px, py, colour(px, py), a)
	}
}
