package spatial

import (
	"math"
	"slices"
	"sort"
)

// Autocorrelation says how alike neighbouring values are.
type Autocorrelation struct {
	I          float64 // Moran's I
	Expected   float64 // of I where there is none: -1/(n - 1)
	SD         float64 // of I where there is none and values are normal
	Neighbours int     // nearest ones that each value is held against
}

// Z returns how many standard deviations I lies above what it would be without any likeness.
func (a Autocorrelation) Z() float64 { return (a.I - a.Expected) / a.SD }

// Moran returns Moran's I of values v at places with each place's k nearest others as its neighbours, all of equal weight
// 1/k, and its moments under normality (Cliff & Ord 1981, Spatial Processes, ch. 1 and 2). Of neighbours at the same
// distance those of lower row come first. A row that is a set of points lies at their mean place. Fewer than k + 2 values give NaN. It panics if lengths differ.
func Moran(at Places, v []float64, k int) Autocorrelation {
	n := len(v)
	if at.Len() != n {
		panic(lengths)
	}
	at = at.centres()
	a := Autocorrelation{I: math.NaN(), Expected: math.NaN(), SD: math.NaN(), Neighbours: k}
	if n < k+2 {
		return a
	}
	near := nearest(at, k)
	m, cross, ss := mean(v), 0.0, 0.0
	in := make([]float64, n) // column sums of the weights
	w := 1 / float64(k)
	for i := range v {
		for _, j := range near[i] {
			cross += w * (v[i] - m) * (v[j] - m)
			in[j] += w
		}
		ss += (v[i] - m) * (v[i] - m)
	}
	a.I = cross / ss
	mutual := 0
	for i := range near {
		for _, j := range near[i] {
			for _, back := range near[j] {
				if back == i {
					mutual++
				}
			}
		}
	}
	// S1 = sum of (w_ij + w_ji)^2 / 2 and S2 = sum of (row sum + column sum)^2, with S0 = n.
	s1 := float64(n*k)*w*w + float64(mutual)*w*w
	s2 := 0.0
	for _, c := range in {
		s2 += (1 + c) * (1 + c)
	}
	f := float64(n)
	a.Expected = -1 / (f - 1)
	a.SD = math.Sqrt((f*f*s1-f*s2+3*f*f)/(f*f*(f*f-1)) - a.Expected*a.Expected)
	return a
}

// nearest returns the k nearest other places of each, by a grid of cells with about two places in each.
func nearest(at Places, k int) [][]int {
	g := newCells(at)
	out := make([][]int, at.Len())
	for i := range out {
		out[i] = g.around(i, k)
	}
	return out
}

// cells is a square grid with the places in each cell.
type cells struct {
	at     Places
	x0, y0 float64
	side   float64
	nx, ny int
	first  []int // of each cell in order
	order  []int // places by cell, ascending within one
}

func newCells(at Places) *cells {
	n := at.Len()
	g := &cells{at: at, x0: math.Inf(1), y0: math.Inf(1)}
	hx, hy := math.Inf(-1), math.Inf(-1)
	for i := range at.X {
		g.x0, g.y0 = math.Min(g.x0, at.X[i]), math.Min(g.y0, at.Y[i])
		hx, hy = math.Max(hx, at.X[i]), math.Max(hy, at.Y[i])
	}
	g.side = math.Sqrt(math.Max((hx-g.x0)*(hy-g.y0), math.Pow(math.Max(hx-g.x0, hy-g.y0), 2)/float64(n)) * 2 / float64(n))
	if !(g.side > 0) {
		g.side = 1
	}
	g.nx, g.ny = int((hx-g.x0)/g.side)+1, int((hy-g.y0)/g.side)+1
	g.first = make([]int, g.nx*g.ny+1)
	for i := range at.X {
		g.first[g.cell(i)+1]++
	}
	for c := 1; c < len(g.first); c++ {
		g.first[c] += g.first[c-1]
	}
	g.order = make([]int, n)
	next := append([]int(nil), g.first...)
	for i := range at.X {
		c := g.cell(i)
		g.order[next[c]] = i
		next[c]++
	}
	return g
}

func (g *cells) column(i int) int { return min(int((g.at.X[i]-g.x0)/g.side), g.nx-1) }
func (g *cells) row(i int) int    { return min(int((g.at.Y[i]-g.y0)/g.side), g.ny-1) }
func (g *cells) cell(i int) int   { return g.row(i)*g.nx + g.column(i) }

// neighbour is a place with its squared distance.
type neighbour struct {
	place int
	d2    float64
}

// before reports whether a comes before b: nearer, or of lower row at the same distance.
func (a neighbour) before(b neighbour) bool {
	return a.d2 < b.d2 || a.d2 == b.d2 && a.place < b.place
}

// around returns the k places nearest to place i: ring after ring of cells, until no place beyond could be nearer.
func (g *cells) around(i, k int) []int {
	best := make([]neighbour, 0, k+1) // in order
	offer := func(j int) {
		dx, dy := g.at.X[j]-g.at.X[i], g.at.Y[j]-g.at.Y[i]
		c := neighbour{j, dx*dx + dy*dy}
		if len(best) == k && !c.before(best[k-1]) {
			return
		}
		at := sort.Search(len(best), func(r int) bool { return c.before(best[r]) })
		best = slices.Insert(best, at, c)[:min(k, len(best)+1)]
	}
	cx, cy := g.column(i), g.row(i)
	for ring := 0; ring <= max(g.nx, g.ny); ring++ {
		for y := max(cy-ring, 0); y <= min(cy+ring, g.ny-1); y++ {
			step := 1
			if y != cy-ring && y != cy+ring {
				step = max(1, 2*ring)
			}
			for x := cx - ring; x <= cx+ring; x += step {
				if x < 0 || x >= g.nx {
					continue
				}
				for _, j := range g.order[g.first[y*g.nx+x]:g.first[y*g.nx+x+1]] {
					if j != i {
						offer(j)
					}
				}
			}
		}
		if reach := float64(ring) * g.side; len(best) == k && best[k-1].d2 <= reach*reach {
			break
		}
	}
	near := make([]int, k)
	for r := range near {
		near[r] = best[r].place
	}
	return near
}

// residualNeighbours is how many neighbours residuals are held against.
const residualNeighbours = 8

// ResidualAutocorrelation returns Moran's I of the quantile residuals: well above its expectation where the surface
// misses something that neighbours share. Rows of one place are taken together, as their mean times the root of their
// number, so that repeated visits do not pass for neighbours. It is zero for a restored surface. at are the places of
// the rows.
func (s *Surface) ResidualAutocorrelation(at Places) Autocorrelation {
	if s.rows == nil {
		return Autocorrelation{}
	}
	at = at.centres()
	type place struct{ x, y float64 }
	index := map[place]int{}
	var p Places
	var sum, count []float64
	for i, v := range s.rows.Quantile {
		here := place{at.X[i], at.Y[i]}
		k, ok := index[here]
		if !ok {
			k = len(sum)
			index[here] = k
			p.X, p.Y = append(p.X, here.x), append(p.Y, here.y)
			sum, count = append(sum, 0), append(count, 0)
		}
		sum[k] += v
		count[k]++
	}
	for k := range sum {
		sum[k] /= math.Sqrt(count[k])
	}
	return Moran(p, sum, residualNeighbours)
}
