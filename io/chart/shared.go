package chart

import (
	"cmp"
	"fmt"
	"math"
	"slices"
)

// Sample is the values of one of several maps that share their breaks, thinned to some of their order statistics.
type Sample struct {
	Value  []float64 // ascending
	Weight float64   // how many values each of them stands for
}

// NewSample thins value to at most most values (3 where most is less), those that are finite: all of them where they are
// few enough, else the ranks are cut into stretches of equal length, and each is stood for by the value at its middle
// rank, the first by the least of all values and the last by the greatest, so that their range is kept. The result
// depends on the values alone, not on their order.
func NewSample(value []float64, most int) Sample {
	all := make([]float64, 0, len(value))
	for _, v := range value {
		if finite(v) {
			all = append(all, v)
		}
	}
	slices.Sort(all)
	most = max(most, 3)
	n := len(all)
	if n <= most {
		return Sample{Value: all, Weight: 1}
	}
	s := Sample{Value: make([]float64, most), Weight: float64(n) / float64(most)}
	for k := range s.Value {
		s.Value[k] = all[(2*k+1)*n/(2*most)]
	}
	s.Value[0], s.Value[most-1] = all[0], all[n-1]
	return s
}

// The classes of maps that share their breaks: an inner edge below which a share of all values lies that is near one of
// these, within the tolerance beside it. The last class is narrow in values and open to what a single map may have.
var sharedClasses = []struct{ share, tolerance float64 }{{0.2, 0.05}, {0.4, 0.05}, {0.6, 0.05}, {0.8, 0.05}, {0.95, 0.02}}

// SharedBreaks chooses edges for several maps of one kind from the values of all of them together. They are for
// Map.Breaks with Map.Shared: n edges of a Level or an Uncertainty make n classes, the last of them open.
//
// The first edge is a round number at or below the least value; it is 0 where no value is negative and the least is at
// most a fifth of the distance from it to the last edge. The other edges, five of them or fewer where values are tied,
// are near the quantiles at 0.2, 0.4, 0.6, 0.8 and 0.95: each is the number with the fewest digits between the
// quantiles at 0.05 (0.02 for the last) to both sides of it. A quantile is the least value that, with those below it,
// has at least that share of the weight (Hyndman and Fan 1996, The American Statistician 50:361-365, definition 1, with
// weights). Where ties leave fewer than two of them, the edges are those of Breaks but for the last.
//
// For a Ratio the edges are those of Breaks for the values between the quantiles at 0.02 and 0.98, symmetrical about 1
// and open at both ends; for Chance they are always the same. The result is nil where there are no values, for a Ratio
// no positive ones, and for a Level or an Uncertainty where they do not differ. It does not depend on the order of the
// samples.
func SharedBreaks(kind Kind, samples []Sample) []float64 {
	if kind == Chance {
		return Breaks(Chance, nil)
	}
	p := pool(samples, func(v float64) bool { return finite(v) && (kind != Ratio || v > 0) })
	if len(p.value) == 0 {
		return nil
	}
	if kind == Ratio {
		return ratioBreaks(p.quantiles(0.02, 0.98))
	}
	lo, hi := p.value[0], p.value[len(p.value)-1]
	least := resolved * max(math.Abs(lo), math.Abs(hi))
	if !(hi-lo > least) || hi-lo < slightest {
		return nil
	}
	edge := p.edges(lo, least)
	if len(edge) < 2 {
		edge = Breaks(kind, append(p.quantiles(0, 1), lo, hi))
		return edge[:len(edge)-1]
	}
	return append([]float64{firstEdge(lo, edge[0], edge[len(edge)-1])}, edge...)
}

// Reaching returns edges that reach down to all values of the samples: edge itself, or where a value lies below its
// first, as may be with breaks from elsewhere, a copy that begins with minus infinity, so that every map of the group
// shows the lowest class as open.
func Reaching(edge []float64, samples []Sample) []float64 {
	for _, s := range samples {
		if len(edge) > 0 && len(s.Value) > 0 && s.Value[0] < edge[0] {
			edge = slices.Clone(edge)
			edge[0] = math.Inf(-1)
			break
		}
	}
	return edge
}

