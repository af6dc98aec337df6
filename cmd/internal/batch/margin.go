package batch

import (
	"cmp"
	"context"
	"fmt"
	"math"
	"slices"

	"drumlin/cmd/internal/pipeline"
	"drumlin/io/observe"
)

// earth is the mean radius in metres (IUGG); a margin is wide against the half per cent by which a sphere errs.
const earth = 6371008.8

// margin finds the rows of neighbouring regions that lie within a distance of a region's own.
type margin struct {
	metres float64
	at     map[cube][]spot // all rows of all regions, by the cube they lie in
}

// spot is one row.
type spot struct {
	region, row int32
	point       [3]float64
}

// cube is a corner of a lattice in space with the margin for its side.
type cube [3]int32

// layMargin reads where all rows are, where the plan asks for a margin.
func (r *runner) layMargin(ctx context.Context) error {
	if r.plan.Margin == 0 {
		return nil
	}
	m := &margin{metres: r.plan.Margin, at: map[cube][]spot{}}
	globe := -1
	for i := range r.regions {
		r.events.Stage("looking for neighbours", i, len(r.regions))
		if err := ctx.Err(); err != nil {
			return err
		}
		places, onGlobe, err := r.placesOf(ctx, i)
		if err != nil {
			continue // the region's own run will say what is wrong with its table
		}
		switch {
		case globe < 0:
			globe = onGlobe
		case globe != onGlobe:
			return r.plan.Fault("regions", "margin", "", "needs all regions in coordinates of one kind, and some are in local metres and others are not", "leave it out, or say what the coordinates are with crs")
		}
		for _, s := range places {
			c := m.cubeOf(s.point)
			m.at[c] = append(m.at[c], s)
		}
	}
	r.margin = m
	return nil
}

// placesOf returns the rows of a region in space: on the globe, or on a plane of local metres.
func (r *runner) placesOf(ctx context.Context, i int) (spots []spot, onGlobe int, err error) {
	s, err := r.settings(r.regions[i])
	if err != nil {
		return nil, 0, err
	}
	p, err := r.rowsOf(ctx, i)
	if err != nil {
		return nil, 0, err
	}
	lonLat, row, geographic, err := pipeline.Places(ctx, s, p)
	if err != nil {
		return nil, 0, err
	}
	for k, at := range lonLat {
		s := spot{region: int32(i), row: row[k], point: [3]float64{at[0], at[1], 0}}
		if geographic {
			lon, lat := at[0]*math.Pi/180, at[1]*math.Pi/180
			s.point = [3]float64{earth * math.Cos(lat) * math.Cos(lon), earth * math.Cos(lat) * math.Sin(lon), earth * math.Sin(lat)}
		}
		spots = append(spots, s)
	}
	if geographic {
		onGlobe = 1
	}
	return spots, onGlobe, nil
}

// rowsOf is a region's table, read again where it is not in memory.
func (r *runner) rowsOf(ctx context.Context, i int) (observe.Part, error) {
	g := r.regions[i]
	if g.rows != nil {
		return *g.rows, nil
	}
	s, err := r.settings(g)
	if err != nil {
		return observe.Part{}, err
	}
	shared, err := pipeline.ReadShared(ctx, s, r.in(g.observations))
	if err != nil {
		return observe.Part{}, err
	}
	return shared.All(), nil
}

func (m *margin) cubeOf(p [3]float64) cube {
	var c cube
	for k, v := range p {
		// Farther than two milliard margins from the origin all cubes are one: slower, and as right.
		c[k] = int32(math.Max(math.MinInt32, math.Min(math.MaxInt32, math.Floor(v/m.metres))))
	}
	return c
}

// near lists the rows of other regions within the margin of a region's own, by region and row.
func (m *margin) near(own []spot) []spot {
	found := map[[2]int32]spot{}
	for _, s := range own {
		c := m.cubeOf(s.point)
		for dx := int32(-1); dx <= 1; dx++ {
			for dy := int32(-1); dy <= 1; dy++ {
				for dz := int32(-1); dz <= 1; dz++ {
					for _, o := range m.at[cube{c[0] + dx, c[1] + dy, c[2] + dz}] {
						if o.region != s.region && distance(o.point, s.point) <= m.metres {
							found[[2]int32{o.region, o.row}] = o
						}
					}
				}
			}
		}
	}
	list := make([]spot, 0, len(found))
	for _, s := range found {
		list = append(list, s)
	}
	slices.SortFunc(list, func(a, b spot) int { return cmp.Or(cmp.Compare(a.region, b.region), cmp.Compare(a.row, b.row)) })
	return list
}

func distance(a, b [3]float64) float64 {
	return math.Hypot(math.Hypot(a[0]-b[0], a[1]-b[1]), a[2]-b[2])
}

// beyond returns the neighbours' rows that help a region's fit.
func (r *runner) beyond(ctx context.Context, i int) ([]observe.Part, error) {
	if r.margin == nil {
		return nil, nil
	}
	own, _, err := r.placesOf(ctx, i)
	if err != nil {
		return nil, nil // its own run will say what is wrong
	}
	var parts []observe.Part
	list := r.margin.near(own)
	for len(list) > 0 {
		n := 1
		for n < len(list) && list[n].region == list[0].region {
			n++
		}
		rows := make([]int32, n)
		for k, s := range list[:n] {
			rows[k] = s.row
		}
		p, err := r.rowsOf(ctx, int(list[0].region))
		if err != nil {
			return nil, fmt.Errorf("rows of the neighbouring region %s: %w", r.regions[list[0].region].name, err)
		}
		parts = append(parts, p.Only(rows))
		list = list[n:]
	}
	return parts, nil
}
