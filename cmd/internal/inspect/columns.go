package inspect

import (
	"cmp"
	"fmt"
	"math"
	"slices"
	"strings"

	"drumlin/io/observe"
)

// columns says what is unusual about columns by themselves.
func (e *examiner) columns() {
	var empty, same, unnamed []string
	for i := range e.survey.Columns {
		c := &e.survey.Columns[i]
		switch {
		case c.Kind == observe.Empty:
			empty = append(empty, shown(c, i))
			e.role[c.Name] = constant
			continue
		case c.Distinct == 1 && e.survey.Rows > 1:
			same = append(same, fmt.Sprintf("%s (%s)", shown(c, i), c.Examples[0]))
			e.role[c.Name] = constant
		case e.role[c.Name] == coordinate:
		case e.isIdentifier(c):
			e.role[c.Name] = identifier
		case whole(c) && !c.More && (c.Distinct == 2 && c.Most == 1 || c.Least >= 1 && c.Most <= 20 && 10*c.Distinct <= c.Values):
			e.role[c.Name] = coded
		}
		if c.Name == "" {
			unnamed = append(unnamed, shown(c, i))
		}
		e.notNumbers(c)
		e.missingMark(c)
		e.spellings(c)
		e.dates(c)
	}
	if len(empty) > 0 {
		e.find(Look, "empty-columns", "no value at all in "+listed(empty), empty...)
	}
	if len(same) > 0 {
		e.find(Look, "constant-columns", "the same value in every row of "+listed(same))
	}
	if len(unnamed) > 0 {
		e.find(Look, "unnamed-columns", listed(unnamed)+" without a name, and no flag can ask for it")
	}
}

// shown is the name of a column, or its number where it has none.
func shown(c *observe.SurveyColumn, i int) string {
	if c.Name == "" {
		return fmt.Sprintf("column %d", i+1)
	}
	return c.Name
}

// isIdentifier reports whether a column seems to number or to name the rows: one value a row, and a name that says so, or
// whole numbers that rise, or that lie closer together than measured ones would.
func (e *examiner) isIdentifier(c *observe.SurveyColumn) bool {
	if !c.Unique || !numeric(c) || c.Whole < c.Numbers {
		return false
	}
	width, n := c.Most-c.Least+1, float64(c.Values)
	return isNamed(c.Name, identifierNames) || c.Ascending && n >= 5 && width <= 2*n || n >= 50 && width <= 5*n
}

// notNumbers says which values of a column of numbers are none.
func (e *examiner) notNumbers(c *observe.SurveyColumn) {
	n := c.NotNumbers
	meant := n.DecimalCommas + n.Grouped + n.Limits
	if !numeric(c) && 2*(meant+c.Numbers) < c.Values || n.Values == 0 {
		return
	}
	sentence := fmt.Sprintf("%d of %d values of %s are no numbers, the first %q in row %d (line %d)", n.Values, c.Values, c.Name, n.Value, n.Row, n.Line)
	if n.Values == 1 {
		sentence = fmt.Sprintf("1 of %d values of %s is no number: %q in row %d (line %d)", c.Values, c.Name, n.Value, n.Row, n.Line)
	}
	var causes []string
	for _, cause := range []struct {
		n    int
		what string
	}{
		{n.DecimalCommas, "a decimal comma, which --decimal-comma allows"},
		{n.Grouped, "thousands set apart or a decimal comma, which cannot be told apart"},
		{n.Limits, "a value below a limit, for which --below-limit has rules"}, {n.Infinite, "a number that is not finite"},
	} {
		if cause.n > 0 {
			causes = append(causes, fmt.Sprintf("%d with %s", cause.n, cause.what))
		}
	}
	if len(causes) > 0 {
		sentence += "; " + strings.Join(causes, ", ")
	}
	e.find(Look, "not-numbers", sentence, c.Name)
	if 2*n.DecimalCommas > c.Values {
		e.commas = append(e.commas, c.Name)
	}
}

// missingMark looks for numbers that stand for no value (common practice, no source).
func (e *examiner) missingMark(c *observe.SurveyColumn) {
	if !numeric(c) || e.role[c.Name] == identifier {
		return
	}
	for _, mark := range []float64{-9, -99, -999, -9999, -99999} {
		if c.Least == mark && c.Median >= 0 && c.Median-mark > 2*(c.High-c.Median)+1 || c.Least == mark && mark <= -999 && c.Median > mark/2 {
			e.find(Look, "missing-mark", fmt.Sprintf("%s goes down to %s, likely a mark for a missing value; it is taken for a number unless "+
				"--missing=%s says so", c.Name, short(mark), short(mark)), c.Name)
			return
		}
	}
}

