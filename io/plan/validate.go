package plan

import (
	"slices"
	"strconv"
	"strings"
)

// Validate refuses settings that cannot be meant, as far as no data is needed to tell. Words that were not said, but
// filled in by Defaults or chosen by the program, are not held against what was. The error is an *Error with a hint.
func (s Settings) Validate() error {
	for _, rule := range []func(Settings) error{
		needsObservations,
		columnsApart,
		joinsSuit,
		sumSuits,
		oneDenominator,
		areaHasUnit,
		stripsSuit,
		exposureSuits,
		distributionSuits,
		linkSuits,
		shapeSuits,
		variationSuits,
		uncertaintySuits,
		weightSuits,
		surfaceSuits,
		covariatesOnce,
		placesSuit,
		holdsSuit,
		perSuits,
		thresholdSuits,
		referenceSuits,
		alternativesSuit,
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
	case s.Geometry != nil && s.X != nil:
		return refuse("geometry", "keep one of the two", "x and y are named as well; a row has one place")
	}
	return nil
}

// columnsApart refuses one column in two roles of which only one can be true.
func columnsApart(s Settings) error {
	taken := map[string]string{}
	for _, name := range []string{"response", "x", "y", "geometry", "people", "area", "length", "effort", "expected", "trials", "weight"} {
		w, _ := Lookup(name)
		if !w.filled(&s) {
			continue
		}
		column := w.value(&s).(string)
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
		return refuse(named[1].word, "keep the one the counts are to be divided by",
			"%s is named as well; a count has one denominator", named[0].word)
	}
	if len(named) == 1 && s.Trials != nil {
		return refuse("trials", "for positives among examined keep --trials; for a count keep --"+named[0].word,
			"%s is named as well; positives have trials, counts have a denominator", named[0].word)
	}
	return nil
}

