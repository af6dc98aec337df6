package chart

import (
	"math"
	"slices"
)

// Number of classes aimed at: fewer waste the map, more cannot be told apart (common practice, no source).
const (
	fewest = 5
	most   = 7
)

// scored bounds how many values the choice between candidate breaks looks at; the range always comes from all of them.
const scored = 20000

// Values that differ by less, relative to the largest or at all, are taken for equal.
const (
	resolved  = 1e-9
	slightest = 1e-290
)

// Breaks chooses the edges of 5 to 7 classes for value: strictly increasing round numbers that cover every finite value.
// Equal steps are preferred; where they would put nearly everything into one class the steps grow as 1, 2, 5, 10, or
// the outermost classes are widened. For Ratio the edges are symmetrical about 1 on a log scale; for Chance they are 0, 0.05, 0.2,
// 0.8, 0.95, 1 whatever the values. The result is nil when none is finite, for a Ratio when none is positive, and for a Level or
// Uncertainty when they do not differ (to nine digits, or by 1e-290).
// Several maps that are to be compared should share their breaks: see SharedBreaks.
func Breaks(kind Kind, value []float64) []float64 {
	switch kind {
	case Chance:
		return []float64{0, 0.05, 0.2, 0.8, 0.95, 1}
	case Ratio:
		return ratioBreaks(value)
	}
	lo, hi := span(value)
	if !(hi-lo > resolved*max(math.Abs(lo), math.Abs(hi))) || hi-lo < slightest {
		return nil
	}
	sample := sorted(value)
	var best []float64
	bestScore := math.Inf(-1)
	for _, c := range candidates(lo, hi, sample) {
		if s := spread(c.edge, sample) - c.penalty; s > bestScore {
			best, bestScore = c.edge, s
		}
	}
	return best
}

// span is the range of the finite values; (+Inf, -Inf) when there are none.
func span(value []float64) (lo, hi float64) {
	lo, hi = math.Inf(1), math.Inf(-1)
	for _, v := range value {
		if finite(v) {
			lo, hi = min(lo, v), max(hi, v)
		}
	}
	return lo, hi
}

// sorted returns the finite values in order, thinned by a fixed stride to about scored.
func sorted(value []float64) []float64 {
	stride := len(value)/scored + 1
	s := make([]float64, 0, len(value)/stride+1)
	for i := 0; i < len(value); i += stride {
		if finite(value[i]) {
			s = append(s, value[i])
		}
	}
	slices.Sort(s)
	return s
}

// spread measures how evenly the sorted sample fills the classes between the edges: entropy over its maximum, 0 to 1.
func spread(edge, sample []float64) float64 {
	if len(sample) == 0 || len(edge) < 3 {
		return 0
	}
	h, before := 0.0, 0
	for k := 1; k < len(edge); k++ {
		upto, _ := slices.BinarySearch(sample, edge[k])
		if k == len(edge)-1 {
			upto = len(sample)
		}
		if n := upto - before; n > 0 {
			p := float64(n) / float64(len(sample))
			h -= p * math.Log(p)
		}
		before = upto
	}
	return h / math.Log(float64(len(edge)-1))
}

// A candidate is a set of edges and what its looks cost in units of spread.
type candidate struct {
	edge    []float64
	penalty float64
}

// What a reader pays for less familiar steps, in units of spread: equal steps are read at a glance.
const (
	costTail = 0.15
	costLog  = 0.20
)

