package batch

import (
	"cmp"
	"context"
	"math"
	"slices"
	"sort"
)

// share settles who shows what where regions meet, pair by pair. Pairs are taken along a curve that keeps neighbours
// together, so that a shelf of few drafts serves them.
func (m *Mosaic) share(ctx context.Context, shelf *groundShelf) error {
	total, covered := 0, 0
	for i := range m.tiles {
		total += m.tiles[i].cells
		if m.common != nil {
			m.tiles[i].box = planeBox(m.tiles[i].plane)
		}
	}
	near := m.neighbours()
	for _, a := range near.order {
		for _, b := range near.later(a) {
			if err := ctx.Err(); err != nil {
				return err
			}
			ga, err := shelf.take(a, m)
			if err != nil {
				return err
			}
			gb, err := shelf.take(b, m)
			if err != nil {
				return err
			}
			covered += m.contest(a, b, ga, gb) + m.contest(b, a, gb, ga)
			if 2*covered > total {
				m.Why = "the regions lie on the same ground: more than half of all cells are also covered by another region"
				return nil
			}
		}
	}
	return nil
}

// contest goes through the cells of tile a that may lie in tile b, marks those that b covers and those that b shows, and
// returns how many are covered for the first time.
func (m *Mosaic) contest(a, b int, ga, gb *tileGround) int {
	from, against := &m.tiles[a], m.tiles[b]
	shared := cellSpan{0, ga.NX - 1, 0, ga.NY - 1}
	if bound, ok := against.boundIn(from.system); ok {
		shared = spanOf(ga.Lattice, bound)
	}
	into := crossing(from.system, against.system)
	fresh := 0
	ga.each(shared, func(row int, x, y float64) {
		other, ok := gb.at(into(x, y))
		if !ok {
			return
		}
		if from.covered.add(row, from.cells) {
			fresh++
		}
		own, theirs := ga.distance(row), gb.distance(other)
		if theirs < own || theirs == own && b < a {
			from.lost.add(row, from.cells)
		}
	})
	return fresh
}

// neighbours finds the tiles whose boxes meet.
type neighbours struct {
	tiles   []mosaicTile
	order   []int // along the curve
	turn    []int // of a tile in order
	bySouth []int
	tallest float64
}

func (m *Mosaic) neighbours() *neighbours {
	n := &neighbours{tiles: m.tiles, order: alongCurve(m.tiles), turn: make([]int, len(m.tiles))}
	for place, i := range n.order {
		n.turn[i] = place
		n.bySouth = append(n.bySouth, i)
		n.tallest = max(n.tallest, m.tiles[i].box.north-m.tiles[i].box.south)
	}
	slices.SortFunc(n.bySouth, func(a, b int) int { return cmp.Compare(m.tiles[a].box.south, m.tiles[b].box.south) })
	return n
}

// later returns the tiles that come after tile a along the curve and whose boxes meet its own, in the order of the curve.
func (n *neighbours) later(a int) []int {
	box := n.tiles[a].box
	first := sort.Search(len(n.bySouth), func(k int) bool { return n.tiles[n.bySouth[k]].box.south >= box.south-n.tallest })
	var found []int
	for _, b := range n.bySouth[first:] {
		if n.tiles[b].box.south > box.north {
			break
		}
		if n.turn[b] > n.turn[a] && box.meets(n.tiles[b].box) {
			found = append(found, b)
		}
	}
	slices.SortFunc(found, func(b, c int) int { return cmp.Compare(n.turn[b], n.turn[c]) })
	return found
}

// alongCurve orders tiles along the Z-order curve through the middles of their boxes (Morton 1966, A computer oriented
// geodetic data base, IBM; from memory).
func alongCurve(tiles []mosaicTile) []int {
	x, y := make([]float64, len(tiles)), make([]float64, len(tiles))
	for i, t := range tiles {
		x[i], y[i] = t.box.x, (t.box.south+t.box.north)/2
		if t.box.globe {
			x[i] = math.Remainder(x[i]-tiles[0].box.x, 360)
		}
	}
	side := max(slices.Max(x)-slices.Min(x), slices.Max(y)-slices.Min(y), math.SmallestNonzeroFloat64)
	code, order := make([]uint32, len(tiles)), make([]int, len(tiles))
	for i := range tiles {
		order[i] = i
		across, up := uint32((x[i]-slices.Min(x))/side*0xffff), uint32((y[i]-slices.Min(y))/side*0xffff)
		for bit := range 16 {
			code[i] |= across>>bit&1<<(2*bit) | up>>bit&1<<(2*bit+1)
		}
	}
	slices.SortStableFunc(order, func(a, b int) int { return cmp.Compare(code[a], code[b]) })
	return order
}

// How many drafts are held at a time, and how many cells in all: two are held whatever their size.
const (
	mostHeld      = 32
	mostHeldCells = 20_000_000
)

// groundShelf holds the ground of the tiles that were used last.
type groundShelf struct {
	held  []heldGround // the one used last stands last
	cells int
}

type heldGround struct {
	tile int
	*tileGround
}

// take returns the ground of a tile, from the shelf if it is there.
func (s *groundShelf) take(i int, m *Mosaic) (*tileGround, error) {
	for k, h := range s.held {
		if h.tile == i {
			s.held = append(slices.Delete(s.held, k, k+1), h)
			return h.tileGround, nil
		}
	}
	s.makeRoom(m.tiles[i].cells)
	d, err := m.reopen(i)
	if err != nil {
		return nil, err
	}
	g := groundOf(d)
	s.put(i, g)
	return g, nil
}

// makeRoom makes room for one more. The one used last stays: it is in use.
func (s *groundShelf) makeRoom(cells int) {
	for len(s.held) > 1 && (len(s.held) >= mostHeld || s.cells+cells > mostHeldCells) {
		s.cells -= len(s.held[0].cells)
		s.held = slices.Delete(s.held, 0, 1)
	}
}

// put puts the ground of a tile on the shelf.
func (s *groundShelf) put(i int, g *tileGround) {
	s.makeRoom(len(g.cells))
	s.held = append(s.held, heldGround{i, g})
	s.cells += len(g.cells)
}
