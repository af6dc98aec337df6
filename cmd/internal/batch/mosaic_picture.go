package batch

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/chart"
	"drumlin/io/draft"

	"github.com/paulmach/orb"
)

// Limits of a mosaic's picture.
const (
	mostAcross    = 1600 // cells across its lattice
	fineAcross    = 800  // cells across from which cells of other lattices keep their shape
	mostNamed     = 60   // regions with their names on the map: more would be a mess
	mostCautions  = 3    // from the drafts
	edgesInPieces = 20   // cells of the picture that an edge drawn straight spans at most, where it bends in the plane
)

// Picture returns the map of all regions in one plane: their common one, else an azimuthal equal-area plane around them.
// Each of its cells has the value of the region that shows the spot at its centre, by the rules of BuildMosaic. It is drawn up
// to the edges of the study areas: cells that stand out are cut there, and a cell left out for its centre alone is filled
// up to there from the cell next to it. Regions are drawn as zones. Breaks are left to the caller.
//
// Margin is how far neighbours' rows helped each fit, in metres; 0 if they did not. LeftOut names the regions that are not
// among the tiles because they are not to be used. Errors are those of ctx and of opening the drafts, and regions that
// no one plane shows.
func (m *Mosaic) Picture(ctx context.Context, title string, margin float64, leftOut []string) (chart.Map, error) {
	if m.Why != "" {
		return chart.Map{}, errNoMosaic
	}
	p, err := m.newPainting()
	if err != nil {
		return chart.Map{}, err
	}
	var zones []chart.Zone
	for i, t := range m.tiles {
		if err := ctx.Err(); err != nil {
			return chart.Map{}, err
		}
		d, err := m.reopen(i)
		if err != nil {
			return chart.Map{}, err
		}
		p.lay(t.stance, d)
		z := chart.Zone{Area: p.outline(d)}
		if len(m.tiles) <= mostNamed {
			z.Name = t.Region
		}
		zones = append(zones, z)
	}
	p.lattice.Mask = p.mask()
	picture := chart.Map{Title: title, Subtitle: m.subtitle(), Legend: m.Unit, Kind: chart.Level,
		Lattice: p.lattice, Value: p.value, Zones: zones, ZoneWord: "region", Foot: m.foot(margin, leftOut)}
	if m.ratio {
		picture.Kind = chart.Ratio
	}
	return picture, nil
}

// subtitle is the one that all drafts have.
func (m *Mosaic) subtitle() string {
	if len(m.said.subtitles) == 1 {
		return m.said.subtitles[0]
	}
	return ""
}

// foot words the cautions below the map.
func (m *Mosaic) foot(margin float64, leftOut []string) []string {
	first := "Each region was fitted by itself: levels may jump at the borders between regions, and a jump is no finding."
	switch {
	case margin >= 1000:
		first += fmt.Sprintf(" Rows of neighbouring regions within %.4g km helped each fit.", margin/1000)
	case margin > 0:
		first += fmt.Sprintf(" Rows of neighbouring regions within %.4g m helped each fit.", margin)
	}
	foot := []string{first}
	if len(m.said.subtitles) > 1 {
		foot = append(foot, "The regions are adjusted to values that are not the same everywhere.")
	}
	if len(leftOut) > 0 {
		foot = append(foot, "Left out as not to be used: "+listed(leftOut)+".")
	}
	if len(m.atPlaces) > 0 {
		foot = append(foot, "Left out as their values stand at places of their own: "+listed(m.atPlaces)+".")
	}
	return append(foot, m.said.cautions[:min(len(m.said.cautions), mostCautions)]...)
}

// painting is the lattice of a mosaic's picture, being filled region by region: a later one takes a spot from an earlier
// one where it has the better claim.
type painting struct {
	lattice grids.Lattice
	value   []float64
	claim   []float64 // distance to the nearest observation of the region that has the spot
	state   []byte
}

// What a spot of a painting is.
const (
	unshown  byte = iota
	patched       // beside the cells, but within the study area: see tileGround.beside
	overhung      // shown by an edge cell that stands out of its region's study area
	settled       // within the study area of the region that shows it
)

func (m *Mosaic) newPainting() (*painting, error) {
	plane, err := m.onePlane()
	if err != nil {
		return nil, err
	}
	l := m.pictureLattice(plane)
	p := &painting{lattice: l, value: empty(l.Cells()), claim: make([]float64, l.Cells()), state: make([]byte, l.Cells())}
	return p, nil
}

// onePlane returns the plane that all regions share, or lays one around them. Corners speak for a region, not the
// vertices of its outline: the most winding one would draw the middle towards itself.
func (m *Mosaic) onePlane() (crs.System, error) {
	if m.common != nil {
		return m.common, nil
	}
	var lon, lat []float64
	for _, t := range m.tiles {
		if t.edge == nil {
			return nil, fmt.Errorf("region %q reaches beyond its plane (%s), so it cannot be drawn in another one", t.Region, t.system.Code())
		}
		for k := 0; k < len(t.edge); k += placesAlong {
			lon, lat = append(lon, t.edge[k][0]), append(lat, t.edge[k][1])
		}
	}
	return crs.AzimuthalAround(lon, lat)
}

