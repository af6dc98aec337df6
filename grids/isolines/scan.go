package isolines

import (
	"fmt"

	"github.com/paulmach/orb"
)

// MostVertices is how many vertices the lines or the bands of a lattice may have together.
const MostVertices = 10_000_000

// TooManyVerticesError is the error of lines or bands with more than MostVertices vertices.
type TooManyVerticesError struct{ Levels int }

// Error says how many vertices there may be.
func (e *TooManyVerticesError) Error() string {
	return fmt.Sprintf("lines at %d levels have more than the %d vertices they may have", e.Levels, MostVertices)
}

// Hint says what to do about it.
func (e *TooManyVerticesError) Hint() string { return "ask for fewer levels or larger cells" }

// segment is a straight piece of a line or of a band's edge, and the square of the lattice that it is in.
type segment struct {
	from, to orb.Point
	square   int32
}

// square is the surface around one corner of the lattice, between the centres of the cells that meet there. Cells are
// counted counter-clockwise from the south-western one.
type square struct {
	s      *surface
	i, j   int // of the corner
	class  [4]int16
	centre [4]node // where class is not -1
	lo, hi int     // the lowest and highest class
	cells  int
}

// Half-steps from the middle of a square to the centres of its cells, and to the middle of the side between a cell and the next.
var (
	toCentre = [4][2]int{{-1, -1}, {1, -1}, {1, 1}, {-1, 1}}
	toMiddle = [4][2]int{{0, -1}, {1, 0}, {0, 1}, {-1, 0}}
)

// scan goes through the squares row by row from the south-west and hands on the lines at each level, the higher side on
// their left, and unless border is nil the pieces of the cells' outer edge in each class, the cells on their left.
func (s *surface) scan(line, border func(which int, g segment)) error {
	total := 0
	var chords []chord
	for j := 0; j <= s.ny; j++ {
		for i := 0; i <= s.nx; i++ {
			south := s.class[j*(s.nx+2)+i:]
			north := south[s.nx+2:]
			if c := south[0]; c == south[1] && c == north[0] && c == north[1] {
				continue
			}
			q := s.square(i, j, [4]int16{south[0], south[1], north[1], north[0]})
			for level := q.lo; level < q.hi; level++ {
				chords = q.chords(chords[:0], s.level[level])
				for _, c := range chords {
					line(level, segment{c.from, c.to, q.number()})
				}
				total += len(chords)
			}
			if q.cells < 4 && border != nil {
				total += q.border(border)
			}
			if total > MostVertices {
				return &TooManyVerticesError{Levels: len(s.level)}
			}
		}
	}
	return nil
}

func (s *surface) square(i, j int, class [4]int16) *square {
	q := &square{s: s, i: i, j: j, class: class, lo: len(s.level)}
	for c, t := range toCentre {
		if class[c] < 0 {
			continue
		}
		q.cells++
		q.lo, q.hi = min(q.lo, int(class[c])), max(q.hi, int(class[c]))
		k := (j+(t[1]-1)/2)*s.nx + i + (t[0]-1)/2
		q.centre[c] = node{q.at(t), s.value[k], s.slack(k)}
	}
	return q
}

// number counts the squares row by row.
func (q *square) number() int32 { return int32(q.j*(q.s.nx+1) + q.i) }

func (q *square) at(step [2]int) orb.Point {
	return orb.Point{q.s.x[2*q.i+step[0]], q.s.y[2*q.j+step[1]]}
}

func (q *square) has(c int) bool { return q.class[c] >= 0 }

// chords appends the line at a level through the square.
func (q *square) chords(to []chord, level float64) []chord {
	if q.cells == 4 {
		p := piece{corner: q.centre, halved: true}
		for c := range p.middle {
			p.middle[c] = q.middle(c, c, (c+1)%4)
		}
		return p.chords(to, level)
	}
	for c := range q.centre {
		if q.has(c) {
			p := q.quarter(c)
			to = p.chords(to, level)
		}
	}
	return to
}

// quarter is the part of the square in a cell: its own quarter.
func (q *square) quarter(c int) piece {
	next, before := (c+1)%4, (c+3)%4
	var p piece
	p.corner[c], p.corner[next] = q.centre[c], q.middle(c, c, next)
	p.corner[(c+2)%4], p.corner[before] = q.inner(c), q.middle(before, c, before)
	return p
}

// middle is the node in the middle of a side of cell c, towards another; without that the surface is constant to the edge.
func (q *square) middle(side, c, other int) node {
	n := q.centre[c]
	if q.has(other) {
		n = between(n, q.centre[other])
	}
	n.at = q.at(toMiddle[side])
	return n
}

// inner is the node at the middle of the square as cell c has it, where one cell or more are missing.
func (q *square) inner(c int) node {
	next, opposite, before := (c+1)%4, (c+2)%4, (c+3)%4
	n := q.centre[c]
	switch {
	case q.has(next) && q.has(before): // the gap is opposite
		n = between(q.centre[next], q.centre[before])
	case q.has(next) && q.has(opposite), q.has(before) && q.has(opposite): // the gap is beside c
		n = between(n, q.centre[opposite])
	case q.has(next):
		n = between(n, q.centre[next])
	case q.has(before):
		n = between(n, q.centre[before])
	}
	if q.cells == 3 { // the two beside the gap differ from the third, too
		for other := range q.centre {
			n.slack = max(n.slack, q.centre[other].slack)
		}
	}
	n.at = q.at([2]int{0, 0})
	return n
}

// between is half way between two nodes but for the place.
func between(a, b node) node {
	mean := (a.value + b.value) / 2
	if !finite(mean) {
		mean = a.value/2 + b.value/2
	}
	return node{value: mean, slack: max(a.slack, b.slack)}
}

// border hands on the cells' outer edge within the square, with the cells on its left, and returns of how many pieces it is.
func (q *square) border(hand func(class int, g segment)) (pieces int) {
	for c := range q.centre {
		if !q.has(c) {
			continue
		}
		next, before := (c+1)%4, (c+3)%4
		if !q.has(next) {
			m := q.middle(c, c, next)
			pieces += q.run(m, q.inner(c), m.at, hand)
		}
		if !q.has(before) {
			m := q.middle(before, c, before)
			pieces += q.run(q.inner(c), m, m.at, hand)
		}
	}
	return pieces
}

// run cuts a piece of the outer edge where it crosses levels; one of its ends is the middle of a cell's side.
func (q *square) run(a, b node, middle orb.Point, hand func(class int, g segment)) (pieces int) {
	class, last := q.s.classOf(a.value), q.s.classOf(b.value)
	at := a.at
	to := func(p orb.Point) {
		if p != at {
			hand(class, segment{at, p, q.number()})
			pieces++
		}
		at = p
	}
	cut := func(level float64) {
		p := crossing(a, b, level)
		if p == middle {
			q.s.ends[p] = true
		}
		to(p)
	}
	for ; class < last; class++ {
		cut(q.s.level[class])
	}
	for ; class > last; class-- {
		cut(q.s.level[class-1])
	}
	to(b.at)
	return pieces
}
