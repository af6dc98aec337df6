package plan

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"
)

// The choices of the words that have a fixed set of them.
const (
	SquareMetres     = "m2"
	Hectares         = "ha"
	SquareKilometres = "km2"

	Comma     = "comma"
	Semicolon = "semicolon"
	Tab       = "tab"
	Pipe      = "pipe"

	Metres     = "m"
	Kilometres = "km"

	AbsentZero    = "zero"
	AbsentMissing = "missing"

	HalfLimit  = "half"
	AtLimit    = "limit"
	AsideLimit = "aside"

	Gaussian         = "gaussian"
	Poisson          = "poisson"
	NegativeBinomial = "negative-binomial"
	Binomial         = "binomial"
	BetaBinomial     = "beta-binomial"
	Gamma            = "gamma"
	Tweedie          = "tweedie"

	Identity            = "identity"
	Log                 = "log"
	Logit               = "logit"
	ComplementaryLogLog = "complementary-log-log"

	Auto           = "auto" // the data decide
	ScaleVariation = "scale"
	NoVariation    = "none"

	On  = "on"
	Off = "off"

	SharedSmoothness = "shared"
	OwnSmoothness    = "own"

	ThinPlate = "thin-plate"
	NoSurface = "none"

	CSV      = "csv"
	GeoJSON  = "geojson"
	TIF      = "tif"
	Pictures = "pictures"
	Saved    = "saved"

	Lines = "lines"
	Bands = "bands"

	ByREML   = "reml"
	ByGCV    = "gcv"
	ByNumber = "number" // of Smoothness.By only; what is said is the number itself

	Overall = "overall"

	AtMean      = "mean"
	AtCommonest = "commonest"
)

// Key is the column of the observations that names the place of a row, and what the same is called in the files that are
// joined by it.
type Key struct{ Column, Property string }

func (k Key) plain() any {
	if k.Property == k.Column {
		return k.Column
	}
	return k.Column + "=" + k.Property
}

// Amount is one number for all rows, or a column with one for each.
type Amount struct {
	Column string // empty for one number
	Number float64
}

func (a Amount) plain() any {
	if a.Column == "" {
		return a.Number
	}
	return a.Column
}

// Levels are numbers that rise.
type Levels []float64

func (l Levels) plain() any {
	parts := make([]string, len(l))
	for i, v := range l {
		parts[i] = spoken(v)
	}
	return strings.Join(parts, ",")
}

// Smoothness says how the penalty of the surface is chosen.
type Smoothness struct {
	By     string  // ByREML, ByGCV or ByNumber
	Lambda float64 // with ByNumber, at least 0
}

func (s Smoothness) plain() any {
	if s.By == ByNumber {
		return s.Lambda
	}
	return s.By
}

// Knots is how many basis functions a surface may have.
type Knots struct {
	Auto bool // as many as the fit needs
	N    int  // otherwise, at least 4
}

func (k Knots) plain() any {
	if k.Auto {
		return Auto
	}
	return k.N
}

// CurvePer is a curve of its own for each level of a category.
type CurvePer struct{ Curve, Category string }

func (c CurvePer) plain() any { return c.Curve + "=" + c.Category }

// Reference is the level that relative risks are taken against.
type Reference struct {
	Overall bool    // the level of all observations together
	Level   float64 // otherwise: above 0, in the reporting unit
}

func (r Reference) plain() any {
	if r.Overall {
		return Overall
	}
	return r.Level
}

// Layer is a raster that gives a covariate where it is not known otherwise.
type Layer struct {
	Name string // of the covariate
	Path string
}

func (l Layer) plain() any { return l.Name + "=" + l.Path }

// Hold fixes a covariate at one value all over the map.
type Hold struct {
	Name  string // of the covariate
	Value string // a number or a level, AtMean or AtCommonest
}

func (h Hold) plain() any { return h.Name + "=" + h.Value }

// spoken is a value in the form in which it would be said.
func spoken(v any) string {
	switch v := v.(type) {
	case float64:
		return strconv.FormatFloat(v, 'g', -1, 64)
	case []string:
		return strings.Join(v, ",")
	}
	return fmt.Sprint(v)
}

func parseText(value string) (string, error) {
	if strings.TrimSpace(value) == "" {
		return "", advise("nothing is given", "")
	}
	return value, nil
}

func parseNumber(value string) (float64, error) {
	v, err := strconv.ParseFloat(strings.TrimSpace(value), 64)
	switch {
	case err != nil && strings.Count(value, ",") == 1:
		return 0, advise("is not a number", "write a decimal point, not a comma")
	case err != nil:
		return 0, advise("is not a number", "")
	case math.IsNaN(v) || math.IsInf(v, 0):
		return 0, advise("is not a finite number", "")
	}
	return v, nil
}

func parsePositive(value string) (float64, error) {
	v, err := parseNumber(value)
	if err == nil && v <= 0 {
		err = advise("is not above 0", "")
	}
	return v, err
}

func parseConfidence(value string) (float64, error) {
	v, err := parseNumber(value)
	if err != nil || (v > 0 && v < 1) {
		return v, err
	}
	if v > 1 && v < 100 {
		return 0, advise("is not between 0 and 1", "for "+spoken(v)+" per cent write "+spoken(v/100))
	}
	return 0, advise("is not between 0 and 1", "")
}

func parseWhole(least int) func(string) (int, error) {
	return func(value string) (int, error) {
		v, err := strconv.Atoi(strings.TrimSpace(value))
		switch {
		case err != nil:
			return 0, advise("is not a whole number", "")
		case v < least:
			return 0, advise(fmt.Sprintf("is less than %d", least), "")
		}
		return v, nil
	}
}

