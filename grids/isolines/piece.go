package isolines

import (
	"math"

	"github.com/paulmach/orb"
)

// node is a place where the surface is known.
type node struct {
	at    orb.Point
	value float64
	slack float64 // differences up to this are nothing
}

func (n node) above(level float64) bool { return n.value >= level }

func (n node) near(level float64) bool { return math.Abs(n.value-level) <= n.slack }

// crossing is where a level is reached between two nodes on either side of it, in a row or a column. It is the same in
// either direction to the last bit, stays between them, and moves one way only as the level rises.
func crossing(a, b node, level float64) orb.Point {
	if b.at[0] < a.at[0] || b.at[1] < a.at[1] {
		a, b = b, a
	}
	switch nearA, nearB := a.near(level), b.near(level); {
	case nearA && (!nearB || a.above(level)):
		return a.at
	case nearB:
		return b.at
	}
	t := (level - a.value) / (b.value - a.value)
	if math.IsInf(b.value-a.value, 0) {
		t = (level/2 - a.value/2) / (b.value/2 - a.value/2)
	}
	return orb.Point{a.at[0] + float64(t*(b.at[0]-a.at[0])), a.at[1] + float64(t*(b.at[1]-a.at[1]))}
}

// piece is a square with a node at each corner, counter-clockwise from the south-west one, through which lines run straight.
type piece struct {
	corner [4]node
	middle [4]node // of the side that begins at each corner, if halved is true
	halved bool
}

// crossing is where a level crosses the side that begins at a corner.
func (p *piece) crossing(side int, level float64) orb.Point {
	a, b := p.corner[side], p.corner[(side+1)%4]
	if p.halved {
		// By halves, since the piece beyond may have its corner there.
		if m := p.middle[side]; m.above(level) == a.above(level) {
			a = m
		} else {
			b = m
		}
	}
	return crossing(a, b, level)
}

// chords appends the line at a level through the piece to to, with the higher side on the left and nothing of no length.
func (p *piece) chords(to []chord, level float64) []chord {
	var above [4]bool
	falls := 0
	for c := range above {
		above[c] = p.corner[c].above(level)
	}
	for c := range above {
		if above[c] && !above[(c+1)%4] {
			falls++
		}
	}
	for side := range above {
		if above[side] && !above[(side+1)%4] {
			end := p.leaves(side, falls == 2, above, level)
			to = p.add(to, p.crossing(side, level), p.crossing(end, level))
		}
	}
	return to
}

// leaves is the side on which the line leaves that enters on a side where, counter-clockwise, the surface falls below the level.
func (p *piece) leaves(side int, saddle bool, above [4]bool, level float64) int {
	switch {
	case saddle && p.mean() >= level:
		return (side + 1) % 4 // round the corner below, as those above are joined
	case saddle:
		return (side + 3) % 4 // round the corner above
	}
	for end := range above {
		if !above[end] && above[(end+1)%4] {
			return end
		}
	}
	return side
}

// mean adds opposite corners first, so that it is the same for the transposed surface.
func (p *piece) mean() float64 {
	a, b, c, d := p.corner[0].value, p.corner[1].value, p.corner[2].value, p.corner[3].value
	if m := ((a + c) + (b + d)) / 4; finite(m) {
		return m
	}
	return (a/4 + c/4) + (b/4 + d/4)
}

// chord is a straight piece of a line.
type chord struct{ from, to orb.Point }

// add splits a chord that runs along a whole side at the side's middle.
func (p *piece) add(to []chord, a, b orb.Point) []chord {
	if a == b {
		return to
	}
	if p.halved && (a[0] == b[0] || a[1] == b[1]) {
		for side := range p.corner {
			u, v := p.corner[side].at, p.corner[(side+1)%4].at
			if a == u && b == v || a == v && b == u {
				m := p.middle[side].at
				return append(to, chord{a, m}, chord{m, b})
			}
		}
	}
	return append(to, chord{a, b})
}
