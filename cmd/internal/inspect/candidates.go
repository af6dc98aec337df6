package inspect

import (
	"cmp"
	"fmt"
	"math"
	"slices"

	"drumlin/io/observe"
)

// candidates lists the columns that could be the response, and what each could be out of.
func (e *examiner) candidates() {
	var list []Candidate
	for i := range e.survey.Columns {
		c := &e.survey.Columns[i]
		if !e.couldBeResponse(c) {
			continue
		}
		list = append(list, e.candidate(c))
	}
	slices.SortStableFunc(list, func(a, b Candidate) int { return cmp.Compare(b.score, a.score) })
	e.report.Candidates = append(e.report.Candidates, list...)
	switch {
	case len(list) == 0 && len(e.commas) > 0:
		e.undecided(fmt.Sprintf("what %s holds, until it is read with --decimal-comma: inspect it with that too", listed(e.commas)))
	case len(list) == 0:
		e.undecided("which column is the response: none has numbers that are no coordinates, codes or identifiers")
	case len(list) > 1 && list[0].score == list[1].score:
		e.undecided(fmt.Sprintf("which column is asked about: nothing sets %s apart from %s", list[0].Response, list[1].Response))
	}
	e.zeroOne()
}

func (e *examiner) couldBeResponse(c *observe.SurveyColumn) bool {
	if c.Name == "" || e.role[c.Name] != "" && !(e.role[c.Name] == coded && isNamed(c.Name, responseNames) && c.Distinct > 2) || !numeric(c) {
		return false
	}
	// A denominator is a response only where it has a name of one as well.
	return denominatorWord(c.Name) == "" || isNamed(c.Name, responseNames)
}

// candidate says what a column could be: a number positive or a count with its denominator, a count alone, or else a
// measurement.
func (e *examiner) candidate(c *observe.SurveyColumn) Candidate {
	best, size := e.alone(c), 0.0
	if whole(c) {
		for i := range e.survey.Columns {
			d := &e.survey.Columns[i]
			with, fits := e.outOf(c, d)
			if fits && (with.score > best.score || with.score == best.score && d.Mean > size) {
				best, size = with, d.Mean
			}
		}
	}
	if c.NotNumbers.Values > 0 {
		best.Reasons = append(best.Reasons, countOf(c.NotNumbers.Values, "value is no number", "values are no numbers"))
		best.score--
	}
	return best
}

// alone takes a column for a count or a measurement by its own values.
func (e *examiner) alone(c *observe.SurveyColumn) Candidate {
	out := Candidate{Response: c.Name, Kind: "measurement", score: 1}
	counted := isNamed(c.Name, responseNames)
	switch {
	case whole(c) && (counted || c.Zeros > 0 && c.Median < 30):
		out.Kind, out.score = "count", 2
		out.Reasons = append(out.Reasons, fmt.Sprintf("whole numbers from %s to %s", short(c.Least), short(c.Most)))
		if c.Zeros > 0 {
			out.Reasons = append(out.Reasons, fmt.Sprintf("%.0f%% are 0", 100*float64(c.Zeros)/float64(c.Numbers)))
		}
		out.Reasons = append(out.Reasons, "no column is likely what they are out of")
	case c.Whole == c.Numbers:
		out.Reasons = append(out.Reasons, fmt.Sprintf("whole numbers from %s to %s, which may be rounded", short(c.Least), short(c.Most)))
	default:
		out.Reasons = append(out.Reasons, fmt.Sprintf("numbers from %s to %s", short(c.Least), short(c.Most)))
	}
	if counted {
		out.score++
		out.Reasons = append(out.Reasons, "its own name")
	}
	if isNamed(c.Name, covariateNames) && !counted && out.Kind != "count" {
		out.score -= 0.75
		out.Reasons = append(out.Reasons, "by its name rather something that explains")
	}
	return out
}

// mostlyRare is the share below which a count among a whole number is taken for cases among people, and not for positives
// among examined.
const mostlyRare = 0.02

// outOf takes a whole column for the number out of another, if that can be.
func (e *examiner) outOf(c, d *observe.SurveyColumn) (Candidate, bool) {
	out := Candidate{Response: c.Name, Kind: "count", Column: d.Name, Word: denominatorWord(d.Name)}
	unfit := d.Name == "" || d.Name == c.Name || !numeric(d) || e.role[d.Name] == coordinate || e.role[d.Name] == identifier
	if unfit || 10*(d.Zeros+d.Negatives) > d.Numbers {
		return out, false
	}
	above, share := bounded(c, d)
	never := above >= 0 && 20*above <= c.Numbers && whole(d)
	explains := isNamed(c.Name, covariateNames) && !isNamed(c.Name, responseNames)
	alike := digits(c.Name) != "" && digits(c.Name) == digits(d.Name)
	switch {
	case explains:
		return out, false
	case out.Word == "trials" && never, out.Word != "" && out.Word != "trials":
		out.score = 4
		out.Reasons = append(out.Reasons, "the name of "+d.Name)
	case out.Word == "" && never && d.Least > 0 && e.role[d.Name] == "" && (alike || isNamed(c.Name, responseNames)):
		out.score = 2
		out.unsure = true
		out.Word = "trials"
		if share < mostlyRare {
			out.Word = "people"
		}
	default:
		return out, false
	}
	if out.Word == "trials" {
		out.Kind = "positives"
	}
	for _, reason := range []struct {
		holds bool
		score float64
		words string
	}{
		{isNamed(c.Name, responseNames), 3, "its own name"},
		{alike, 1.5, "the names have " + digits(d.Name) + " in common"},
		{never && above == 0, 1, "never above " + d.Name},
		{never && above > 0, 0.5, fmt.Sprintf("above %s in %s only", d.Name, countOf(above, "row", "rows"))},
		{c.Zeros > 0, 0.5, fmt.Sprintf("%.2g%% are 0", 100*float64(c.Zeros)/float64(c.Numbers))},
	} {
		if reason.holds {
			out.score += reason.score
			out.Reasons = append(out.Reasons, reason.words)
		}
	}
	return out, true
}

