package chart

import (
	"image/color"
	"math"
	"slices"
)

// classes is a cut legend: class k holds the values from edge k-1 (inclusive) to edge k (exclusive).
type classes struct {
	edge     []float64 // inner edges, one fewer than classes
	low, top float64   // outermost edges as printed; NaN where the class is open
	tone     []tone
	hatched  []bool   // relative risks below 1, which a grey copy could not tell from those above
	word     []string // a name for each class instead of its bounds, or nil
	plain    bool     // edges are written without trailing zeros
	constant float64  // the value of all cells when there is one class; NaN otherwise
}

// cut decides the classes for a map.
func cut(m Map) classes {
	value := m.Values()
	edge := m.Breaks
	if edge == nil || m.Kind == Chance {
		edge = Breaks(m.Kind, value)
	}
	lo, hi := span(value)
	if lo > hi && !m.shares() {
		return classes{low: math.NaN(), top: math.NaN(), constant: math.NaN()}
	}
	if edge == nil {
		return classes{low: math.NaN(), top: math.NaN(), constant: lo, tone: rampOf(m.Kind).tones(1), hatched: []bool{false}}
	}
	c := classes{constant: math.NaN(), plain: m.Kind == Ratio || m.Kind == Chance}
	c.low, c.edge, c.top = m.ends(edge, lo, hi)
	n := len(c.edge) + 1
	c.hatched = make([]bool, n)
	switch m.Kind {
	case Ratio:
		place := places(c.edge)
		c.tone = twoSided(place)
		for k, p := range place {
			c.hatched[k] = p < 0
		}
	case Chance:
		c.tone = chanceRamp.tones(n)
		c.word = []string{"very likely below", "likely below", "could be either", "likely above", "very likely above"}
	default:
		c.tone = rampOf(m.Kind).tones(n)
	}
	return c
}

// shares reports whether the legend is that of several maps.
func (m Map) shares() bool { return m.Shared && (m.Breaks != nil || m.Kind == Chance) }

// ends returns the inner edges and the outermost ones as they are printed, NaN where a class is open; the map's values
// run from lo to hi.
func (m Map) ends(edge []float64, lo, hi float64) (low float64, inner []float64, top float64) {
	n := len(edge) - 1
	low, inner, top = edge[0], edge[1:n], edge[n]
	switch {
	case m.Kind == Ratio:
		return math.NaN(), inner, math.NaN()
	case m.shares() && m.Kind != Chance:
		inner, top = edge[1:], math.NaN()
	case hi > top:
		top = math.NaN()
	}
	if lo < low || math.IsInf(low, -1) {
		low = math.NaN()
	}
	return low, inner, top
}

func inside(m Map) []float64 {
	v := make([]float64, 0, len(m.Value))
	for k, in := range m.Lattice.Mask {
		if in {
			v = append(v, m.Value[k])
		}
	}
	return v
}

func rampOf(kind Kind) ramp {
	switch kind {
	case Uncertainty:
		return uncertaintyRamp
	case Chance:
		return chanceRamp
	case Ratio:
		return aboveRamp[:2] // a single class of relative risks: near neutral
	}
	return levelRamp
}

// places numbers the classes of a relative-risk map outwards from 1: the class that holds 1 inside it is 0. Where 1 is itself an edge there is no
// neutral class.
func places(edge []float64) []int {
	at, onEdge := slices.BinarySearch(edge, 1)
	p := make([]int, len(edge)+1)
	for k := range p {
		p[k] = k - at
		if onEdge && k > at {
			continue
		}
		if onEdge {
			p[k]-- // classes at or below index at lie under 1
		}
	}
	return p
}

// of returns the class of v, or -1 for a blank.
func (c classes) of(v float64) int {
	if !finite(v) || len(c.tone) == 0 {
		return -1
	}
	k := 0
	for k < len(c.edge) && v >= c.edge[k] {
		k++
	}
	return k
}

// colours returns the fill of each class and the colour of the hatching over it (the fill itself where there is none).
func (c classes) colours() (fill, hatch []color.RGBA) {
	for k, t := range c.tone {
		fill = append(fill, t.rgb())
		hatch = append(hatch, t.rgb())
		if c.hatched[k] {
			hatch[k] = hatchOf(t).rgb()
		}
	}
	return fill, hatch
}

// bounds returns all printed edges, NaN for open ends.
func (c classes) bounds() []float64 {
	return append(append([]float64{c.low}, c.edge...), c.top)
}

// printed writes bounds; open ends are empty.
func (c classes) printed() []string {
	b := c.bounds()
	var known []float64
	for _, v := range b {
		if !math.IsNaN(v) {
			known = append(known, v)
		}
	}
	text := c.write(known)
	s := make([]string, len(b))
	for i, v := range b {
		if !math.IsNaN(v) {
			s[i], text = text[0], text[1:]
		}
	}
	return s
}

// write writes edges: chances and ratios each as short as can be, since their steps are of no one size.
func (c classes) write(v []float64) []string {
	if !c.plain {
		return numbers(v)
	}
	s := make([]string, len(v))
	for i, x := range v {
		s[i] = number(x, -1)
	}
	return s
}

// ranges writes the values each class holds.
func (c classes) ranges() []string {
	if len(c.tone) == 0 {
		return nil
	}
	if len(c.tone) == 1 && !math.IsNaN(c.constant) {
		return []string{tidy(c.constant) + " everywhere"}
	}
	p := c.printed()
	s := make([]string, len(c.tone))
	for k := range s {
		switch from, to := p[k], p[k+1]; {
		case from == "" && to == "":
			s[k] = "all values"
		case from == "":
			s[k] = "under " + to
		case to == "":
			s[k] = from + " and over"
		default:
			s[k] = from + " to " + to
		}
	}
	return s
}
