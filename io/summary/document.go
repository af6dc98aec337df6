// Package summary is the record of one region's run: summary.json, and its telling in words.
//
// Nothing in it depends on the clock, the machine's name, the number of workers or the folder: the same input gives the
// same bytes.
package summary

import (
	"bytes"
	"encoding/json"
	"io"
	"math"
	"strconv"
)

// Number is a number that becomes null in JSON where it is not finite.
type Number float64

// MarshalJSON writes the shortest decimal that reads back as the same number.
func (n Number) MarshalJSON() ([]byte, error) {
	if math.IsNaN(float64(n)) || math.IsInf(float64(n), 0) {
		return []byte("null"), nil
	}
	return json.Marshal(float64(n))
}

// UnmarshalJSON reads a number back. Null becomes NaN, whichever it was that is not finite.
func (n *Number) UnmarshalJSON(text []byte) error {
	if string(text) == "null" {
		*n = Number(math.NaN())
		return nil
	}
	v, err := strconv.ParseFloat(string(text), 64)
	if err != nil {
		return json.Unmarshal(text, (*float64)(n)) // says what is wrong with it; too slow for the millions of a ledger
	}
	*n = Number(v)
	return nil
}

// Document is what summary.json holds.
type Document struct {
	Version      string        `json:"version"`
	Input        Input         `json:"input"`
	Region       *Region       `json:"region,omitempty"` // of a batch
	Settings     Settings      `json:"settings"`
	Lattice      Lattice       `json:"lattice"`
	Fit          Fit           `json:"fit"`
	Coefficients []Coefficient `json:"coefficients"`
	Effects      []Effect      `json:"effects"`
	Estimates    Estimates     `json:"estimates"`
	Tests        []Test        `json:"tests"`            // only where they were asked for
	Candidates   []Candidate   `json:"candidates"`       // only where alternatives were named
	Places       *Places       `json:"places,omitempty"` // where rows are told apart by a key, or are lines or areas
	Zones        *Zones        `json:"zones"`
	Checks       []Check       `json:"checks"`
	Cautions     []string      `json:"cautions"`
	Rehearsal    *struct{}     `json:"rehearsal"`  // null until a rehearsal is asked for
	Validation   *struct{}     `json:"validation"` // null until a validation is asked for
	Outputs      []Output      `json:"outputs"`

	Folder string `json:"-"` // where the outputs went, for the words only
}

// Input is the table of observations.
type Input struct {
	Name           string         `json:"name"`
	SHA256         string         `json:"sha256"`
	Rows           int            `json:"rows"`
	Used           int            `json:"used"`
	Fitted         int            `json:"fitted,omitempty"` // rows of the fit, where adding up or zeros for places without one made them others
	SetAside       map[string]int `json:"set_aside"`        // rows by reason
	DistinctPlaces int            `json:"distinct_places"`
	MedianSpacing  Number         `json:"median_spacing_m"`
	Coordinates    string         `json:"coordinates"`      // which columns, and how they were taken
	Format         string         `json:"format,omitempty"` // how the table is written, where that is not with commas in UTF-8
	BelowLimit     []BelowLimit   `json:"below_limit,omitempty"`
	Raster         *Raster        `json:"raster,omitempty"` // where rows are cells
	Summed         int            `json:"summed,omitempty"` // rows that were added up into another
	Joined         []Joined       `json:"joined,omitempty"`
}

// Raster says which cells of a raster are rows: one in Step in both directions of those that have a value.
type Raster struct {
	Cells int `json:"cells"`
	Step  int `json:"step"`
}

// Joined is a file that rows took their places or columns from.
type Joined struct {
	Name       string `json:"name"`
	SHA256     string `json:"sha256"`
	Key        string `json:"key"`         // its column of keys
	Places     bool   `json:"places"`      // it gave the places
	Rows       int    `json:"rows"`        // of the observations that found theirs
	Unmatched  int    `json:"unmatched"`   // keys of the observations that it does not have
	Unused     int    `json:"unused"`      // of its keys that no observation has
	Added      int    `json:"added"`       // rows of 0 for places without one
	WithoutKey int    `json:"without_key"` // of its rows, which were passed over
}