// pictureLattice covers all regions. Its cell is the median of theirs; where lattices differ in cell, plane or place, it is a
// whole fraction of that, so that each region's cells keep their shape; and it is never so small that there are too many across.
func (m *Mosaic) pictureLattice(plane crs.System) grids.Lattice {
	var all orb.Bound
	for i, t := range m.tiles {
		b, ok := t.boundIn(plane)
		if !ok {
			b = t.aroundIn(plane)
		}
		if i == 0 {
			all = b
		}
		all = all.Union(b)
	}
	sizes := slices.SortedFunc(slices.Values(m.tiles), func(a, b mosaicTile) int {
		return cmp.Or(cmp.Compare(a.side, b.side), cmp.Compare(a.x0, b.x0), cmp.Compare(a.y0, b.y0))
	})
	usual := sizes[len(sizes)/2]
	wide, high := all.Max[0]-all.Min[0], all.Max[1]-all.Min[1]
	cell := usual.side
	if across := max(wide, high) / cell; across > mostAcross-1 {
		cell = max(wide, high) / (mostAcross - 1)
	} else if !m.aligned() {
		cell /= max(1, math.Min(math.Ceil(fineAcross/across), math.Floor((mostAcross-1)/across)))
	}
	l := grids.Lattice{CRS: plane, X0: all.Min[0], Y0: all.Min[1], Cell: cell}
	if m.common != nil { // cells fall on cells where they can
		l.X0 = usual.x0 + math.Floor((all.Min[0]-usual.x0)/cell+1e-6)*cell
		l.Y0 = usual.y0 + math.Floor((all.Min[1]-usual.y0)/cell+1e-6)*cell
	}
	l.NX, l.NY = int(max(1, math.Ceil((all.Max[0]-l.X0)/cell-1e-6))), int(max(1, math.Ceil((all.Max[1]-l.Y0)/cell-1e-6)))
	return l
}

// aroundIn is the box around what a plane shows of a region's edge.
func (s stance) aroundIn(plane crs.System) orb.Bound {
	b := orb.Bound{Min: orb.Point{math.Inf(1), math.Inf(1)}, Max: orb.Point{math.Inf(-1), math.Inf(-1)}}
	for _, p := range s.edge {
		if x, y := plane.Forward(p[0], p[1]); !math.IsNaN(x + y) {
			b = b.Union(orb.Point{x, y}.Bound())
		}
	}
	return b
}

// aligned reports whether all regions' cells are cells of one lattice.
func (m *Mosaic) aligned() bool {
	first := m.tiles[0]
	whole := func(v float64) bool { return math.Abs(v-math.Round(v)) < 1e-6 }
	for _, t := range m.tiles {
		if m.common == nil || t.side != first.side || !whole((t.x0-first.x0)/t.side) || !whole((t.y0-first.y0)/t.side) {
			return false
		}
	}
	return true
}

// lay lays a region over what has been painted.
func (p *painting) lay(s stance, d draft.Draft) {
	g := groundOf(d)
	reach := cellSpan{0, p.lattice.NX - 1, 0, p.lattice.NY - 1}
	if bound, ok := s.boundIn(p.lattice.CRS); ok {
		reach = spanOf(p.lattice, bound)
	}
	into := crossing(p.lattice.CRS, s.system)
	for j := reach.j0; j <= reach.j1; j++ {
		for i := reach.i0; i <= reach.i1; i++ {
			k := j*p.lattice.NX + i
			x, y := into(p.lattice.Centre(k))
			state := settled
			row, ok := g.at(x, y)
			if !ok {
				state = patched
				if row, ok = g.beside(x, y); !ok {
					continue
				}
			}
			claim := g.distance(row)
			if state > p.state[k] || state == p.state[k] && claim < p.claim[k] {
				p.state[k], p.claim[k], p.value[k] = state, claim, d.Estimate[row]
			}
		}
	}
}

// mask marks the spots that some region shows.
func (p *painting) mask() []bool {
	mask := make([]bool, len(p.state))
	for k, s := range p.state {
		mask[k] = s != unshown
	}
	return mask
}

// outline brings the edge of a study area into the picture's plane, without detail finer than half a cell.
func (p *painting) outline(d draft.Draft) orb.MultiPolygon {
	var area orb.MultiPolygon
	for _, polygon := range d.Outline {
		var rings orb.Polygon
		for _, ring := range polygon {
			if r := p.thin(p.project(ring, d.Lattice.CRS)); len(r) >= 4 {
				rings = append(rings, r)
			}
		}
		if rings != nil {
			area = append(area, rings)
		}
	}
	return area
}

// project brings a ring into the picture's plane. Long edges are projected in pieces, because they bend there. Places that
// the plane does not show are passed over.
func (p *painting) project(ring orb.Ring, from crs.System) orb.Ring {
	if from.Code() == p.lattice.CRS.Code() {
		return ring
	}
	into := crossing(from, p.lattice.CRS)
	var out orb.Ring
	for i, v := range ring {
		pieces, last := 1.0, v
		if i > 0 {
			last = ring[i-1]
			pieces = min(max(1, math.Ceil(math.Hypot(v[0]-last[0], v[1]-last[1])/(edgesInPieces*p.lattice.Cell))), mostAcross)
		}
		for piece := 1.0; piece <= pieces; piece++ {
			f := piece / pieces
			if x, y := into(last[0]+f*(v[0]-last[0]), last[1]+f*(v[1]-last[1])); !math.IsNaN(x + y) {
				out = append(out, orb.Point{x, y})
			}
		}
	}
	return out
}

// thin passes over vertices closer than half a cell to the last one kept, but for the closing one.
func (p *painting) thin(ring orb.Ring) orb.Ring {
	var out orb.Ring
	for i, v := range ring {
		if i > 0 && i < len(ring)-1 && math.Hypot(v[0]-out[len(out)-1][0], v[1]-out[len(out)-1][1]) < p.lattice.Cell/2 {
			continue
		}
		out = append(out, v)
	}
	return out
}
