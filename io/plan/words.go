package plan

import "slices"

// The headings of the help, in order of first use below.
const (
	groupData      = "Observations"
	groupKind      = "What kind of response it is"
	groupModel     = "The surface and the covariates"
	groupWhere     = "Where to predict"
	groupReporting = "What to report"
	groupRun       = "How to run"
)

// Words returns the list of words in the order in which they are shown and recorded.
func Words() []Word { return slices.Clone(words) }

var words = []Word{
	one(Word{Name: "observations", Group: groupData, Arg: "FILE", File: true,
		Help: "the table of observations, a row an observation"},
		func(s *Settings) **string { return &s.Observations }, parseText),
	one(Word{Name: "response", Group: groupData, Arg: "COLUMN",
		Help: "the column with the measured value, the count, or the number positive"},
		func(s *Settings) **string { return &s.Response }, parseText),
	one(Word{Name: "x", Group: groupData, Arg: "COLUMN",
		Help: "the column with the easting or longitude; found by its name where it is not given"},
		func(s *Settings) **string { return &s.X }, parseText),
	one(Word{Name: "y", Group: groupData, Arg: "COLUMN",
		Help: "the column with the northing or latitude"},
		func(s *Settings) **string { return &s.Y }, parseText),
	one(Word{Name: "crs", Group: groupData, Arg: "CODE",
		Help: "what the coordinates are in: an EPSG code such as EPSG:32633 or EPSG:4326, or local for plain metres. " +
			"Without it, columns named as longitude and latitude are taken for that, and others for local metres"},
		func(s *Settings) **string { return &s.CRS }, parseText),
	one(Word{Name: "strict", Group: groupData,
		Help: "refuse the input if any row is unusable, instead of setting the row aside"},
		func(s *Settings) **bool { return &s.Strict }, parseTruth),

	one(Word{Name: "people", Group: groupKind, Arg: "COLUMN",
		Help: "the response is a count among this many people"},
		func(s *Settings) **string { return &s.People }, parseText),
	one(Word{Name: "area", Group: groupKind, Arg: "COLUMN",
		Help: "the response is a count on this much ground"},
		func(s *Settings) **string { return &s.Area }, parseText),
	one(Word{Name: "area-unit", Group: groupKind, Arg: "UNIT",
		Help: "the unit of the area column: m2, ha or km2. Taken from the end of the column's name if that is one of them"},
		func(s *Settings) **string { return &s.AreaUnit }, parseChoice(SquareMetres, Hectares, SquareKilometres)),
	one(Word{Name: "effort", Group: groupKind, Arg: "COLUMN",
		Help: "the response is a count for this much effort: hours, trap nights, length walked"},
		func(s *Settings) **string { return &s.Effort }, parseText),
	one(Word{Name: "expected", Group: groupKind, Arg: "COLUMN",
		Help: "the response is a count where this many were expected; the map is of the relative risk"},
		func(s *Settings) **string { return &s.Expected }, parseText),
	one(Word{Name: "trials", Group: groupKind, Arg: "COLUMN",
		Help: "the response is the number positive among this many examined"},
		func(s *Settings) **string { return &s.Trials }, parseText),
	one(Word{Name: "weight", Group: groupKind, Arg: "COLUMN",
		Help: "measurements only: how much a row counts, as the inverse of its variance"},
		func(s *Settings) **string { return &s.Weight }, parseText),
	one(Word{Name: "distribution", Group: groupKind, Arg: "NAME",
		Help: "gaussian for measurements, poisson for counts, binomial for positives among trials. Without it: binomial " +
			"with --trials, poisson with people, area, effort or expected, else gaussian"},
		func(s *Settings) **string { return &s.Distribution }, parseChoice(Gaussian, Poisson, Binomial)),
	one(Word{Name: "link", Group: groupKind, Arg: "NAME",
		Help: "the scale on which effects add up: identity or log for gaussian, log for poisson, logit for binomial; the " +
			"first of these if not given"},
		func(s *Settings) **string { return &s.Link }, parseChoice(Identity, Log, Logit)),

	one(Word{Name: "surface", Group: groupModel, Arg: "NAME",
		Help: "the smooth function of place: thin-plate, or none to fit the covariates alone"},
		func(s *Settings) **string { return &s.Surface }, parseChoice(ThinPlate, NoSurface)),
	one(Word{Name: "max-knots", Group: groupModel, Arg: "N",
		Help: "how many basis functions the surface may have; the data decide how much of them is used"},
		func(s *Settings) **int { return &s.MaxKnots }, parseWhole(3)),
	one(Word{Name: "smoothness", Group: groupModel, Arg: "HOW",
		Help: "how the penalty is chosen: reml, gcv, or a number of 0 or more to fix it"},
		func(s *Settings) **Smoothness { return &s.Smoothness }, parseSmoothness),
	several(Word{Name: "linear", Group: groupModel, Arg: "COLUMN",
		Help: "a numeric covariate with a straight-line effect"},
		func(s *Settings) *[]string { return &s.Linear }, parseText),
	several(Word{Name: "category", Group: groupModel, Arg: "COLUMN",
		Help: "a covariate with an effect for each of its levels"},
		func(s *Settings) *[]string { return &s.Category }, parseText),

	one(Word{Name: "cell-size", Group: groupWhere, Arg: "METRES",
		Help: "the side of a cell of the map"},
		func(s *Settings) **float64 { return &s.CellSize }, parsePositive),
	one(Word{Name: "cells-across", Group: groupWhere, Arg: "N",
		Help: "instead of a cell size: how many cells along the longer side of the study area"},
		func(s *Settings) **int { return &s.CellsAcross }, parseWhole(1)),
	one(Word{Name: "within", Group: groupWhere, Arg: "FILE", File: true,
		Help: "GeoJSON polygons that bound the study area; without it, the surroundings of the observations"},
		func(s *Settings) **string { return &s.Within }, parseText),
	one(Word{Name: "at", Group: groupWhere, Arg: "FILE", File: true,
		Help: "predict at the places in this table, in its order, instead of on a regular lattice"},
		func(s *Settings) **string { return &s.At }, parseText),
	several(Word{Name: "hold", Group: groupWhere, Arg: "NAME=VALUE",
		Help: "keep a covariate at one value all over the map: a number or a level, mean, or commonest. The map is then " +
			"adjusted to it and gives no totals"},
		func(s *Settings) *[]Hold { return &s.Hold }, parseHold),
	one(Word{Name: "zones", Group: groupWhere, Arg: "FILE", File: true,
		Help: "GeoJSON polygons to total or average over"},
		func(s *Settings) **string { return &s.Zones }, parseText),
	one(Word{Name: "zone-name", Group: groupWhere, Arg: "PROPERTY",
		Help: "the property that names a zone"},
		func(s *Settings) **string { return &s.ZoneName }, parseText),

	one(Word{Name: "threshold", Group: groupReporting, Arg: "NUMBER",
		Help: "report the chance that the mean exceeds this, in the unit of the map"},
		func(s *Settings) **float64 { return &s.Threshold }, parseNumber),
	one(Word{Name: "per", Group: groupReporting, Arg: "NUMBER",
		Help: "report rates per this many, for example per 100000 people"},
		func(s *Settings) **float64 { return &s.Per }, parsePositive),
	one(Word{Name: "reference", Group: groupReporting, Arg: "LEVEL",
		Help: "report relative risks against this rate, in the unit of the map, or against the overall one"},
		func(s *Settings) **Reference { return &s.Reference }, parseReference),
	one(Word{Name: "confidence", Group: groupReporting, Arg: "NUMBER",
		Help: "how sure the limits are, between 0 and 1"},
		func(s *Settings) **float64 { return &s.Confidence }, parseConfidence),
	one(Word{Name: "unit-label", Group: groupReporting, Arg: "TEXT",
		Help: "the unit as it is to stand on the maps"},
		func(s *Settings) **string { return &s.UnitLabel }, parseText),
	one(Word{Name: "title", Group: groupReporting, Arg: "TEXT",
		Help: "the title of the maps"},
		func(s *Settings) **string { return &s.Title }, parseText),
	choices(Word{Name: "write", Group: groupReporting, Arg: "LIST",
		Help: "what to write beside summary.json, separated by commas: csv, geojson, pictures, saved"},
		func(s *Settings) *[]string { return &s.Write }, []string{CSV, GeoJSON, Pictures, Saved}),

	one(Word{Name: "seed", Group: groupRun, Arg: "N",
		Help: "where the random draws start; the same seed gives the same numbers"},
		func(s *Settings) **uint64 { return &s.Seed }, parseSeed),
	one(Word{Name: "workers", Group: groupRun, Arg: "N", RunOnly: true,
		Help: "how many threads compute, one for each CPU if not given; the results do not depend on it"},
		func(s *Settings) **int { return &s.Workers }, parseWhole(1)),
	one(Word{Name: "force", Group: groupRun, RunOnly: true,
		Help: "replace what is already there"},
		func(s *Settings) **bool { return &s.Force }, parseTruth),
	one(Word{Name: "quiet", Group: groupRun, RunOnly: true,
		Help: "no progress and no summary; errors are still told"},
		func(s *Settings) **bool { return &s.Quiet }, parseTruth),
}