// Places says what the places are that rows belong to.
type Places struct {
	Count  int    `json:"count"`
	Areas  int    `json:"areas"`
	Lines  int    `json:"lines"`
	Points int    `json:"points"`
	Unseen int    `json:"unseen"`           // places where nobody looked
	Inside string `json:"inside,omitempty"` // how many points stand for an area or a line
}

// BelowLimit counts the values of a column that are below a detection limit.
type BelowLimit struct {
	Column string `json:"column"`
	Rows   int    `json:"rows"`
	Rule   string `json:"rule"` // what became of them: half, limit or aside
}

// Region is what a batch adds: whose rows these are, and the figures by which regions are compared.
type Region struct {
	Name        string `json:"name"`
	Fingerprint string `json:"fingerprint"` // of input, settings and program
	Response    string `json:"response"`
	MarginRows  int    `json:"margin_rows"` // rows of neighbouring regions that helped the fit; no other figure counts them
	Per         Number `json:"per"`         // the mean is for this many
	Total       Number `json:"total"`       // over the map; null where nothing adds up
	TotalCV     Number `json:"total_cv"`
	TotalLower  Number `json:"total_lower"`
	TotalUpper  Number `json:"total_upper"`
	Mean        Number `json:"mean"` // over the map by area, in its unit
	MeanCV      Number `json:"mean_cv"`
	MeanLower   Number `json:"mean_lower"`
	MeanUpper   Number `json:"mean_upper"`
}

// Setting is a setting in force. Chosen says why, where the program chose it.
type Setting struct {
	Key    string
	Value  any
	Chosen string
}

// Settings are the settings in force, in their order.
type Settings []Setting

// MarshalJSON writes an object with the settings in order: {"value": ...} with "chosen" beside it where the program
// chose.
func (s Settings) MarshalJSON() ([]byte, error) {
	var b bytes.Buffer
	b.WriteByte('{')
	for i, e := range s {
		if i > 0 {
			b.WriteByte(',')
		}
		entry := struct {
			Value  any    `json:"value"`
			Chosen string `json:"chosen,omitempty"`
		}{e.Value, e.Chosen}
		key, err := json.Marshal(e.Key)
		if err != nil {
			return nil, err
		}
		value, err := json.Marshal(entry)
		if err != nil {
			return nil, err
		}
		b.Write(key)
		b.WriteByte(':')
		b.Write(value)
	}
	b.WriteByte('}')
	return b.Bytes(), nil
}

// UnmarshalJSON reads what MarshalJSON writes. Numbers come back as float64, lists as []any.
func (s *Settings) UnmarshalJSON(text []byte) error {
	d := json.NewDecoder(bytes.NewReader(text))
	if _, err := d.Token(); err != nil { // the opening brace
		return err
	}
	*s = nil
	for d.More() {
		key, err := d.Token()
		if err != nil {
			return err
		}
		var entry struct {
			Value  any    `json:"value"`
			Chosen string `json:"chosen"`
		}
		if err := d.Decode(&entry); err != nil {
			return err
		}
		name, _ := key.(string)
		*s = append(*s, Setting{name, entry.Value, entry.Chosen})
	}
	return nil
}

// Lattice is what was predicted onto.
type Lattice struct {
	Kind   string `json:"kind"` // "cells" or "places" (of --at)
	CRS    string `json:"crs"`
	Cell   Number `json:"cell_m"`
	Across int    `json:"columns"`
	Up     int    `json:"rows"`
	Count  int    `json:"count"`            // cells of the study area, or places
	Masked int    `json:"masked,omitempty"` // cells left out since a layer has no value there
	Area   Number `json:"area_m2"`
}