func candidates(lo, hi float64, sample []float64) []candidate {
	all := equalSteps(lo, hi, fewest, most)
	low, high := lo, hi
	if n := len(sample); n > 0 {
		low, high = sample[n/50], sample[n-1-n/50]
	}
	for _, c := range equalSteps(low, high, fewest-2, most) {
		// Either the steps reach round the bulk of the values, or they stop within it and the tails begin earlier.
		for _, steps := range [][]float64{c.edge, c.edge[1 : len(c.edge)-1]} {
			if edge := withTails(steps, lo, hi); fits(edge) {
				all = append(all, candidate{edge, c.penalty + costTail})
			}
		}
	}
	if lo < 0 {
		return all
	}
	for _, step := range ladders {
		if low > 0 {
			for _, rungs := range [][]float64{step.between(low, high), step.inside(low, high)} {
				if edge := withTails(rungs, lo, hi); fits(edge) {
					all = append(all, candidate{edge, costLog + step.penalty})
				}
			}
		}
		if lo > 0 {
			if edge := step.between(lo, hi); fits(edge) {
				all = append(all, candidate{edge, costLog + step.penalty})
			}
			continue
		}
		// Zeros among positive values: one class from zero to the first rung that leaves a share of the values below it.
		for n := fewest; n <= most; n++ {
			if edge := step.down(hi, n); len(edge) > 0 {
				all = append(all, candidate{append([]float64{0}, edge...), costLog + step.penalty})
			}
		}
	}
	return all
}

func fits(edge []float64) bool { return len(edge) > fewest && len(edge) <= most+1 }

// mantissas of an equal step, the common ones first, with what the others cost. Neighbours are at most 1.5 apart, so that
// for every range at least one step gives 5 to 7 classes.
var mantissas = []struct{ m, penalty float64 }{{1, 0}, {2, 0}, {5, 0}, {2.5, 0.03}, {1.5, 0.08}, {3, 0.08}, {4, 0.08}, {6, 0.1}, {8, 0.1}}

// equalSteps returns multiples of a round step that cover [lo, hi] in from least to greatest classes, for every step that does.
func equalSteps(lo, hi float64, least, greatest int) []candidate {
	var found []candidate
	if !(hi > lo) {
		return nil
	}
	top := int(math.Floor(math.Log10(hi - lo)))
	for e := top - 2; e <= top+1; e++ {
		for _, c := range mantissas {
			step := scale10(c.m, e)
			// The slack forgives a bound that is a multiple of the step but for rounding.
			first, last := math.Floor(lo/step+1e-9), math.Ceil(hi/step-1e-9)
			n := int(last - first)
			if n < least || n > greatest {
				continue
			}
			edge := make([]float64, n+1)
			for k := range edge {
				edge[k] = round12(scale10(c.m*(first+float64(k)), e))
			}
			// The same slack must not leave a value uncovered.
			edge[0], edge[n] = min(edge[0], lo), max(edge[n], hi)
			if increasing(edge) {
				found = append(found, candidate{edge, c.penalty})
			}
		}
	}
	return found
}

// scale10 is m*10^e with a single rounding where that is possible.
func scale10(m float64, e int) float64 {
	if e < 0 && e >= -22 {
		return m / math.Pow10(-e)
	}
	return m * math.Pow10(e)
}

func increasing(v []float64) bool {
	for i := 1; i < len(v); i++ {
		if !(v[i] > v[i-1]) {
			return false
		}
	}
	return true
}

// withTails adds a round edge below and above where the edges do not reach lo and hi.
func withTails(edge []float64, lo, hi float64) []float64 {
	if len(edge) == 0 {
		return nil
	}
	edge = slices.Clone(edge)
	if lo < edge[0] {
		edge = append([]float64{roundDown(lo)}, edge...)
	}
	if hi > edge[len(edge)-1] {
		edge = append(edge, -roundDown(-hi))
	}
	return edge
}

// roundDown is the nearest number at or below v of one digit times a power of ten; zero stays zero.
func roundDown(v float64) float64 {
	if v == 0 {
		return 0
	}
	e := int(math.Floor(math.Log10(math.Abs(v))))
	m := math.Floor(v / scale10(1, e))
	if r := scale10(m, e); r <= v {
		return r
	}
	return scale10(m-1, e)
}

// A ladder is a scale of steps that multiply: its rungs within one period of decades.
type ladder struct {
	rung    []float64 // ascending from 1, below 10^decades
	decades int
	penalty float64
}

var ladders = []ladder{
	{[]float64{1, 2, 5}, 1, 0},
	{[]float64{1, 1.5, 2, 3, 5, 7}, 1, 0.06},
	{[]float64{1, 5}, 1, 0.04},
	{[]float64{1}, 1, 0},
	{[]float64{1, 30}, 3, 0.05},
	{[]float64{1}, 2, 0.02},
	{[]float64{1}, 3, 0.02},
	{[]float64{1}, 4, 0.04},
	{[]float64{1}, 6, 0.04},
}

