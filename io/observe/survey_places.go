package observe

import "math"

// SurveyPlaces are the distinct places of a table, in the order in which they first appear.
type SurveyPlaces struct {
	X, Y []float64 // as they stand in the file, or as Table.XY gives them for geometries
	Rows []int     // rows at each place

	Beyond  int // rows at further places, where there are too many to tell apart
	Without int // rows in which a coordinate is missing or no number, or the geometry missing or unreadable
	Row     int // the first of these, from 1; 0 where there is none
}

// placeCounter counts rows by their places.
type placeCounter struct {
	out SurveyPlaces
	at  map[[2]float64]int
}

// take counts a row at a place; NaN stands for none.
func (c *placeCounter) take(x, y float64, row int) {
	p := &c.out
	if math.IsNaN(x) || math.IsNaN(y) {
		if p.Without++; p.Without == 1 {
			p.Row = row
		}
		return
	}
	if c.at == nil {
		c.at = map[[2]float64]int{}
	}
	at := [2]float64{x + 0, y + 0} // no negative 0
	i, seen := c.at[at]
	switch {
	case seen:
		p.Rows[i]++
	case len(p.Rows) == mostPlaces:
		p.Beyond++
	default:
		c.at[at] = len(p.Rows)
		p.X, p.Y, p.Rows = append(p.X, at[0]), append(p.Y, at[1]), append(p.Rows, 1)
	}
}
