package plan

import (
	"slices"
	"strings"
)

// Validate refuses settings that cannot be meant, as far as no data is needed to tell. Words that were not said, but
// filled in by Defaults or chosen by the program, are not held against what was. The error is an *Error with a hint.
func (s Settings) Validate() error {
	for _, rule := range []func(Settings) error{
		needsObservations,
		columnsApart,
		oneDenominator,
		areaHasUnit,
		distributionSuits,
		linkSuits,
		weightSuits,
		surfaceSuits,
		covariatesOnce,
		placesSuit,
		holdsSuit,
		perSuits,
		thresholdSuits,
		referenceSuits,
	} {
		if err := rule(s); err != nil {
			return err
		}
	}
	return nil
}

func needsObservations(s Settings) error {
	switch {
	case s.Observations == nil:
		return refuse("observations", "name the table of observations", "no file is named")
	case s.Response == nil:
		return refuse("response", "add --response COLUMN", "the column with the response is not named")
	case s.X != nil && s.Y == nil:
		return refuse("x", "add --y COLUMN", "x is named without y")
	case s.Y != nil && s.X == nil:
		return refuse("y", "add --x COLUMN", "y is named without x")
	}
	return nil
}

// columnsApart refuses one column in two roles of which only one can be true.
func columnsApart(s Settings) error {
	taken := map[string]string{}
	for _, name := range []string{"response", "x", "y", "people", "area", "effort", "expected", "trials", "weight"} {
		w, _ := Lookup(name)
		if !w.filled(s) {
			continue
		}
		column := w.value(s).(string)
		if other, ok := taken[column]; ok {
			return refuse(name, "", "column %q is already the %s", column, other)
		}
		taken[column] = name
	}
	return nil
}

func oneDenominator(s Settings) error {
	named := s.denominators()
	if len(named) > 1 {
		return refuse(named[1].kind, "keep the one the counts are to be divided by",
			"%s is named as well; a count has one denominator", named[0].kind)
	}
	if len(named) == 1 && s.Trials != nil {
		return refuse("trials", "for positives among examined keep --trials; for a count keep --"+named[0].kind,
			"%s is named as well; positives have trials, counts have a denominator", named[0].kind)
	}
	return nil
}

func areaHasUnit(s Settings) error {
	switch {
	case s.Area == nil && s.Said("area-unit"):
		return refuse("area-unit", "name the column with the area with --area", "no area is named")
	case s.Area != nil && s.AreaUnit == nil && unitInName(*s.Area) == "":
		return refuse("area", "add --area-unit m2, ha or km2", "the unit of column %q is not given", *s.Area)
	}
	return nil
}

func distributionSuits(s Settings) error {
	kind, _ := s.Denominator()
	d, _ := s.distribution()
	switch {
	case kind != "" && d == Gaussian:
		return refuse("distribution", "divide the measurement yourself, or leave out --distribution for a count",
			"%s is for counts, and gaussian is for measurements, which have no denominator", kind)
	case kind != "" && d == Binomial:
		return refuse("distribution", "name the number examined with --trials",
			"%s is for counts, and binomial is for positives among trials", kind)
	case s.Trials != nil && d != Binomial:
		return refuse("distribution", "leave out --distribution, or --trials",
			"positives among trials are binomial, not %s", d)
	case s.Trials == nil && d == Binomial:
		return refuse("distribution", "name the number examined with --trials; for a response of 0 and 1 add a column of ones",
			"binomial needs the number examined behind each number positive")
	}
	return nil
}

func linkSuits(s Settings) error {
	d, _ := s.distribution()
	if s.Link == nil || slices.Contains(links[d], *s.Link) {
		return nil
	}
	hint := "leave out --link"
	if s.Distribution == nil && *s.Link == Logit {
		hint = "for positives among examined name the number examined with --trials"
	}
	return refuse("link", hint, "%s does not go with %s, which takes %s", *s.Link, d, strings.Join(links[d], " or "))
}

func weightSuits(s Settings) error {
	if d, _ := s.distribution(); s.Weight != nil && d != Gaussian {
		return refuse("weight", "leave out --weight",
			"counts and positives carry their own weight; only measurements (gaussian) can be given one")
	}
	return nil
}

func surfaceSuits(s Settings) error {
	if s.Surface == nil || *s.Surface != NoSurface {
		return nil
	}
	for _, name := range []string{"smoothness", "max-knots"} {
		if s.Said(name) {
			return refuse(name, "leave out --"+name+", or --surface none", "there is no surface for it to act on")
		}
	}
	return nil
}

func covariatesOnce(s Settings) error {
	taken := map[string]string{}
	for _, c := range s.covariates() {
		other, again := taken[c.column]
		switch {
		case s.Response != nil && c.column == *s.Response:
			return refuse(c.role, "", "column %q is the response and cannot explain itself", c.column)
		case again && other == c.role:
			return refuse(c.role, "", "column %q is named twice", c.column)
		case again:
			return refuse(c.role, "keep one of the two", "column %q is already %s", c.column, other)
		}
		taken[c.column] = c.role
	}
	return nil
}

