package chart

import (
	"math"
	"strings"

	"drumlin/grids/crs"
)

// An edge of the frame.
type edge int

const (
	bottom edge = iota
	left
	top
	right
)

// A tick stands on an edge of the frame; at is its distance in pixels from the left or the upper end of that edge.
// Only ticks on the bottom and the left carry text.
type tick struct {
	edge edge
	at   float64
	text string
}

// Least distances in pixels between labelled ticks along the bottom and along the left.
const (
	tickApartX = 150
	tickApartY = 90
)

// inDegrees is true for planes laid around data that came as longitude and latitude: there the reader knows degrees, and
// plane coordinates mean nothing to him. A plane that was named, by a code or in words, has a grid of its own.
func inDegrees(s crs.System) bool {
	return s != nil && s.Geographic() && strings.HasPrefix(s.Code(), "laea ")
}

// ticks returns the ticks of a frame and a sentence that says what their numbers are.
func ticks(v view, s crs.System) ([]tick, string) {
	if inDegrees(s) {
		if t := degreeTicks(v, s); len(t) > 0 {
			return t, "Ticks on the frame: longitude and latitude, WGS 84."
		}
	}
	t, unit := planeTicks(v)
	code := "local"
	if s != nil {
		code = s.Code()
	}
	if code == "local" {
		return t, "Ticks on the frame: local x and y in " + unit + "."
	}
	return t, "Ticks on the frame: easting and northing in " + unit + ", " + code + "."
}

func planeTicks(v view) (all []tick, unit string) {
	b := v.bound()
	unit, metres := "m", 1.0
	if max(b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]) >= 5000 {
		unit, metres = "km", 1000
	}
	w, h := b.Max[0]-b.Min[0], b.Max[1]-b.Min[1]
	sx, sy := oneStep(roundStep(w, float64(v.w), tickApartX), roundStep(h, float64(v.h), tickApartY), w, h)
	for _, axis := range []struct {
		near, far    edge
		lo, hi, step float64
	}{{bottom, top, b.Min[0], b.Max[0], sx}, {left, right, b.Min[1], b.Max[1], sy}} {
		if !(axis.step > 0) {
			continue
		}
		at := multiples(axis.lo, axis.hi, axis.step)
		decimals := decimalsOf(axis.step / metres)
		for _, c := range at {
			px, py := v.toPixel(c, c)
			p := px
			if axis.near == left {
				p = py
			}
			all = append(all, tick{axis.near, p, number(c/metres, decimals)}, tick{edge: axis.far, at: p})
		}
	}
	return all, unit
}

// oneStep makes both steps the larger one where both edges still get two ticks: square meshes are easier to read.
func oneStep(sx, sy, w, h float64) (x, y float64) {
	if c := max(sx, sy); w >= 2*c && h >= 2*c {
		return c, c
	}
	return sx, sy
}

// roundStep is the smallest 1, 2 or 5 times a power of ten whose ticks are at least apart pixels from one another, or a
// smaller one where fewer than two ticks would be sure to fall on the edge. It is 0 for an edge without extent.
func roundStep(extent, pixels, apart float64) float64 {
	least := apart * extent / pixels
	if !(least > 0) {
		return 0
	}
	if step := roundUpStep(least); step <= extent/2 {
		return step
	}
	return roundDownStep(extent / 2)
}

// roundUpStep is the smallest 1, 2 or 5 times a power of ten not below v.
func roundUpStep(v float64) float64 {
	l := ladders[0]
	i := l.below(v)
	if l.at(i) < v {
		i++
	}
	return l.at(i)
}

// roundDownStep is the largest 1, 2 or 5 times a power of ten not above v.
func roundDownStep(v float64) float64 {
	l := ladders[0]
	return l.at(l.below(v))
}

// multiples returns the multiples of step within [lo, hi]; a step that twelve digits do not resolve has none.
func multiples(lo, hi, step float64) []float64 {
	first, last := math.Ceil(lo/step-1e-9), math.Floor(hi/step+1e-9)
	if !(last-first < 1000) || math.Abs(first) > 1e11 {
		return nil
	}
	var m []float64
	for k := first; k <= last; k++ {
		m = append(m, round12(k*step))
	}
	return m
}

// degreeTicks puts ticks where meridians cut the lower and upper edges of the frame and parallels cut the left and right ones.
func degreeTicks(v view, s crs.System) []tick {
	w, h := float64(v.w), float64(v.h)
	lon := func(y float64) trace {
		return follow(w, func(p float64) float64 { a, _ := s.Inverse(v.toPlane(p, y)); return a })
	}
	lat := func(x float64) trace {
		return follow(h, func(p float64) float64 { _, b := s.Inverse(v.toPlane(x, p)); return b })
	}
	traces := map[edge]trace{bottom: lon(h), top: lon(0), left: lat(0), right: lat(w)}
	sx := roundStep(traces[bottom].extent(), w, tickApartX)
	sy := roundStep(traces[left].extent(), h, tickApartY)
	sx, sy = oneStep(sx, sy, traces[bottom].extent(), traces[left].extent())
	var all []tick
	for _, e := range []edge{bottom, top, left, right} {
		step, name := sx, longitude
		if e == left || e == right {
			step, name = sy, latitude
		}
		if !(step > 0) {
			continue
		}
		for _, c := range traces[e].crossings(step) {
			t := tick{edge: e, at: c.at}
			if e == bottom || e == left {
				t.text = name(c.value, decimalsOf(step))
			}
			all = append(all, t)
		}
	}
	return all
}

// A trace is a coordinate followed along an edge at equal distances.
type trace struct {
	length float64 // pixels
	value  []float64
}

// follow samples f along an edge. Longitude is unrolled, so that it does not jump at the date line.
func follow(length float64, f func(p float64) float64) trace {
	const pieces = 200
	t := trace{length, make([]float64, pieces+1)}
	for i := range t.value {
		a := f(length * float64(i) / pieces)
		if i > 0 {
			a -= 360 * math.Round((a-t.value[i-1])/360)
		}
		t.value[i] = a
	}
	return t
}

func (t trace) extent() float64 {
	lo, hi := span(t.value)
	return max(hi-lo, 0)
}

type crossing struct{ at, value float64 }

// crossings finds where the trace passes multiples of step, linearly between samples.
func (t trace) crossings(step float64) []crossing {
	var found []crossing
	piece := t.length / float64(len(t.value)-1)
	for i := 1; i < len(t.value); i++ {
		a, b := t.value[i-1], t.value[i]
		if !finite(a) || !finite(b) || a == b {
			continue
		}
		for _, m := range multiples(min(a, b), max(a, b), step) {
			at := (float64(i-1) + (m-a)/(b-a)) * piece
			if n := len(found); n > 0 && found[n-1].value == m && at-found[n-1].at < 1 {
				continue // a multiple that falls on a sample is met from both sides
			}
			found = append(found, crossing{min(max(at, 0), t.length), m})
		}
	}
	return found
}

func longitude(v float64, decimals int) string {
	v = round12(v - 360*math.Round(v/360))
	return degrees(v, decimals, "°E", "°W", math.Abs(v) == 180)
}

func latitude(v float64, decimals int) string { return degrees(v, decimals, "°N", "°S", false) }

func degrees(v float64, decimals int, positive, negative string, neither bool) string {
	text := number(math.Abs(v), decimals)
	switch {
	case v == 0 || neither:
		return text + "°"
	case v < 0:
		return text + negative
	}
	return text + positive
}