// Term is a number with the rule that gives it meaning.
type Term struct {
	Value      Number `json:"value"`
	Convention string `json:"convention"`
}

// Fit is how the fit went.
type Fit struct {
	Distribution     string            `json:"distribution"`
	Link             string            `json:"link"`
	Converged        bool              `json:"converged"`
	Iterations       int               `json:"iterations"`
	Gradient         Number            `json:"projected_gradient"`
	Criterion        string            `json:"criterion"`
	CriterionValue   Number            `json:"criterion_value"`
	Lambda           map[string]Term   `json:"lambda"`
	DegreesOfFreedom map[string]Number `json:"degrees_of_freedom"`
	Knots            int               `json:"knots"`
	KnotsInGaps      int               `json:"knots_in_gaps"`
	Plane            bool              `json:"surface_is_a_plane"`
	Dispersion       Number            `json:"dispersion"`
	DispersionKnown  bool              `json:"dispersion_known"`
	Pearson          Number            `json:"pearson_dispersion"`
	Shape            *Shape            `json:"shape"`           // null where the distribution has none
	ExtraVariation   *ExtraVariation   `json:"extra_variation"` // null where there was nothing to choose
	KnotPath         []KnotStep        `json:"knot_path"`       // on the way to enough knots
	UncertainSmooth  bool              `json:"smoothness_uncertainty"`
	Deviance         Number            `json:"deviance"`
	DevianceShare    Number            `json:"deviance_share"`
	LogLikelihood    Number            `json:"log_likelihood"`
	AIC              Number            `json:"aic"`
	AICCorrected     Number            `json:"aic_corrected"`
}

// Shape is the distribution's third parameter.
type Shape struct {
	Name      string `json:"name"`
	Value     Number `json:"value"`
	Estimated bool   `json:"estimated"`
	Simpler   string `json:"simpler"` // the simpler distribution that it ended at
}

// ExtraVariation is the outcome of comparing a distribution with the one that has extra variation.
type ExtraVariation struct {
	Plain          string `json:"plain"`
	Extra          string `json:"extra"`
	PlainCriterion Number `json:"plain_criterion"`
	ExtraCriterion Number `json:"extra_criterion"`
	PlainAIC       Number `json:"plain_aic"`
	ExtraAIC       Number `json:"extra_aic"`
	Chosen         string `json:"chosen"`
	Reason         string `json:"reason"`
}

// KnotStep is one fit on the way to enough knots; changes are in mean standard errors.
type KnotStep struct {
	Knots            int    `json:"knots"`
	DegreesOfFreedom Number `json:"degrees_of_freedom"`
	RMSChange        Number `json:"rms_change"`
	LargestChange    Number `json:"largest_change"`
}

// Coefficient is on the link scale.
type Coefficient struct {
	Name          string `json:"name"`
	Estimate      Number `json:"estimate"`
	StandardError Number `json:"standard_error"`
	Lower         Number `json:"lower"`
	Upper         Number `json:"upper"`
}

// Effect is a covariate with its role and the value it is held at on the map.
type Effect struct {
	Name string `json:"name"`
	Role string `json:"role"`
	Per  string `json:"per"`  // the category that a curve is for each level of; may be empty
	Held string `json:"held"` // empty where the map has the covariate's own values
	// HeldValue is the held number to the last digit; null where a level or nothing is held.
	HeldValue        Number `json:"held_value"`
	Range            string `json:"range"`
	DegreesOfFreedom Number `json:"degrees_of_freedom"`
	Deviation        Number `json:"standard_deviation"` // of a group's levels, on the link scale
	Overlap          Number `json:"overlap"`            // share of its variation that the rest of the model could take over
}

// Estimates are the map's figures in the reporting unit.
type Estimates struct {
	Unit                string `json:"unit"`
	Least               Number `json:"least"`
	Median              Number `json:"median"`
	Most                Number `json:"most"`
	MedianStandardError Number `json:"median_standard_error"`
	Threshold           Number `json:"threshold"`
	Above               Number `json:"share_with_chance_above_0.95"`
	Confidence          Number `json:"confidence"`
	Reference           Number `json:"reference"` // level that relative risks are taken against
}

