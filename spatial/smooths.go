package spatial

import (
	"drumlin/spatial/internal/penfit"
)

// smooth is a part of the model with a penalty of its own.
type smooth struct {
	name  string
	kind  SmoothKind
	ridge penfit.Ridge
	scale float64 // lambda as reported over lambda as the core has it
	free  int     // columns of it that no penalty touches, a constant not counted
}

// SmoothKind says what a smooth part is.
type SmoothKind int

const (
	SurfaceSmooth SmoothKind = iota // lambda of J(f), with places in metres
	SlopeSmooth                     // of the surface's slope, where it may vanish; scaled coordinates
	CurveSmooth                     // of the squared second differences of the B-spline coefficients
	GroupSmooth                     // of the squared levels: phi over the variance between groups
)

// smooths lists the model's penalties in the order of the core's.
func (s *Surface) smooths() []smooth {
	list := s.surfaceSmooths()
	at := s.core.columns() + s.border.size()
	for _, e := range s.border.Effects {
		switch e.Role {
		case Group:
			list = append(list, smooth{"group " + e.Name, GroupSmooth, penfit.Ridge{{First: at, Size: e.bound()}}, 1, 0})
		case Curve:
			for k, c := range e.Curve {
				bend := c.Dim() - 1
				list = append(list, smooth{"curve " + e.curveName(k), CurveSmooth, penfit.Ridge{{First: at + k*bend, Size: bend}}, 1, 1})
			}
		}
		at += e.bound()
	}
	return list
}

// surfaceSmooths lists the surface's own: one penalty for all its copies, or one each.
func (s *Surface) surfaceSmooths() (list []smooth) {
	c := s.core
	if c.basis == nil {
		return nil
	}
	bend, slope := c.width()-c.null(), c.null()-s.border.keep
	add := func(kind SmoothKind, name string, first, size int, scale float64, free int) {
		if size == 0 {
			return
		}
		for l := 0; l < c.copies(); l++ {
			span := penfit.Span{First: l*c.width() + first, Size: size}
			if l > 0 && !s.model.OwnSmoothness {
				list[len(list)-1].ridge = append(list[len(list)-1].ridge, span)
				list[len(list)-1].free += free
				continue
			}
			own := name
			if s.model.OwnSmoothness && c.per != "" {
				own += ", " + c.per + "=" + c.level[l]
			}
			list = append(list, smooth{own, kind, penfit.Ridge{span}, scale, free})
		}
	}
	add(SurfaceSmooth, "surface", c.null(), bend, c.basis.Scale*c.basis.Scale, s.border.keep-1)
	add(SlopeSmooth, "surface slope", s.border.keep, slope, 1, 0)
	return list
}

func ridges(list []smooth) []penfit.Ridge {
	var r []penfit.Ridge
	for _, s := range list {
		r = append(r, s.ridge)
	}
	return r
}
