package batch

import (
	"context"
	"fmt"
	"slices"
	"strings"

	"drumlin/grids/crs"
	"drumlin/io/draft"
)

// Tile is a region's part of a mosaic; Open reads its draft.
type Tile struct {
	Region string
	Open   func() (draft.Draft, error)
}

// Mosaic is one map of all regions, each fitted by itself. Every spot is shown once: where several regions' maps cover
// it, the region with the nearest observation has it. A Mosaic holds no drafts: what is written from it opens them again,
// one at a time.
type Mosaic struct {
	// Why says why the regions do not make one map; it is empty if they do. Nothing can be written from one that says why.
	Why string
	// Response and Unit are those of all regions.
	Response, Unit string

	tiles    []mosaicTile // those with cells, in the order they came
	common   crs.System   // the plane that all regions share, or nil
	ratio    bool
	chances  bool     // some region has a threshold
	atPlaces []string // regions whose values stand at places of their own
	said     sayings
}

// mosaicTile is what is kept of a region: nothing that grows with its cells but two bits each, and these only where it
// meets another region.
type mosaicTile struct {
	Tile
	stance
	covered cellSet // cells that lie in another region's map as well
	lost    cellSet // of these, the ones that another region shows
}

// sayings are what the drafts say around their maps.
type sayings struct {
	cautions  []string // in all of them
	subtitles []string // different ones, two at most
	limits    []float64
}

// BuildMosaic finds out which cells of which region a mosaic shows. A cell whose centre also lies in a cell of another
// region belongs to the region with the nearest observation, at equal distances to the earlier tile. An edge cell that
// stands out of its region's study area covers nothing out there, so regions that share a border lose no cells to each other.
//
// It is no error but a reason (Why) if fewer than two tiles have cells, if they differ in response or unit, if some lie
// in local metres and some on the globe, or if more than half of all cells are also covered by another region: such as
// years of one place. Errors are those of Open and ctx, and a draft that contradicts itself.
//
// Every draft is opened once, and those that meet others about once more where there are many regions; 32 at most
// are held at a time.
func BuildMosaic(ctx context.Context, tiles []Tile) (*Mosaic, error) {
	m := &Mosaic{}
	shelf := &groundShelf{}
	for _, t := range tiles {
		if err := ctx.Err(); err != nil {
			return nil, err
		}
		if err := m.survey(t, shelf); err != nil {
			return nil, err
		}
		if m.Why != "" {
			return m, nil
		}
	}
	if len(m.tiles) < 2 {
		m.Why = "fewer than two regions have a map of cells"
		return m, nil
	}
	m.common = m.tiles[0].system
	for _, t := range m.tiles {
		if t.system.Code() != m.common.Code() {
			m.common = nil
			break
		}
	}
	return m, m.share(ctx, shelf)
}

// survey opens a tile for the first time and settles whether it goes with those before it.
func (m *Mosaic) survey(t Tile, shelf *groundShelf) error {
	shelf.makeRoom(0)
	d, err := openTile(t)
	if err != nil {
		return err
	}
	if len(d.Cells) == 0 {
		m.atPlaces = append(m.atPlaces, t.Region)
		return nil
	}
	next := mosaicTile{Tile: t, stance: stanceOf(d)}
	if len(m.tiles) == 0 {
		m.Response, m.Unit, m.ratio, m.said.cautions = d.Response, d.Unit, d.Ratio, slices.Clone(d.Foot)
	} else if m.Why = m.tiles[0].apart(next); m.Why != "" {
		return nil
	}
	m.said.hear(d)
	m.chances = m.chances || d.Chance != nil
	shelf.put(len(m.tiles), groundOf(d))
	m.tiles = append(m.tiles, next)
	return nil
}

// apart says why two regions do not go on one map; empty if they do.
func (t mosaicTile) apart(next mosaicTile) string {
	switch {
	case t.response != next.response || t.unit != next.unit:
		return fmt.Sprintf("the regions show different things: %s is about %q in %q, %s about %q in %q",
			t.Region, t.response, t.unit, next.Region, next.response, next.unit)
	case t.system.Geographic() != next.system.Geographic():
		local, tied := t.Region, next.Region
		if t.system.Geographic() {
			local, tied = tied, local
		}
		return fmt.Sprintf("some regions lie in local metres (%s) and some on the globe (%s), and nothing says how the two hang together", local, tied)
	}
	return ""
}

func (s *sayings) hear(d draft.Draft) {
	s.cautions = slices.DeleteFunc(s.cautions, func(c string) bool { return !slices.Contains(d.Foot, c) })
	if len(s.subtitles) < 2 && !slices.Contains(s.subtitles, d.Subtitle) {
		s.subtitles = append(s.subtitles, d.Subtitle)
	}
	if t := d.Threshold; t != nil && len(s.limits) < 2 && !slices.Contains(s.limits, *t) {
		s.limits = append(s.limits, *t)
	}
}

// openTile opens a draft and checks what the mosaic relies on.
func openTile(t Tile) (draft.Draft, error) {
	d, err := t.Open()
	if err == nil && len(d.Cells) > 0 {
		err = checkCells(d)
	}
	if err != nil {
		return d, fmt.Errorf("the draft of region %q: %w", t.Region, err)
	}
	return d, nil
}

// Cells returns the number of cells that the mosaic shows.
func (m *Mosaic) Cells() int {
	n := 0
	for _, t := range m.tiles {
		n += t.cells - t.lost.len()
	}
	return n
}

// reopen opens a tile again to show its cells.
func (m *Mosaic) reopen(i int) (draft.Draft, error) {
	t := m.tiles[i]
	d, err := openTile(t.Tile)
	if err == nil && len(d.Cells) != t.cells {
		err = fmt.Errorf("the draft of region %q changed while the mosaic was made: it has %d cells, not %d", t.Region, len(d.Cells), t.cells)
	}
	return d, err
}

// Notes say what the user of the mosaic's files should know beside the cautions on its picture.
func (m *Mosaic) Notes() []string {
	var notes []string
	if len(m.atPlaces) > 0 {
		notes = append(notes, "Not in the mosaic, as their values stand at places of their own: "+listed(m.atPlaces)+".")
	}
	if m.Why == "" && len(m.said.limits) > 1 {
		notes = append(notes, "The regions have different thresholds: their chances are not of the same thing.")
	}
	if m.Why == "" && !m.FitsGeoJSON() {
		notes = append(notes, fmt.Sprintf("mosaic.geojson is left out: it would hold %d cells, and at most %d are written.", m.Cells(), mosaicFeatures))
	}
	return notes
}

// mostListed is how many names a sentence holds.
const mostListed = 12

// listed joins names, as many as a sentence holds.
func listed(names []string) string {
	if len(names) <= mostListed {
		return strings.Join(names, ", ")
	}
	return fmt.Sprintf("%s and %d more", strings.Join(names[:mostListed], ", "), len(names)-mostListed)
}