func areaHasUnit(s Settings) error {
	switch {
	case s.Area == nil && s.Length == nil && s.Said("area-unit"):
		return refuse("area-unit", "name the column with the area with --area", "no area is named")
	case s.Area != nil && s.AreaUnit == nil && unitInName(*s.Area) == "":
		return refuse("area", "add --area-unit m2, ha or km2", "the unit of column %q is not given", *s.Area)
	case s.Area != nil && s.AreaUnit != nil && s.Said("area-unit") && unitInName(*s.Area) != "" && unitInName(*s.Area) != *s.AreaUnit:
		return refuse("area-unit", "leave it out, or rename the column", "the name of column %q says %s, not %s", *s.Area, unitInName(*s.Area), *s.AreaUnit)
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
	case kind != "" && d == Gamma:
		return refuse("distribution", "divide the measurement yourself, or use tweedie for amounts",
			"%s is for counts and amounts, and gamma is for measurements, which have no denominator", kind)
	case kind != "" && (d == Binomial || d == BetaBinomial):
		return refuse("distribution", "name the number examined with --trials",
			"%s is for counts, and %s is for positives among trials", kind, d)
	case s.Trials != nil && d != Binomial && d != BetaBinomial:
		return refuse("distribution", "leave out --distribution, or --trials",
			"positives among trials are binomial, not %s", d)
	case s.Trials == nil && (d == Binomial || d == BetaBinomial):
		return refuse("distribution", "name the number examined with --trials; for a response of 0 and 1 add a column of ones",
			"%s needs the number examined behind each number positive", d)
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
	if d, _ := s.distribution(); s.Weight != nil && d != Gaussian && d != Gamma && d != Tweedie {
		return refuse("weight", "leave out --weight",
			"counts and positives carry their own weight; only measurements (gaussian, gamma, tweedie) can be given one")
	}
	return nil
}

// shapes lists the distributions with a shape, and what it may be; spatial/response has the same bounds.
var shapes = map[string]struct {
	name   string
	lo, hi float64
}{
	NegativeBinomial: {"theta", 0.001, 1e7},
	BetaBinomial:     {"correlation", 1e-7, 0.99},
	Tweedie:          {"power", 1.01, 1.99},
}

func shapeSuits(s Settings) error {
	if s.Shape == nil {
		return nil
	}
	d, _ := s.distribution()
	shape, ok := shapes[d]
	switch {
	case !ok:
		return refuse("shape", "name negative-binomial, beta-binomial or tweedie with --distribution, or leave out --shape", "%s has no shape", d)
	case !(*s.Shape >= shape.lo && *s.Shape <= shape.hi):
		return refuse("shape", "leave out --shape to let the data choose", "the %s of %s lies between %s and %s, not at %s",
			shape.name, d, decimal(shape.lo), decimal(shape.hi), spoken(*s.Shape))
	}
	return nil
}

// decimal is a number without a power of ten.
func decimal(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }

func variationSuits(s Settings) error {
	if s.ExtraVariation == nil || !s.Said("extra-variation") || *s.ExtraVariation == NoVariation {
		return nil
	}
	d, _ := s.distribution()
	gcv := s.Smoothness != nil && s.Smoothness.By == ByGCV
	switch {
	case d != Poisson && d != Binomial:
		return refuse("extra-variation", "leave it out", "%s estimates its variation itself; this is for poisson and binomial", d)
	case gcv:
		return refuse("extra-variation", "leave out --smoothness gcv", "cross-validation cannot choose a shape or a scale")
	case *s.ExtraVariation == Auto && s.link() == ComplementaryLogLog:
		return refuse("extra-variation", "use scale, or the logit link", "beta-binomial has no complementary log-log link to choose it with")
	}
	return nil
}

// uncertaintySuits refuses the uncertainty of a smoothness that no restricted likelihood chose.
func uncertaintySuits(s Settings) error {
	if s.SmoothnessUncertainty == nil || *s.SmoothnessUncertainty != On || !s.Said("smoothness-uncertainty") {
		return nil
	}
	by := ByREML
	if s.Smoothness != nil {
		by = s.Smoothness.By
	}
	switch {
	case by == ByGCV:
		return refuse("smoothness-uncertainty", "leave it out, or leave out --smoothness gcv", "it follows from the restricted likelihood, and cross-validation chooses the smoothness")
	case s.ExtraVariation != nil && *s.ExtraVariation == ScaleVariation:
		return refuse("smoothness-uncertainty", "leave it out, or leave out --extra-variation scale", "it is not known where the variation is scaled")
	case by == ByNumber && len(s.Curve)+len(s.CurvePer)+len(s.Group) == 0:
		return refuse("smoothness-uncertainty", "leave it out, or leave out --smoothness", "the smoothness is given as a number, so nothing about it is uncertain")
	}
	return nil
}

func surfaceSuits(s Settings) error {
	if s.SurfaceSmoothness != nil && s.SurfacePer == nil {
		return refuse("surface-smoothness", "name the category that surfaces are for each level of with --surface-per, or leave it out", "there is one surface only")
	}
	if s.Surface == nil || *s.Surface != NoSurface {
		return nil
	}
	for _, name := range []string{"smoothness", "smoothness-uncertainty", "max-knots", "surface-per", "surface-smoothness", "shrink"} {
		if s.Said(name) && !s.actsOnCurves(name) {
			return refuse(name, "leave out --"+name+", or --surface none", "there is no surface for it to act on")
		}
	}
	return nil
}

// actsOnCurves reports whether a word that shapes the surface shapes curves and groups as well. A smoothness given as a
// number is that of the surface alone.
func (s Settings) actsOnCurves(name string) bool {
	switch name {
	case "smoothness":
		return s.hasSmooths() && s.Smoothness.By != ByNumber
	case "smoothness-uncertainty":
		return s.hasSmooths() || *s.SmoothnessUncertainty != On
	}
	return false
}

func covariatesOnce(s Settings) error {
	taken := map[string]string{}
	for _, c := range s.covariates() {
		other, again := taken[c.column]
		switch {
		case s.Response != nil && c.column == *s.Response:
			return refuse(c.word, "", "column %q is the response and cannot explain itself", c.column)
		case again && other == c.word:
			return refuse(c.word, "", "column %q is named twice", c.column)
		case again:
			return refuse(c.word, "keep one of the two", "column %q is already %s", c.column, other)
		}
		taken[c.column] = c.word
	}
	return nil
}

// covariate is a column with its role and the word that named it.
type covariate struct{ word, role, column string }

func (s Settings) covariates() []covariate {
	var list []covariate
	for _, c := range s.Linear {
		list = append(list, covariate{"linear", "linear", c})
	}
	for _, c := range s.Curve {
		list = append(list, covariate{"curve", "curve", c})
	}
	for _, c := range s.CurvePer {
		list = append(list, covariate{"curve-per", "curve", c.Curve})
	}
	for _, c := range s.Category {
		list = append(list, covariate{"category", "category", c})
	}
	for _, c := range s.Group {
		list = append(list, covariate{"group", "group", c})
	}
	for _, c := range s.levels() {
		word := "surface-per"
		if slices.ContainsFunc(s.CurvePer, func(p CurvePer) bool { return p.Category == c }) {
			word = "curve-per"
		}
		list = append(list, covariate{word, "category", c})
	}
	return list
}

// levels lists the categories that curves and surfaces are per and that are not named as categories themselves.
func (s Settings) levels() []string {
	var list []string
	add := func(c string) {
		if !slices.Contains(s.Category, c) && !slices.Contains(list, c) {
			list = append(list, c)
		}
	}
	for _, c := range s.CurvePer {
		add(c.Category)
	}
	if s.SurfacePer != nil {
		add(*s.SurfacePer)
	}
	return list
}

// Numbers lists the columns of numeric covariates, Categories those of categories, groups apart.
func (s Settings) Numbers() []string {
	list := slices.Concat(s.Linear, s.Curve)
	for _, c := range s.CurvePer {
		list = append(list, c.Curve)
	}
	return list
}

// Categories lists the columns of categories, those that curves and surfaces are per among them.
func (s Settings) Categories() []string { return slices.Concat(s.Category, s.levels()) }

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
	if err := s.layersSuit(roles, names, held); err != nil {
		return err
	}
	for _, l := range s.Layer {
		held[l.Name] = true
	}
	if s.At != nil {
		return nil
	}
	var missing, add []string
	for _, c := range s.covariates() {
		if !held[c.column] && c.role != "group" {
			missing = append(missing, c.column)
			add = append(add, "--hold "+c.column+"="+usualHold(c.role))
		}
	}
	if len(missing) > 0 {
		return refuse("hold", "add "+strings.Join(add, " ")+", or name rasters that have them with --layer, or a table of places with --at",
			"the map has no values of %s", strings.Join(missing, ", "))
	}
	return nil
}