// bounded counts the rows in which c is above d, and returns how large it is in all as a share of d. Where it is below d
// nowhere, above is -1.
func bounded(c, d *observe.SurveyColumn) (above int, share float64) {
	sumC, sumD, below := 0.0, 0.0, false
	for i, v := range c.Number {
		w := d.Number[i]
		if math.IsNaN(v) || math.IsNaN(w) {
			continue
		}
		if v > w {
			above++
		}
		below = below || v < w
		sumC, sumD = sumC+v, sumD+w
	}
	if !below {
		return -1, 0
	}
	return above, sumC / sumD
}

// unusable says which rows the likeliest candidate would lose.
func (e *examiner) unusable() {
	if len(e.report.Candidates) == 0 {
		return
	}
	best := e.report.Candidates[0]
	c := e.survey.Column(best.Response)
	if best.Kind != "measurement" && c.Negatives > 0 {
		e.find(Look, "negative-count", fmt.Sprintf("%s negative, and no count is; map would set such rows aside", valuesOf(c.Negatives, c.Name)), c.Name)
	}
	if fractions := c.Numbers - c.Whole; best.Kind != "measurement" && fractions > 0 {
		e.find(Look, "fractional-count", fmt.Sprintf("%s not whole, and counts are; map would set such rows aside", valuesOf(fractions, c.Name)), c.Name)
	}
	if best.Column == "" {
		return
	}
	d := e.survey.Column(best.Column)
	if none := d.Zeros + d.Negatives; none > 0 {
		e.find(Look, "no-denominator", fmt.Sprintf("%s not above 0, and nothing can be out of that; map would set such rows aside", valuesOf(none, d.Name)), d.Name)
	}
	if above, _ := bounded(c, d); best.Word == "trials" && above > 0 {
		e.find(Look, "above-trials", fmt.Sprintf("%s is above %s in %s; map would set such rows aside", c.Name, d.Name, countOf(above, "row", "rows")), c.Name, d.Name)
	}
}

func valuesOf(n int, column string) string {
	return countOf(n, "value of "+column+" is", "values of "+column+" are")
}

// zeroOne says what to do with columns of 0 and 1.
func (e *examiner) zeroOne() {
	var list []string
	for i := range e.survey.Columns {
		if c := &e.survey.Columns[i]; e.role[c.Name] == coded && c.Distinct == 2 && c.Least == 0 && c.Most == 1 {
			list = append(list, c.Name)
		}
	}
	if len(list) > 0 {
		e.find(Clear, "zero-or-one", "only 0 and 1 in "+listed(list)+"; a map of the chance of a 1 needs a column of ones, named with --trials", list...)
	}
}

// mostCompared bounds the columns that are tried as parts of a rate: the work grows with its square.
const mostCompared = 30

// rates looks for columns that are one column divided by another.
func (e *examiner) rates() {
	var parts []*observe.SurveyColumn
	for i := range e.survey.Columns {
		c := &e.survey.Columns[i]
		if numeric(c) && c.Negatives == 0 && e.role[c.Name] != coordinate && e.role[c.Name] != identifier && e.role[c.Name] != constant && len(parts) < mostCompared {
			parts = append(parts, c)
		}
	}
	for _, r := range parts {
		if r.Whole == r.Numbers {
			continue
		}
		e.rate(r, parts)
	}
}

// rate looks for the two columns that a rate was made of.
func (e *examiner) rate(r *observe.SurveyColumn, parts []*observe.SurveyColumn) {
	for _, c := range parts {
		if !whole(c) || c.Name == r.Name {
			continue
		}
		for _, d := range parts {
			if d.Name == r.Name || d.Name == c.Name || d.Zeros > 0 {
				continue
			}
			if per, is := quotient(r, c, d); is {
				e.find(Look, "rate", fmt.Sprintf("%s is likely %s per %s of %s; a map of %s with its denominator knows how sure each rate is, and a map of %s does not",
					r.Name, c.Name, short(per), d.Name, c.Name, r.Name), r.Name, c.Name, d.Name)
				e.demote(r.Name)
				return
			}
		}
	}
}

// demote puts a rate behind the other candidates.
func (e *examiner) demote(name string) {
	list := e.report.Candidates
	i := slices.IndexFunc(list, func(c Candidate) bool { return c.Response == name })
	if i < 0 {
		return
	}
	rate := list[i]
	rate.Reasons = append(rate.Reasons, "likely a rate made of other columns")
	e.report.Candidates = append(slices.Delete(list, i, i+1), rate)
}