// at returns rung i, counted from 10^0; i may be negative.
func (l ladder) at(i int) float64 {
	n := len(l.rung)
	period := int(math.Floor(float64(i) / float64(n)))
	return scale10(l.rung[i-period*n], period*l.decades)
}

// below returns the index of the highest rung that is not above v, v > 0.
func (l ladder) below(v float64) int {
	i := int(math.Floor(math.Log10(v)/float64(l.decades)))*len(l.rung) - 1
	for l.at(i+1) <= v {
		i++
	}
	return i
}

// between returns the rungs from the last at or below lo to the first at or above hi; nil when there would be too many for a legend.
func (l ladder) between(lo, hi float64) []float64 {
	var edge []float64
	for i := l.below(lo); len(edge) <= most+1; i++ {
		edge = append(edge, l.at(i))
		if l.at(i) >= hi {
			return edge
		}
	}
	return nil
}

// inside returns the rungs strictly between lo and hi; nil when there would be too many for a legend.
func (l ladder) inside(lo, hi float64) []float64 {
	var edge []float64
	for i := l.below(lo) + 1; l.at(i) < hi; i++ {
		if edge = append(edge, l.at(i)); len(edge) > most {
			return nil
		}
	}
	return edge
}

// down returns n rungs ascending to the first at or above hi.
func (l ladder) down(hi float64, n int) []float64 {
	if !(hi > 0) {
		return nil
	}
	top := l.below(hi)
	if l.at(top) < hi {
		top++
	}
	edge := make([]float64, n)
	for k := range edge {
		edge[k] = l.at(top - n + 1 + k)
	}
	return edge
}

// ratioLadder holds round factors with round reciprocals, from which the inner edges of a relative-risk map are taken. It
// begins at 1.05: risks nearer to 1 than that are not worth a colour, and a map of nothing but such risks comes out neutral.
var ratioLadder = []struct{ up, down float64 }{
	{1.05, 0.95}, {1.1, 0.9}, {1.25, 0.8}, {1.5, 0.67}, {2, 0.5}, {3, 0.33}, {5, 0.2}, {10, 0.1},
	{20, 0.05}, {50, 0.02}, {100, 0.01}, {1000, 0.001}, {10000, 0.0001}, {1e5, 1e-5}, {1e6, 1e-6}, {1e8, 1e-8}, {1e10, 1e-10}, {1e12, 1e-12}, {1e14, 1e-14},
}

// ratioBreaks chooses three factors a < b < c so that the classes cut at 1/c, 1/b, 1/a, a, b, c are filled as evenly as
// they can be, and an outermost pair that covers all values. Both sides are always there: a map of relative risks is read against 1.
func ratioBreaks(value []float64) []float64 {
	furthest, positive := 1.0, []float64(nil)
	for _, v := range value {
		if finite(v) && v > 0 {
			furthest = max(furthest, v, 1/v)
			positive = append(positive, v)
		}
	}
	if positive == nil {
		return nil
	}
	sample := sorted(positive)
	outer := len(ratioLadder) - 1
	for i := range ratioLadder {
		if ratioLadder[i].up >= furthest && ratioLadder[i].down <= 1/furthest {
			outer = i
			break
		}
	}
	outer = max(outer, 3)
	end := ratioLadder[outer]
	end.up, end.down = max(end.up, furthest), min(end.down, 1/furthest)
	var best []float64
	bestScore := math.Inf(-1)
	for a := 0; a < outer-2; a++ {
		for b := a + 1; b < outer-1; b++ {
			for c := b + 1; c < outer; c++ {
				edge := []float64{end.down, ratioLadder[c].down, ratioLadder[b].down, ratioLadder[a].down,
					ratioLadder[a].up, ratioLadder[b].up, ratioLadder[c].up, end.up}
				if s := spread(edge, sample); s > bestScore {
					best, bestScore = edge, s
				}
			}
		}
	}
	return best
}
