package plan

import (
	"math"
	"slices"
)

// The headings of the help, in order of first use below.
const (
	groupData      = "Observations"
	groupKind      = "What kind of response it is"
	groupModel     = "The surface and the covariates"
	groupWhere     = "Where to predict"
	groupReporting = "What to report"
	groupRun       = "How to run"
)

// MostCV is the largest coefficient of variation of a factor of the exposure: beyond it nothing was known.
const MostCV = 2

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
	one(Word{Name: "geometry", Group: groupData, Arg: "COLUMN",
		Help: "the column with the place of a row as text, instead of x and y: WKT or EWKB in hexadecimal. GeoJSON brings its own"},
		func(s *Settings) **string { return &s.Geometry }, parseText),
	one(Word{Name: "crs", Group: groupData, Arg: "CODE",
		Help: "what the coordinates are in: an EPSG code such as EPSG:32633 or EPSG:4326, or local for plain metres. " +
			"Without it, columns named as longitude and latitude are taken for that, and others for local metres"},
		func(s *Settings) **string { return &s.CRS }, parseText),
	one(Word{Name: "separator", Group: groupData, Arg: "NAME",
		Help: "what stands between the columns of the tables: comma, semicolon, tab or pipe; found out where it is not given"},
		func(s *Settings) **string { return &s.Separator }, parseChoice(Comma, Semicolon, Tab, Pipe)),
	one(Word{Name: "decimal-comma", Group: groupData,
		Help: "numbers in the tables are written with a decimal comma"},
		func(s *Settings) **bool { return &s.DecimalComma }, parseTruth),
	several(Word{Name: "missing", Group: groupData, Arg: "MARK",
		Help: "a mark that stands for a missing value, beside an empty field, NA, NaN and null"},
		func(s *Settings) *[]string { return &s.Missing }, parseText),
	one(Word{Name: "below-limit", Group: groupData, Arg: "RULE",
		Help: "what becomes of values below a detection limit, written <0.5: half of the limit or the limit itself stands for " +
			"them, or their rows are set aside. Without it they are no numbers"},
		func(s *Settings) **string { return &s.BelowLimit }, parseChoice(HalfLimit, AtLimit, AsideLimit)),
	one(Word{Name: "places", Group: groupData, Arg: "FILE", File: true,
		Help: "a file with the places of the rows, points, lines or polygons, which are found in it by their key"},
		func(s *Settings) **string { return &s.Places }, parseText),
	several(Word{Name: "join", Group: groupData, Arg: "FILE", File: true,
		Help: "a table with columns that the observations lack, such as denominators or covariates, found in it by their key"},
		func(s *Settings) *[]string { return &s.Join }, parseText),
	one(Word{Name: "key", Group: groupData, Arg: "COLUMN[=PROPERTY]",
		Help: "the column that names the place of a row, and what it is called in the files of --places and --join if that differs. " +
			"Alone it names the places in places.csv"},
		func(s *Settings) **Key { return &s.Key }, parseKey),
	one(Word{Name: "absent", Group: groupData, Arg: "MEANING",
		Help: "what it means that a place has no row: zero if nothing was found there, missing if nobody looked"},
		func(s *Settings) **string { return &s.Absent }, parseChoice(AbsentZero, AbsentMissing)),
	one(Word{Name: "sum-by", Group: groupData, Arg: "COLUMN",
		Help: "make one row of all rows with the same value in this column: what was counted is added up, with the denominators " +
			"and trials that stand beside it"},
		func(s *Settings) **string { return &s.SumBy }, parseText),
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
		Help: "the unit of the area column: m2, ha or km2. Taken from the end of the column's name if that is one of them. With " +
			"--length it is the unit that densities are given in; ha for a length in m, km2 for one in km if not given"},
		func(s *Settings) **string { return &s.AreaUnit }, parseChoice(SquareMetres, Hectares, SquareKilometres)),
	one(Word{Name: "length", Group: groupKind, Arg: "COLUMN",
		Help: "the response is a count on a strip of this length, which --width makes an area"},
		func(s *Settings) **string { return &s.Length }, parseText),
	one(Word{Name: "length-unit", Group: groupKind, Arg: "UNIT",
		Help: "the unit of the length column: m or km. Taken from the end of the column's name if that is one of them"},
		func(s *Settings) **string { return &s.LengthUnit }, parseChoice(Metres, Kilometres)),
	one(Word{Name: "width", Group: groupKind, Arg: "NUMBER|COLUMN",
		Help: "the whole width of the strips in metres, both sides of the line together: one number, or a column"},
		func(s *Settings) **Amount { return &s.Width }, parseAmount(math.MaxFloat64)),
	one(Word{Name: "detection", Group: groupKind, Arg: "NUMBER|COLUMN",
		Help: "the share of what is there that is detected, above 0 and up to 1: one number, or a column. It multiplies the area searched"},
		func(s *Settings) **Amount { return &s.Detection }, parseAmount(1)),
	one(Word{Name: "exposure-cv", Group: groupKind, Arg: "NUMBER|COLUMN",
		Help: "the coefficient of variation of a factor in the denominator that rows share, such as detection: 0.15 for all rows " +
			"together, or a column, whose rows of one value share a factor. It widens every error, and does not average out"},
		func(s *Settings) **Amount { return &s.ExposureCV }, parseAmount(MostCV)),
	one(Word{Name: "exposure-strata", Group: groupKind, Arg: "COLUMN",
		Help: "the strata of --exposure-cv: rows with the same value in this column share a factor"},
		func(s *Settings) **string { return &s.ExposureStrata }, parseText),
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
		Help: "gaussian for measurements, gamma for measurements above 0 whose spread grows with their level, tweedie for " +
			"amounts that can be 0, poisson or negative-binomial for counts, binomial or beta-binomial for positives among " +
			"trials. Without it: binomial with --trials, poisson with people, area, effort or expected, else gaussian; " +
			"--extra-variation says whether the data may ask for more scatter than that"},
		func(s *Settings) **string { return &s.Distribution },
		parseChoice(Gaussian, Gamma, Tweedie, Poisson, NegativeBinomial, Binomial, BetaBinomial)),
	one(Word{Name: "link", Group: groupKind, Arg: "NAME",
		Help: "the scale on which effects add up: identity or log for gaussian, logit or complementary-log-log for binomial, " +
			"logit for beta-binomial, log for all others; the first of these if not given"},
		func(s *Settings) **string { return &s.Link }, parseChoice(Identity, Log, Logit, ComplementaryLogLog)),
	one(Word{Name: "extra-variation", Group: groupKind, Arg: "HOW",
		Help: "what to do about counts and positives that scatter more than poisson and binomial allow: auto to let the data " +
			"choose between those and negative-binomial and beta-binomial, scale to multiply errors by an estimated factor, none. " +
			"A distribution that is named stays, unless auto is named too"},
		func(s *Settings) **string { return &s.ExtraVariation }, parseChoice(Auto, ScaleVariation, NoVariation)),
	one(Word{Name: "shape", Group: groupKind, Arg: "NUMBER",
		Help: "fix the distribution's shape, which the data choose otherwise: theta of negative-binomial, correlation of " +
			"beta-binomial, power of tweedie"},
		func(s *Settings) **float64 { return &s.Shape }, parsePositive),

	one(Word{Name: "surface", Group: groupModel, Arg: "NAME",
		Help: "the smooth function of place: thin-plate, or none to fit the covariates alone"},
		func(s *Settings) **string { return &s.Surface }, parseChoice(ThinPlate, NoSurface)),
	one(Word{Name: "max-knots", Group: groupModel, Arg: "N",
		Help: "how many basis functions the surface may have, the data deciding how much of them is used; auto doubles them " +
			"from 50 while the fit still moves, up to 800, or fewer where there are many rows"},
		func(s *Settings) **Knots { return &s.MaxKnots }, parseKnots),
	one(Word{Name: "smoothness", Group: groupModel, Arg: "HOW",
		Help: "how the penalty is chosen: reml, gcv, or a number of 0 or more to fix it"},
		func(s *Settings) **Smoothness { return &s.Smoothness }, parseSmoothness),
	one(Word{Name: "smoothness-uncertainty", Group: groupModel, Arg: "WHEN",
		Help: "whether errors include that the smoothness is not known: on, off, or auto, which means on below 1000 rows"},
		func(s *Settings) **string { return &s.SmoothnessUncertainty }, parseChoice(Auto, On, Off)),
	one(Word{Name: "surface-per", Group: groupModel, Arg: "COLUMN",
		Help: "a surface of its own for each level of this category"},
		func(s *Settings) **string { return &s.SurfacePer }, parseText),
	one(Word{Name: "surface-smoothness", Group: groupModel, Arg: "HOW",
		Help: "whether surfaces per level have one smoothness, shared, or each its own; shared if not given"},
		func(s *Settings) **string { return &s.SurfaceSmoothness }, parseChoice(SharedSmoothness, OwnSmoothness)),
	one(Word{Name: "shrink", Group: groupModel,
		Help: "let the surface vanish altogether where the data show no variation between places"},
		func(s *Settings) **bool { return &s.Shrink }, parseTruth),
	several(Word{Name: "linear", Group: groupModel, Arg: "COLUMN",
		Help: "a numeric covariate with a straight-line effect"},
		func(s *Settings) *[]string { return &s.Linear }, parseText),
	several(Word{Name: "curve", Group: groupModel, Arg: "COLUMN",
		Help: "a numeric covariate with a smooth effect whose smoothness the data decide"},
		func(s *Settings) *[]string { return &s.Curve }, parseText),
	several(Word{Name: "curve-per", Group: groupModel, Arg: "COLUMN=CATEGORY",
		Help: "a smooth effect of its own for each level of a category"},
		func(s *Settings) *[]CurvePer { return &s.CurvePer }, parseCurvePer),
	several(Word{Name: "category", Group: groupModel, Arg: "COLUMN",
		Help: "a covariate with an effect for each of its levels"},
		func(s *Settings) *[]string { return &s.Category }, parseText),
	several(Word{Name: "group", Group: groupModel, Arg: "COLUMN",
		Help: "groups of rows, such as observers or sites, whose levels scatter at random; the map shows the average group"},
		func(s *Settings) *[]string { return &s.Group }, parseText),

	one(Word{Name: "test-variation", Group: groupModel,
		Help: "test whether there is any variation between places, by fitting 199 draws from the model without a surface; " +
			"groups and curves are tested too"},
		func(s *Settings) **bool { return &s.TestVariation }, parseTruth),
	several(Word{Name: "also", Group: groupModel, Arg: "WORD=VALUE",
		Help: "fit the same rows another way too, and compare: what differs from the map's own model, as in " +
			"surface=none, or \"distribution=gamma; link=log\""},
		func(s *Settings) *[]Alternative { return &s.Also }, parseAlternative),

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
		Help: "what to write beside summary.json, separated by commas: csv, geojson, tif, pictures, saved"},
		func(s *Settings) *[]string { return &s.Write }, []string{CSV, GeoJSON, TIF, Pictures, Saved}),

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
