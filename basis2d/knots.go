package basis2d

import (
	"math"
	"slices"
	"sort"
)

// Knots is a choice of knots: some at places, some in the gaps between them.
type Knots struct {
	X, Y     []float64
	InGaps   int // how many, at the end, stand in gaps of the study area
	Distinct int // number of distinct places there were to choose from
}

// minSpacing is the least distance between knots as a share of the places' root mean square distance from their
// centre. Nearer places share a knot: two knots that close carry one piece of information and cost digits.
const minSpacing = 1e-5

// gapShare is the largest share of the knots that may go to gaps when places alone would use them all.
const gapShare = 0.2

// gapFactor says what a gap is: a point of the study area farther from every knot than this many times the knots'
// median spacing.
const gapFactor = 1.5

// PlaceKnots chooses at most most knots for places (x, y), given points (fillX, fillY) that cover the study area.
//
// Every distinct place becomes a knot where most allows. Else places are taken one by one, each the farthest from those
// taken (the first is the nearest to the mean), which fills space evenly whatever the places' clustering. Then knots go
// to the study area's gaps in the same manner: without them a surface could not bend there, and its standard errors
// would not grow. Ties go to the smaller x, then y, so the choice does not depend on the order of rows.
func PlaceKnots(x, y, fillX, fillY []float64, most int) Knots {
	px, py := distinct(x, y)
	k := Knots{Distinct: len(px)}
	_, _, scale := centreAndScale(px, py)
	w := newSpread(px, py)
	chosen := w.farthest(most, minSpacing*scale)
	gaps := fillGaps(pick(px, chosen), pick(py, chosen), fillX, fillY, gapBudget(len(chosen), most))
	if over := len(chosen) + len(gaps) - most; over > 0 {
		chosen = chosen[:len(chosen)-over]
	}
	k.X, k.Y = pick(px, chosen), pick(py, chosen)
	for _, g := range gaps {
		k.X, k.Y = append(k.X, fillX[g]), append(k.Y, fillY[g])
	}
	k.InGaps = len(gaps)
	return k
}

func gapBudget(chosen, most int) int {
	return max(most-chosen, int(gapShare*float64(most)))
}

func fillGaps(kx, ky, fillX, fillY []float64, budget int) []int {
	if len(kx) < Null || len(fillX) == 0 {
		return nil
	}
	w := newSpread(fillX, fillY)
	for i := range kx {
		w.take(kx[i], ky[i])
	}
	limit := gapFactor * medianSpacing(kx, ky)
	var gaps []int
	for len(gaps) < budget {
		i := w.widest()
		if w.nearest[i] <= limit*limit {
			break
		}
		w.take(fillX[i], fillY[i])
		gaps = append(gaps, i)
	}
	return gaps
}

// distinct returns the distinct places sorted by x, then y.
func distinct(x, y []float64) (px, py []float64) {
	order := make([]int, len(x))
	for i := range order {
		order[i] = i
	}
	sort.Slice(order, func(a, b int) bool {
		i, j := order[a], order[b]
		if x[i] != x[j] {
			return x[i] < x[j]
		}
		return y[i] < y[j]
	})
	for n, i := range order {
		if n > 0 && x[i] == px[len(px)-1] && y[i] == py[len(py)-1] {
			continue
		}
		px, py = append(px, x[i]), append(py, y[i])
	}
	return px, py
}

// spread keeps, for each candidate, the squared distance to the nearest knot taken so far.
type spread struct {
	x, y, nearest []float64
}

func newSpread(x, y []float64) *spread {
	w := &spread{x: x, y: y, nearest: make([]float64, len(x))}
	for i := range w.nearest {
		w.nearest[i] = math.Inf(1)
	}
	return w
}

func (w *spread) take(x, y float64) {
	for i := range w.x {
		dx, dy := w.x[i]-x, w.y[i]-y
		w.nearest[i] = min(w.nearest[i], dx*dx+dy*dy)
	}
}

// widest returns the candidate farthest from every knot; the first of those that differ by rounding only, so that the
// unit of the coordinates does not decide.
func (w *spread) widest() int {
	best := 0
	for i, d := range w.nearest {
		if d > w.nearest[best]*(1+1e-9) {
			best = i
		}
	}
	return best
}

// farthest takes at most most candidates, at least apart from one another, and returns them in the order taken.
func (w *spread) farthest(most int, apart float64) []int {
	if len(w.x) == 0 || most < 1 {
		return nil
	}
	cx, cy, _ := centreAndScale(w.x, w.y)
	first := 0
	d := func(i int) float64 { return (w.x[i]-cx)*(w.x[i]-cx) + (w.y[i]-cy)*(w.y[i]-cy) }
	for i := range w.x {
		if d(i) < d(first)*(1-1e-9) {
			first = i
		}
	}
	taken := []int{first}
	w.take(w.x[first], w.y[first])
	for len(taken) < most {
		i := w.widest()
		if w.nearest[i] <= apart*apart {
			break
		}
		taken = append(taken, i)
		w.take(w.x[i], w.y[i])
	}
	return taken
}

// medianSpacing returns the median distance from a knot to its nearest neighbour.
func medianSpacing(x, y []float64) float64 {
	near := make([]float64, len(x))
	for i := range x {
		near[i] = math.Inf(1)
		for j := range x {
			if j != i {
				dx, dy := x[i]-x[j], y[i]-y[j]
				near[i] = min(near[i], dx*dx+dy*dy)
			}
		}
	}
	slices.Sort(near)
	return math.Sqrt(near[len(near)/2])
}

func pick(v []float64, index []int) []float64 {
	out := make([]float64, len(index))
	for i, j := range index {
		out[i] = v[j]
	}
	return out
}