func parseSeed(value string) (uint64, error) {
	v, err := strconv.ParseUint(strings.TrimSpace(value), 10, 64)
	if err != nil {
		return 0, advise("is not a whole number of 0 or more", "")
	}
	return v, nil
}

func parseTruth(value string) (bool, error) {
	switch strings.ToLower(value) {
	case "", "true", "yes":
		return true, nil
	case "false", "no":
		return false, nil
	}
	return false, advise("is neither true nor false", "")
}

func parseChoice(among ...string) func(string) (string, error) {
	return func(value string) (string, error) {
		if slices.Contains(among, value) {
			return value, nil
		}
		return "", notAmong(value, among)
	}
}

// parseChoices reads a comma-separated list and returns it without repetitions in the order of among.
func parseChoices(value string, among []string) ([]string, error) {
	said := map[string]bool{}
	for part := range strings.SplitSeq(value, ",") {
		part = strings.TrimSpace(part)
		if !slices.Contains(among, part) {
			return nil, blame(part, notAmong(part, among))
		}
		said[part] = true
	}
	var list []string
	for _, a := range among {
		if said[a] {
			list = append(list, a)
		}
	}
	return list, nil
}

func notAmong(value string, among []string) error {
	hint := ""
	if near, ok := Nearest(value, among); ok {
		hint = "did you mean " + near + "?"
	}
	return advise("is not one of "+strings.Join(among, ", "), hint)
}

func parseSmoothness(value string) (Smoothness, error) {
	if value == ByREML || value == ByGCV {
		return Smoothness{By: value}, nil
	}
	v, err := parseNumber(value)
	if err != nil || v < 0 {
		return Smoothness{}, advise("is neither reml nor gcv nor a number of 0 or more", "leave out --smoothness to let the data choose")
	}
	return Smoothness{By: ByNumber, Lambda: v}, nil
}

func parseKnots(value string) (Knots, error) {
	if value == Auto {
		return Knots{Auto: true}, nil
	}
	if _, err := strconv.Atoi(strings.TrimSpace(value)); err != nil {
		return Knots{}, advise("is neither auto nor a whole number", "leave out --max-knots to let the fit decide")
	}
	n, err := parseWhole(4)(value)
	return Knots{N: n}, err
}

func parseKey(value string) (Key, error) {
	column, property, found := strings.Cut(value, "=")
	column, property = strings.TrimSpace(column), strings.TrimSpace(property)
	switch {
	case column == "" || found && property == "":
		return Key{}, advise("is not of the form COLUMN or COLUMN=PROPERTY", "for example district=name")
	case !found:
		property = column
	}
	return Key{column, property}, nil
}

// parseAmount takes a number that suits, or what is none for the name of a column.
func parseAmount(most float64) func(string) (Amount, error) {
	return func(value string) (Amount, error) {
		text := strings.TrimSpace(value)
		if text == "" {
			return Amount{}, advise("nothing is given", "")
		}
		if _, err := strconv.ParseFloat(strings.Replace(text, ",", ".", 1), 64); err != nil {
			return Amount{Column: text}, nil
		}
		v, err := parsePositive(text)
		if err == nil && v > most {
			hint := ""
			if v >= 5 && v <= 100 { // what is little more than the bound is rather a slip than a percentage
				hint = "for " + spoken(v) + " per cent write " + spoken(v/100)
			}
			err = advise("is more than "+spoken(most), hint)
		}
		return Amount{Number: v}, err
	}
}

// mostLevels bounds the levels of isolines: more would be a grey of their own.
const mostLevels = 200

func parseLevels(value string) (Levels, error) {
	var list Levels
	for part := range strings.SplitSeq(value, ",") {
		v, err := parseNumber(part)
		switch {
		case err != nil:
			return nil, blame(part, err)
		case len(list) > 0 && v <= list[len(list)-1]:
			return nil, advise("does not rise from each number to the next", "")
		case len(list) == mostLevels:
			return nil, advise(fmt.Sprintf("has more than %d levels", mostLevels), "")
		}
		list = append(list, v)
	}
	return list, nil
}

func parseCurvePer(value string) (CurvePer, error) {
	curve, category, found := strings.Cut(value, "=")
	if !found || strings.TrimSpace(curve) == "" || strings.TrimSpace(category) == "" {
		return CurvePer{}, advise("is not of the form CURVE=CATEGORY", "for example depth=soil, for a curve of depth on each soil")
	}
	return CurvePer{strings.TrimSpace(curve), strings.TrimSpace(category)}, nil
}

func parseReference(value string) (Reference, error) {
	if value == Overall {
		return Reference{Overall: true}, nil
	}
	v, err := parseNumber(value)
	if err != nil || v <= 0 {
		return Reference{}, advise("is neither overall nor a number above 0", "")
	}
	return Reference{Level: v}, nil
}

func parseLayer(value string) (Layer, error) {
	name, path, found := strings.Cut(value, "=")
	if !found || strings.TrimSpace(name) == "" || strings.TrimSpace(path) == "" {
		return Layer{}, advise("is not of the form NAME=FILE", "for example height=height.tif")
	}
	return Layer{Name: strings.TrimSpace(name), Path: strings.TrimSpace(path)}, nil
}

func parseHold(value string) (Hold, error) {
	name, at, found := strings.Cut(value, "=")
	if !found || strings.TrimSpace(name) == "" || strings.TrimSpace(at) == "" {
		return Hold{}, advise("is not of the form NAME=VALUE", "for example depth=3.5, depth=mean or soil=commonest")
	}
	return Hold{Name: strings.TrimSpace(name), Value: strings.TrimSpace(at)}, nil
}