// CheckShared returns an error for edges that maps cannot share: fewer than 2 or more than 11 of them, not strictly
// increasing or not finite. The first may be minus infinity, which leaves the lowest class open.
func CheckShared(edge []float64) error {
	if len(edge) < 2 || len(edge) >= maxEdges {
		return fmt.Errorf("%d breaks given, from 2 to %d can be shared", len(edge), maxEdges-1)
	}
	return increase(edge, true)
}

// pooled holds the values of all samples, ascending.
type pooled struct {
	value []float64
	upto  []float64 // weight of the values up to and with each
}

func pool(samples []Sample, keep func(v float64) bool) pooled {
	type weighted struct{ value, weight float64 }
	var all []weighted
	for _, s := range samples {
		for _, v := range s.Value {
			if keep(v) && s.Weight > 0 {
				all = append(all, weighted{v, s.Weight})
			}
		}
	}
	// Equal values are ordered by their weights, so that the order of the samples does not change the sums.
	slices.SortFunc(all, func(a, b weighted) int {
		return cmp.Or(cmp.Compare(a.value, b.value), cmp.Compare(a.weight, b.weight))
	})
	p := pooled{value: make([]float64, len(all)), upto: make([]float64, len(all))}
	sum := 0.0
	for i, w := range all {
		sum += w.weight
		p.value[i], p.upto[i] = w.value, sum
	}
	return p
}

// quantile is the least value up to which at least the given share of the weight lies; rounding of the sums is forgiven.
func (p pooled) quantile(share float64) float64 {
	n := len(p.value)
	i, _ := slices.BinarySearch(p.upto, share*p.upto[n-1]*(1-1e-12))
	return p.value[min(i, n-1)]
}

// quantiles returns a thousand quantiles at equal distances from one share to another, both included.
func (p pooled) quantiles(from, to float64) []float64 {
	const n = 1000
	q := make([]float64, n)
	for i := range q {
		q[i] = p.quantile(from + (to-from)*float64(i)/(n-1))
	}
	return q
}

// edges returns the edges of sharedClasses, each above the one before and above lo by more than least. Where a value is
// tied over the whole tolerance of a class, the edge may be anywhere above the value before it, for that makes the same
// classes; where the edge before is there already, the class is left out.
func (p pooled) edges(lo, least float64) []float64 {
	var edge []float64
	before := lo
	for _, c := range sharedClasses {
		from, to := p.quantile(c.share-c.tolerance), p.quantile(c.share+c.tolerance)
		if from == to {
			i, _ := slices.BinarySearch(p.value, to)
			from = p.value[max(i-1, 0)]
		}
		if from < before || from == to {
			continue
		}
		want := p.quantile(c.share)
		if want == from { // many values there
			want = from/2 + to/2
		}
		e := roundest(math.Nextafter(from, to), to, want, math.Abs(want))
		if e-before > least {
			edge, before = append(edge, e), e
		}
	}
	return edge
}

// firstEdge is the edge below all values, of which lo is the least; first and last are the inner edges at the ends.
func firstEdge(lo, first, last float64) float64 {
	if lo >= 0 && lo <= (last-lo)/5 {
		return 0
	}
	from := lo - (first-lo)/4
	return roundest(from, lo, lo, max(math.Abs(from), math.Abs(lo)))
}

// roundest returns 0 where it lies between lo and hi, else the number between them with the fewest digits, counted from
// the first digit of size; where several have as few, the one nearest to want. A last digit of 5 counts half.
func roundest(lo, hi, want, size float64) float64 {
	if lo <= 0 && hi >= 0 {
		return 0
	}
	want = min(max(want, lo), hi)
	first := int(math.Floor(math.Log10(size)))
	for e := first; e > first-13; e-- {
		for _, m := range []float64{10, 5} {
			step := scale10(m, e-1)
			near := min(max(math.Round(want/step), math.Ceil(lo/step)), math.Floor(hi/step))
			for _, n := range []float64{near, near + 1, near - 1} { // a bound may be a multiple of the step but for rounding
				if v := round12(scale10(m*n, e-1)); v >= lo && v <= hi {
					return v
				}
			}
		}
	}
	return want
}
