package inspect

import (
	"fmt"
	"strings"

	"drumlin/io/observe"
)

// key is the column that likely names lines, areas and groups of points: one text or whole number a row, each once. Points
// need no name.
// Empty where there is none.
func (e *examiner) key() (name string) {
	if !e.spanning() {
		return ""
	}
	best := 0
	for i := range e.survey.Columns {
		c := &e.survey.Columns[i]
		if rank := e.keyRank(c); rank > best {
			best, name = rank, c.Name
		}
	}
	return name
}

// keyRank says how well a column would name places; 0 for not at all. What has = in its name cannot be said with --key.
func (e *examiner) keyRank(c *observe.SurveyColumn) int {
	var used Candidate
	if len(e.report.Candidates) > 0 {
		used = e.report.Candidates[0]
	}
	switch {
	case c.Name == "" || strings.Contains(c.Name, "=") || !c.Unique || c.Name == used.Response || c.Name == used.Column || e.role[c.Name] == coordinate:
		return 0
	case c.Kind == observe.Text && isNamed(c.Name, placeNames):
		return 4
	case c.Kind == observe.Text && isNamed(c.Name, identifierNames):
		return 3
	case c.Kind == observe.WholeNumbers && e.role[c.Name] == identifier && (isNamed(c.Name, placeNames) || isNamed(c.Name, identifierNames)):
		return 2
	case c.Kind == observe.Text:
		return 1
	}
	return 0
}

// placesOnly says what geometries without anything to map may be for.
func (e *examiner) placesOnly() {
	if key := e.key(); key != "" && len(e.report.Candidates) == 0 {
		e.find(Clear, "places-only", fmt.Sprintf("nothing in it can be mapped, so these may be the places of another table: map takes them with --places and --key COLUMN=%s, "+
			"COLUMN being what that table calls them", key), key)
	}
}
