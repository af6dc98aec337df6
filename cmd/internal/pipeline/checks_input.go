package pipeline

import (
	"encoding/binary"
	"fmt"
	"math"
	"slices"

	"drumlin/grids"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// inputChecks look at the observations themselves, for what is likely a mistake and yet can be fitted.
func (r *run) inputChecks() []summary.Check {
	list := []summary.Check{r.coordinatesCheck(), r.repeatedCheck()}
	if r.estimates.outside != nil {
		list = append(list, r.rangeCheck())
	}
	if r.settings.Length != nil && r.obs.areal() {
		list = append(list, r.lengthCheck())
	}
	return list
}

// coordinatesCheck looks for places that are likely missing, and for degrees that were taken for metres.
func (r *run) coordinatesCheck() summary.Check {
	c := summary.Check{Name: "coordinates", Level: summary.Clear, Sentence: "no place is likely a mistake"}
	if rows := r.obs.atZero(); len(rows) > 0 {
		c.Level, c.Figure = summary.Look, summary.Number(len(rows))
		c.Sentence = fmt.Sprintf("%s at exactly 0, 0 and far from all others, which is likely a missing place: take %s out",
			rowsLie(rows, r.obs.table.Row), map[bool]string{true: "it", false: "them"}[len(rows) == 1])
	} else if r.obs.maybeDegrees(r.settings) {
		c.Level, c.Figure = summary.Look, 1
		c.Sentence = "the coordinates were taken for metres, and they look like degrees: say --crs EPSG:4326 if they are longitude and latitude"
	}
	return c
}

// rowsLie names some of the rows.
func rowsLie(rows []int, number []int32) string {
	if len(rows) == 1 {
		return fmt.Sprintf("row %d lies", number[rows[0]])
	}
	return fmt.Sprintf("%d rows, the first of them row %d, lie", len(rows), number[rows[0]])
}

// atZero returns the rows at exactly 0, 0 in their own coordinates, if 0, 0 lies apart from where the others are.
func (o *observations) atZero() (rows []int) {
	x, y := o.table.XY()
	left, right, low, high := math.Inf(1), math.Inf(-1), math.Inf(1), math.Inf(-1)
	for i := range o.own {
		if x[i] == 0 && y[i] == 0 {
			rows = append(rows, i)
			continue
		}
		left, right, low, high = min(left, x[i]), max(right, x[i]), min(low, y[i]), max(high, y[i])
	}
	gapX, gapY := max(left, -right), max(low, -high) // above 0 where 0 lies outside of the others
	if len(rows) == o.own || !(gapX > (right-left)/2 || gapY > (high-low)/2) {
		return nil
	}
	return rows
}

// maybeDegrees reports whether coordinates that nothing was said of could be longitude and latitude: they lie in their
// range, and have more digits behind the point than metres are measured to.
func (o *observations) maybeDegrees(s plan.Settings) bool {
	if s.CRS != nil || o.table.CRS != "" || o.table.Degrees {
		return false
	}
	x, y := o.table.XY()
	fractions := 0
	for i := range o.own {
		if math.Abs(x[i]) > 180 || math.Abs(y[i]) > 90 {
			return false
		}
		if centimetres := 100 * x[i]; math.Abs(centimetres-math.Round(centimetres)) > 1e-6 {
			fractions++
		}
	}
	return fractions > o.own/2
}

// mostRepeated is the share of rows that may repeat another before it is remarked on (common practice, no source).
const mostRepeated = 0.02

// repeatedCheck looks for rows that repeat another in all that was read of them: copies make a map surer than it is.
func (r *run) repeatedCheck() summary.Check {
	rows, first := r.obs.repeated()
	share := float64(len(rows)) / float64(r.obs.own)
	c := summary.Check{Name: "repeated rows", Level: summary.Clear, Figure: summary.Number(share), Sentence: "hardly any row repeats another"}
	if len(rows) > 2 && share > mostRepeated {
		number := r.obs.table.Row
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("%d rows repeat another in place and values, such as row %d that of row %d: if they are copies, errors are too small",
			len(rows), number[rows[0]], number[first])
	}
	return c
}

// repeated returns the rows that are like an earlier one in place and in every column that was read, and the row that
// the first of them is like.
func (o *observations) repeated() (rows []int, first int) {
	if len(o.placeX) == o.own { // as many places as rows
		return nil, 0
	}
	x, y := o.table.XY()
	seen := map[string]int{}
	var key []byte
	for i := range o.own {
		key = key[:0]
		number := func(v float64) { key = binary.LittleEndian.AppendUint64(key, math.Float64bits(v)) }
		number(x[i])
		number(y[i])
		for _, c := range o.table.Columns {
			if c.Number != nil {
				number(c.Number[i])
			}
			if c.Code != nil {
				key = binary.LittleEndian.AppendUint32(key, uint32(c.Code[i]))
			}
		}
		if at, again := seen[string(key)]; !again {
			seen[string(key)] = i
		} else {
			if rows == nil {
				first = at
			}
			rows = append(rows, i)
		}
	}
	return rows, first
}

// rangeCheck says how much of the map has covariates that no observation had, alone or together.
func (r *run) rangeCheck() summary.Check {
	n := 0.0
	for _, v := range r.estimates.outside {
		n += v
	}
	share := n / float64(len(r.estimates.outside))
	c := summary.Check{Name: "range", Level: level(share, 0.05, 0.5), Figure: summary.Number(share), Sentence: "covariates of the map are within what was observed"}
	if n > 0 {
		c.Sentence = fmt.Sprintf("%s %% of the map has covariates, alone or together, that no observation had (column outside): there the map rests on the model alone",
			summary.Short(summary.Number(100*share)))
	}
	return c
}

// mostStretch is how many times longer or shorter a strip may be than it was drawn before it is remarked on (common
// practice, no source).
const mostStretch = 2

// lengthCheck holds the lengths of strips against the lines that they were drawn as.
func (r *run) lengthCheck() summary.Check {
	length := r.obs.table.Column(*r.settings.Length).Number
	var ratio []float64
	for i := range r.obs.own {
		if drawn := grids.LengthOf(r.obs.places[r.obs.placeOf[i]].shape, r.obs.system); drawn > 0 {
			ratio = append(ratio, length[i]*metresIn[*r.settings.LengthUnit]/drawn)
		}
	}
	c := summary.Check{Name: "lengths", Level: summary.Clear, Figure: 1, Sentence: "strips are about as long as they were drawn"}
	if len(ratio) == 0 {
		return c
	}
	slices.Sort(ratio)
	middle := ratio[len(ratio)/2]
	c.Figure = summary.Number(middle)
	if middle > mostStretch || middle < 1.0/mostStretch {
		c.Level = summary.Look
		c.Sentence = fmt.Sprintf("by column %s strips are %s times as long as they were drawn (median): check its unit, %s",
			*r.settings.Length, summary.Short(summary.Number(middle)), *r.settings.LengthUnit)
	}
	return c
}
