package observe

import "iter"

// largestPiece is the most values of one piece of a pile.
const largestPiece = 1 << 15

// pile collects values of which nobody knows how many will come. It holds them in pieces, where one growing slice
// would hold them twice and leave as much behind.
type pile[T any] struct {
	full [][]T
	last []T
}

func (p *pile[T]) add(v T) {
	if len(p.last) == cap(p.last) {
		if len(p.last) > 0 {
			p.full = append(p.full, p.last)
		}
		p.last = make([]T, 0, min(max(16, 2*len(p.last)), largestPiece))
	}
	p.last = append(p.last, v)
}

func (p *pile[T]) len() int {
	n := len(p.last)
	for _, piece := range p.full {
		n += len(piece)
	}
	return n
}

// all gives the values in the order in which they came.
func (p *pile[T]) all() iter.Seq[T] {
	return func(yield func(T) bool) {
		for _, piece := range append(p.full[:len(p.full):len(p.full)], p.last) {
			for _, v := range piece {
				if !yield(v) {
					return
				}
			}
		}
	}
}

// join returns all values in one slice, nil for none, and leaves the pile empty.
func (p *pile[T]) join() []T {
	if len(p.full) == 0 {
		all := p.last
		p.last = nil
		return all
	}
	all := make([]T, 0, p.len())
	for _, piece := range p.full {
		all = append(all, piece...)
	}
	all = append(all, p.last...)
	*p = pile[T]{}
	return all
}