// Zones says what the zones' figures are.
type Zones struct {
	Count  int      `json:"count"`
	Totals bool     `json:"totals"`
	Note   string   `json:"note"`
	Lines  []string `json:"-"` // the first few, in words
}

// Test is a test of whether a part of the model is needed.
type Test struct {
	Of               string `json:"of"`
	Method           string `json:"method"`
	Statistic        Number `json:"statistic"`
	DegreesOfFreedom Number `json:"degrees_of_freedom"` // reference ones, of a curve
	Draws            int    `json:"draws"`
	Exceeded         int    `json:"exceeded"`
	Failed           int    `json:"failed"`
	P                Number `json:"p"`
	Skipped          string `json:"skipped"` // why there is no test
}

// Candidate is one way to fit the rows. Figures without a meaning are null, and Missing says why.
type Candidate struct {
	Name                 string            `json:"name"`
	Distribution         string            `json:"distribution"`
	Link                 string            `json:"link"`
	DegreesOfFreedom     Number            `json:"degrees_of_freedom"`
	DevianceShare        Number            `json:"deviance_share"`
	AIC                  Number            `json:"aic"`
	AICCorrected         Number            `json:"aic_corrected"`
	RestrictedLikelihood Number            `json:"restricted_likelihood"`
	LogScore             Number            `json:"log_score"` // of rows left out in blocks of neighbours; more is better
	LogScoreSE           Number            `json:"log_score_standard_error"`
	Difference           Number            `json:"difference"` // from the map's own model
	DifferenceSE         Number            `json:"difference_standard_error"`
	Blocks               int               `json:"blocks"`
	Scored               int               `json:"scored"`
	LeftOut              int               `json:"left_out"`
	Missing              map[string]string `json:"missing"`
}

// Level is the outcome of a check.
type Level string

const (
	Clear Level = "clear" // nothing to remark
	Look  Level = "look"  // somebody should look before relying on it
	Stop  Level = "stop"  // not to be used as it is
)

// Check is a finding on the fit.
type Check struct {
	Name     string `json:"name"`
	Level    Level  `json:"level"`
	Figure   Number `json:"figure"`
	Sentence string `json:"sentence"`
}

// Output is a file beside the summary.
type Output struct {
	File   string `json:"file"`
	SHA256 string `json:"sha256,omitempty"` // of data files
}

// Worst returns the gravest level among the checks.
func (d Document) Worst() Level {
	worst := Clear
	for _, c := range d.Checks {
		if c.Level == Stop || c.Level == Look && worst == Clear {
			worst = c.Level
		}
	}
	return worst
}

// WriteJSON writes summary.json: keys in the order of the types, a list or table without entries as [] or {}, null only
// for what is not there or not finite.
func (d Document) WriteJSON(w io.Writer) error {
	d.Input.SetAside = table(d.Input.SetAside)
	d.Fit.Lambda, d.Fit.DegreesOfFreedom = table(d.Fit.Lambda), table(d.Fit.DegreesOfFreedom)
	d.Fit.KnotPath = list(d.Fit.KnotPath)
	d.Coefficients, d.Effects = list(d.Coefficients), list(d.Effects)
	d.Tests, d.Candidates = list(d.Tests), list(d.Candidates)
	d.Checks, d.Cautions, d.Outputs = list(d.Checks), list(d.Cautions), list(d.Outputs)
	e := json.NewEncoder(w)
	e.SetEscapeHTML(false)
	e.SetIndent("", "  ")
	return e.Encode(d)
}

func list[T any](v []T) []T {
	if v == nil {
		return []T{}
	}
	return v
}

func table[T any](v map[string]T) map[string]T {
	if v == nil {
		return map[string]T{}
	}
	return v
}