// spellings looks for texts that differ in capitals or blanks alone.
func (e *examiner) spellings(c *observe.SurveyColumn) {
	if c.Kind != observe.Text {
		return
	}
	first := map[string]string{}
	for _, level := range c.Levels {
		key := strings.Join(strings.Fields(strings.ToLower(level)), " ")
		other, seen := first[key]
		if seen {
			e.find(Look, "spellings", fmt.Sprintf("%s has both %q and %q, which count as two", c.Name, other, level), c.Name)
			return
		}
		first[key] = level
	}
}

func (e *examiner) dates(c *observe.SurveyColumn) {
	if c.Kind != observe.Dates {
		return
	}
	if c.Date == observe.DateEitherFirst {
		e.find(Look, "dates", fmt.Sprintf("%s has dates with slashes, and whether day or month comes first cannot be told; they are kept as text", c.Name), c.Name)
		return
	}
	e.find(Clear, "dates", fmt.Sprintf("%s has dates written %s, which are kept as text", c.Name, c.Date), c.Name)
}

// regionRows is how many rows a region has at least, typically, for a map of its own (common practice, no source).
const regionRows = 20

// regions looks for columns that name regions: few values with many rows each, and each in a part of the area.
func (e *examiner) regions() {
	for i := range e.survey.Columns {
		c := &e.survey.Columns[i]
		if c.Levels == nil || c.Distinct < 2 || c.Name == "" || e.role[c.Name] == coordinate || e.role[c.Name] == identifier {
			continue
		}
		if c.Kind != observe.Text && c.Kind != observe.WholeNumbers || c.Zeros > 0 {
			continue
		}
		rows := slices.Clone(c.LevelRows)
		slices.Sort(rows)
		usual := rows[len(rows)/2]
		if usual < regionRows || !e.apart(c) {
			continue
		}
		e.report.Regions = append(e.report.Regions, c.Name)
		e.role[c.Name] = coded
		e.find(Clear, "regions", fmt.Sprintf("%s could name regions for a batch (split_by): %d values, each in a part of the area, with about %d rows each",
			c.Name, c.Distinct, usual), c.Name)
	}
	slices.SortStableFunc(e.report.Regions, func(a, b string) int { return cmp.Compare(regionRank(a), regionRank(b)) })
}

// regionRank puts names that are used of regions before others.
func regionRank(name string) int {
	if isNamed(name, regionNames) {
		return 0
	}
	return 1
}

// apart reports whether the rows of each value lie close together, along one axis at least: less than half of the squared
// distances from the middle remain within values.
func (e *examiner) apart(c *observe.SurveyColumn) bool {
	x, y := e.rowPlaces()
	for _, at := range [][]float64{x, y} {
		if at == nil {
			return false
		}
		n, mean := make([]float64, c.Distinct), make([]float64, c.Distinct)
		count, middle, within, total := 0.0, 0.0, 0.0, 0.0
		for i, code := range c.Code {
			if v := at[i]; code >= 0 && !math.IsNaN(v) {
				n[code]++
				mean[code] += (v - mean[code]) / n[code]
				count++
				middle += (v - middle) / count
			}
		}
		for i, code := range c.Code {
			if v := at[i]; code >= 0 && !math.IsNaN(v) {
				within += (v - mean[code]) * (v - mean[code])
				total += (v - middle) * (v - middle)
			}
		}
		if within < total/2 {
			return true
		}
	}
	return false
}

// rowPlaces are the coordinates of the rows that are compared, nil where they cannot be told. A survey does not keep which
// row has which geometry: where each has a place of its own they stand in the order of the rows, and else columns that are
// named as coordinates have to do.
func (e *examiner) rowPlaces() (x, y []float64) {
	s := e.survey
	switch {
	case e.report.Coordinates == nil:
		return nil, nil
	case s.XName != "":
		return s.Column(s.XName).Number, s.Column(s.YName).Number
	case len(s.Places.X) == s.Rows && s.Sampled == s.Rows:
		return s.Places.X, s.Places.Y
	}
	for _, pair := range pairsOfNames(names(s)) {
		return s.Column(pair[0]).Number, s.Column(pair[1]).Number
	}
	return nil, nil
}