type covariate struct{ role, column string }

func (s Settings) covariates() []covariate {
	var list []covariate
	for _, c := range s.Linear {
		list = append(list, covariate{"linear", c})
	}
	for _, c := range s.Category {
		list = append(list, covariate{"category", c})
	}
	return list
}

func placesSuit(s Settings) error {
	if s.CellSize != nil && s.Said("cells-across") {
		return refuse("cells-across", "keep one of the two", "cell-size is given as well and decides how many cells there are")
	}
	if s.ZoneName != nil && s.Zones == nil {
		return refuse("zone-name", "name the file of zones with --zones", "no zones are named")
	}
	if s.At == nil {
		return nil
	}
	for _, name := range []string{"cell-size", "cells-across", "within", "zones"} {
		if s.Said(name) {
			return refuse(name, "make two runs, one with --at and one without",
				"it shapes or sums the cells of a lattice, and with at there are only the places of its file")
		}
	}
	return nil
}

// holdsSuit demands of a map on a lattice a value for every covariate: only a file of places can bring its own.
func holdsSuit(s Settings) error {
	roles := map[string]string{}
	var names []string
	for _, c := range s.covariates() {
		roles[c.column] = c.role
		names = append(names, c.column)
	}
	held := map[string]bool{}
	for _, h := range s.Hold {
		if err := holdSuits(h, roles, names); err != nil {
			return err
		}
		if held[h.Name] {
			return refuse("hold", "", "%s is held twice", h.Name)
		}
		held[h.Name] = true
	}
	if s.At != nil {
		return nil
	}
	var missing, add []string
	for _, c := range s.covariates() {
		if !held[c.column] {
			missing = append(missing, c.column)
			add = append(add, "--hold "+c.column+"="+usualHold(c.role))
		}
	}
	if len(missing) > 0 {
		return refuse("hold", "add "+strings.Join(add, " ")+", or name a table of places that has them with --at",
			"the map has no values of %s", strings.Join(missing, ", "))
	}
	return nil
}

func usualHold(role string) string {
	if role == "category" {
		return AtCommonest
	}
	return AtMean
}

func holdSuits(h Hold, roles map[string]string, names []string) error {
	switch roles[h.Name] {
	case "":
		hint := "name it with --linear or --category, or leave out --hold"
		if near, ok := Nearest(h.Name, names); ok {
			hint = "did you mean " + near + "?"
		}
		return refuse("hold", hint, "%s is not a covariate of the model", h.Name)
	case "linear":
		if _, err := parseNumber(h.Value); err != nil && h.Value != AtMean {
			return refuse("hold", "for example --hold "+h.Name+"=mean", "%s is linear and is held at a number or at mean, not at %q",
				h.Name, h.Value)
		}
	case "category":
		if h.Value == AtMean {
			return refuse("hold", "for example --hold "+h.Name+"=commonest",
				"%s is a category and has no mean; it is held at a level or at commonest", h.Name)
		}
	}
	return nil
}

func perSuits(s Settings) error {
	kind, _ := s.Denominator()
	switch {
	case s.Per == nil || !s.Said("per"):
		return nil
	case kind == "expected" && *s.Per != 1:
		return refuse("per", "leave out --per", "counts against expected ones give a relative risk, which is per 1")
	case kind == "" && s.Trials == nil:
		return refuse("per", "name what the counts are out of with --people, --area, --effort or --trials, or leave out --per",
			"it scales rates, and nothing is named that the response is divided by")
	}
	return nil
}

// thresholdSuits refuses a threshold that the mean is sure to exceed, or sure not to.
func thresholdSuits(s Settings) error {
	if s.Threshold == nil {
		return nil
	}
	per := 1.0
	if s.Per != nil {
		per = *s.Per
	}
	d, _ := s.distribution()
	switch {
	case s.link() != Identity && *s.Threshold <= 0:
		return refuse("threshold", "give a level above 0, in the unit of the map",
			"the mean is above 0 everywhere, so it exceeds %s with certainty", spoken(*s.Threshold))
	case d == Binomial && *s.Threshold >= per:
		return refuse("threshold", "the threshold is in the unit of the map, which --per decides",
			"a share per %s stays below %s, so it never exceeds %s", spoken(per), spoken(per), spoken(*s.Threshold))
	}
	return nil
}

func referenceSuits(s Settings) error {
	if kind, _ := s.Denominator(); s.Reference != nil && kind == "" {
		return refuse("reference", "name the denominator with --people, --area, --effort or --expected",
			"relative risks compare rates of counts, and no denominator is named")
	}
	return nil
}