// layersSuit refuses a layer of what is no covariate, or is held, or has another one.
func (s Settings) layersSuit(roles map[string]string, names []string, held map[string]bool) error {
	seen := map[string]bool{}
	for _, l := range s.Layer {
		switch role := roles[l.Name]; {
		case role == "":
			hint := "name it with --linear, --curve or --category, or leave out --layer"
			if near, ok := Nearest(l.Name, names); ok {
				hint = "did you mean " + near + "?"
			}
			return refuse("layer", hint, "%s is not a covariate of the model", l.Name)
		case role == "group":
			return refuse("layer", "leave it out", "%s is a group, and the map shows the average one", l.Name)
		case held[l.Name]:
			return refuse("layer", "keep one of the two", "%s is held at one value", l.Name)
		case seen[l.Name]:
			return refuse("layer", "", "%s has two layers", l.Name)
		}
		seen[l.Name] = true
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
		hint := "name it with --linear, --curve or --category, or leave out --hold"
		if near, ok := Nearest(h.Name, names); ok {
			hint = "did you mean " + near + "?"
		}
		return refuse("hold", hint, "%s is not a covariate of the model", h.Name)
	case "group":
		return refuse("hold", "leave it out", "%s is a group, and the map shows the average one", h.Name)
	case "linear", "curve":
		if _, err := parseNumber(h.Value); err != nil && h.Value != AtMean {
			return refuse("hold", "for example --hold "+h.Name+"=mean", "%s is a number and is held at one or at mean, not at %q",
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
	case (d == Binomial || d == BetaBinomial) && *s.Threshold >= per:
		return refuse("threshold", "the threshold is in the unit of the map, which --per decides",
			"a share per %s stays below %s, so it never exceeds %s", spoken(per), spoken(per), spoken(*s.Threshold))
	}
	return nil
}

func alternativesSuit(s Settings) error {
	if len(s.Also) == 0 {
		return nil
	}
	names := map[string]bool{}
	for _, a := range s.Also {
		if names[a.Name] {
			return refuse("also", "", "%q is said twice", a.Name)
		}
		names[a.Name] = true
	}
	_, err := s.Candidates()
	return err
}

func referenceSuits(s Settings) error {
	if kind, _ := s.Denominator(); s.Reference != nil && kind == "" {
		return refuse("reference", "name the denominator with --people, --area, --effort or --expected",
			"relative risks compare rates of counts, and no denominator is named")
	}
	return nil
}
