package grids

import (
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// Nearest returns, for each place asked about (atX, atY), the distance in the plane to the nearest of the given places;
// NaN where the place asked about is not finite or no finite place is given. The order in which places are given changes
// nothing. Time is about logarithmic in the number of places, also where they crowd together and far outside of them,
// and less where one place asked about is near the one before it, as on a lattice. Nearest panics if lengths differ.
func Nearest(placesX, placesY, atX, atY []float64) []float64 {
	if len(atX) != len(atY) {
		panic("grids: x and y differ in number")
	}
	out := make([]float64, len(atX))
	f := newFinder(distinct(placesX, placesY), -1)
	for i := range out {
		out[i] = f.nearest(orb.Point{atX[i], atY[i]})
	}
	return out
}

// MedianSpacing returns the median, over distinct places, of the distance to the nearest other one; NaN for fewer than
// two distinct places. Places that are not finite are passed over. MedianSpacing panics if the lengths differ.
func MedianSpacing(x, y []float64) float64 {
	p := distinct(x, y)
	if len(p) < 2 {
		return math.NaN()
	}
	f := newFinder(slices.Clone(p), 0)
	d := make([]float64, len(p))
	for i := range p {
		d[i] = f.nearest(p[i])
	}
	slices.Sort(d)
	m := len(d) / 2
	if len(d)%2 == 1 {
		return d[m]
	}
	return d[m-1] + (d[m]-d[m-1])/2
}

// leafPlaces is how many places are looked through one by one.
const leafPlaces = 8

// finder answers what the nearest place is from a balanced tree over the places: every node halves its places across
// the longer side of their bounding box (Friedman, Bentley & Finkel 1977, ACM Trans. Math. Softw. 3:209-226). Boxes are
// those of the places, so empty land costs nothing. A grid of buckets would do the same for even places only.
type finder struct {
	place []orb.Point // in tree order
	box   []orb.Bound // of node v; its halves are 2v+1 and 2v+2
	above float64     // squared distances up to this do not count: -1, or 0 to leave out the place itself

	last int     // the answer before, the first guess for the next
	best float64 // squared distance of the best found so far
}

// newFinder takes places over and reorders them.
func newFinder(place []orb.Point, above float64) *finder {
	nodes := 1
	for size := len(place); size > leafPlaces; size = (size + 1) / 2 {
		nodes = 2*nodes + 1
	}
	f := &finder{place: place, box: make([]orb.Bound, nodes), above: above}
	if len(place) > 0 {
		f.build(0, 0, len(place))
	}
	return f
}

func (f *finder) build(v, lo, hi int) {
	b := orb.MultiPoint(f.place[lo:hi]).Bound()
	f.box[v] = b
	if hi-lo <= leafPlaces {
		return
	}
	axis := 0
	if b.Max[1]-b.Min[1] > b.Max[0]-b.Min[0] {
		axis = 1
	}
	mid := (lo + hi) / 2
	part(f.place[lo:hi], mid-lo, axis)
	f.build(2*v+1, lo, mid)
	f.build(2*v+2, mid, hi)
}

// part reorders p so that none of p[:k] lies beyond any of p[k:] along axis (Hoare's selection).
func part(p []orb.Point, k, axis int) {
	for lo, hi := 0, len(p)-1; lo < hi; {
		pivot := p[(lo+hi)/2][axis]
		i, j := lo, hi
		for i <= j {
			for p[i][axis] < pivot {
				i++
			}
			for p[j][axis] > pivot {
				j--
			}
			if i <= j {
				p[i], p[j] = p[j], p[i]
				i++
				j--
			}
		}
		switch {
		case k <= j:
			hi = j
		case k >= i:
			lo = i
		default:
			return
		}
	}
}

// nearest returns the distance from a place to the nearest one that counts.
func (f *finder) nearest(at orb.Point) float64 {
	if len(f.place) == 0 || !usable(at[0], at[1]) {
		return math.NaN()
	}
	f.best = math.Inf(1)
	if d := squared(at, f.place[f.last]); d > f.above {
		f.best = d
	}
	f.search(0, 0, len(f.place), at)
	return math.Sqrt(f.best)
}

// reaches reports whether some place is no farther than the square root of limit.
func (f *finder) reaches(at orb.Point, limit float64) bool {
	if len(f.place) == 0 {
		return false
	}
	if squared(at, f.place[f.last]) <= limit {
		return true
	}
	f.best = math.Nextafter(limit, math.Inf(1))
	f.search(0, 0, len(f.place), at)
	return f.best <= limit
}

func (f *finder) search(v, lo, hi int, at orb.Point) {
	if hi-lo <= leafPlaces {
		for i := lo; i < hi; i++ {
			if d := squared(at, f.place[i]); d < f.best && d > f.above {
				f.best, f.last = d, i
			}
		}
		return
	}
	mid := (lo + hi) / 2
	west, east := toBox(at, &f.box[2*v+1]), toBox(at, &f.box[2*v+2])
	if west <= east {
		if west < f.best {
			f.search(2*v+1, lo, mid, at)
		}
		if east < f.best {
			f.search(2*v+2, mid, hi, at)
		}
		return
	}
	if east < f.best {
		f.search(2*v+2, mid, hi, at)
	}
	if west < f.best {
		f.search(2*v+1, lo, mid, at)
	}
}

func squared(a, b orb.Point) float64 {
	dx, dy := a[0]-b[0], a[1]-b[1]
	return dx*dx + dy*dy
}

// toBox is the squared distance to a box, 0 inside.
func toBox(p orb.Point, b *orb.Bound) float64 {
	dx := max(b.Min[0]-p[0], 0, p[0]-b.Max[0])
	dy := max(b.Min[1]-p[1], 0, p[1]-b.Max[1])
	return dx*dx + dy*dy
}
