package spatial

import (
	"fmt"
	"math"

	"drumlin/spatial/response"
)

// Covariate holds the values of one covariate, one a row: numbers, or codes into Level for a category.
type Covariate struct {
	Name   string
	Number []float64
	Code   []int32
	Level  []string
}

// Role is what a covariate does in the model.
type Role int

const (
	Linear   Role = iota // a slope
	Category             // a step for every level but the first
	Curve                // a smooth function, of mean zero over the rows
	Group                // a random intercept for each level
)

// Effect is a covariate with its role.
type Effect struct {
	Name string
	Role Role
	Per  string // of a curve: the category for each level of which there is one of its own; may be empty
}

// numeric reports whether the effect's covariate holds numbers.
func (e Effect) numeric() bool { return e.Role == Linear || e.Role == Curve }

// Kind is the kind of the surface.
type Kind int

const (
	ThinPlate Kind = iota
	None           // no surface: a regression on the covariates
)

// Method says how the smoothness is chosen.
type Method int

const (
	REML  Method = iota // restricted maximum likelihood
	GCV                 // generalised cross-validation, or the unbiased-risk form where the dispersion is known
	Given               // Lambda is given
)

// Smoothness is the choice of the penalty. Lambda, used with Given, is that of
// sum w (y - f)^2 + lambda J(f) with places in metres; for other distributions the deviance takes the sum's part.
type Smoothness struct {
	Method Method
	Lambda float64
}

// DefaultKnots is the most knots a surface gets unless the model says otherwise.
const DefaultKnots = 200

// Model says what is fitted. The zero value is not valid: Distribution must be named.
type Model struct {
	Distribution string   // one of response.Names
	Link         string   // "" means the distribution's own
	Shape        *float64 // of a distribution that has one; nil means that the data choose it
	// ScaleVariation takes the variance as phi times the distribution's, phi estimated (quasi-likelihood; Wedderburn
	// 1974). Only for distributions whose dispersion is known.
	ScaleVariation bool
	Surface        Kind
	// SurfacePer names a category for each level of which there is a surface of its own; OwnSmoothness gives each its own
	// penalty too.
	SurfacePer    string
	OwnSmoothness bool
	// Shrink penalises the surface's slope as well, so that it can vanish (Marra & Wood 2011, Comput. Stat. Data Anal.
	// 55:2372-2387).
	Shrink     bool
	MaxKnots   int // 0 means DefaultKnots
	Smoothness Smoothness
	// SmoothnessUncertainty adds to every error what not knowing the smoothness and the shape adds, to first order. Only
	// with restricted likelihood.
	SmoothnessUncertainty bool
	Effects               []Effect
}

// Data are the observations: slices have one value a row, or are nil where they do not apply.
type Data struct {
	Response   []float64 // measured value, count, or number positive
	Exposure   []float64 // people, area, effort or expected count behind each count; positive; nil means 1
	Trials     []float64 // number examined, binomial only
	Weight     []float64 // prior weight: the variance is phi/weight; nil means 1
	Places     Places
	Covariates []Covariate // at least those the model's effects name
	// Factor multiplies the exposures of many rows by factors that are known with an error only. May be nil.
	Factor *Factor
}

// Options are how to fit, rather than what. The zero value is usable.
type Options struct {
	Workers int // goroutines; 0 means one a processor. The answer does not depend on it
	// Knots, if not empty, are used instead of a choice of our own.
	Knots Places
	// Area is a set of points that covers the study area: gaps between places get knots, so that errors grow there.
	Area Places
	Seed uint64 // of the randomised quantile residuals of counts

	start start // of the search, from a fit with other knots
}

// start is the smoothness of an earlier fit of the same terms, as reported.
type start []Smooth

// on returns log lambda in the core's terms, or nil where the terms are not those of the earlier fit.
func (s start) on(list []smooth) []float64 {
	if len(s) != len(list) || len(s) == 0 {
		return nil
	}
	rho := make([]float64, len(list))
	for j, t := range list {
		if s[j].Name != t.name || !(s[j].Lambda > 0) {
			return nil
		}
		rho[j] = math.Log(s[j].Lambda / t.scale)
	}
	return rho
}

// Error is a fit that could not be had, with what to do about it.
type Error struct {
	Message string
	Advice  string
	Cause   error
	Request bool // the request is too large rather than the data unfit
}

func (e *Error) Error() string { return e.Message }

// Unwrap returns the numerical cause, if there is one.
func (e *Error) Unwrap() error { return e.Cause }

// Hint returns what to do about it.
func (e *Error) Hint() string { return e.Advice }

// FitFailed tells a fit that could not be had from a request that is wrong.
func (e *Error) FitFailed() bool { return !e.Request }

func unfit(advice, format string, args ...any) error {
	return &Error{Message: fmt.Sprintf(format, args...), Advice: advice}
}

// check panics if slices do not have one value a row, and returns an error for values that no model can take.
func (d Data) check(m Model, dist response.Distribution) error {
	n := d.Places.Len()
	if len(d.Response) != n {
		panic(lengths)
	}
	for _, v := range [][]float64{d.Exposure, d.Trials, d.Weight} {
		if v != nil && len(v) != n {
			panic(lengths)
		}
	}
	d.Places.check()
	checkLengths(d.Covariates, n)
	for i := 0; i < n; i++ {
		if bad(d.Response[i]) || d.Places.Start == nil && (bad(d.Places.X[i]) || bad(d.Places.Y[i])) {
			return unfit("leave the row out", "row %d: a response or place that is not a finite number", i+1)
		}
		if d.Exposure != nil && !positive(d.Exposure[i]) || d.Weight != nil && !positive(d.Weight[i]) {
			return unfit("leave the row out", "row %d: a denominator or weight that is not a positive number", i+1)
		}
	}
	if k := kindOf(dist); d.Exposure != nil && k != counts && k != amounts {
		return unfit("name trials for positives, or leave the denominator out", "a denominator goes with counts, not with the %s distribution", m.Distribution)
	}
	if err := d.Factor.check(n, d.Exposure); err != nil {
		return err
	}
	if d.Trials != nil && kindOf(dist) != shares {
		return unfit("leave the trials out", "trials go with positives, not with the %s distribution", m.Distribution)
	}
	if m.ScaleVariation && m.Distribution != "poisson" && m.Distribution != "binomial" {
		return unfit("leave the scaling out", "the %s distribution estimates its extra variation itself", m.Distribution)
	}
	if m.SmoothnessUncertainty && (m.ScaleVariation || m.Smoothness.Method == GCV) {
		return unfit("leave it out", "the smoothness' uncertainty is known for restricted likelihood only")
	}
	if m.ScaleVariation && m.Smoothness.Method == GCV {
		return unfit("let restricted likelihood choose", "scaled variation and cross-validation do not go together")
	}
	if _, shaped := dist.(response.Shaped); shaped && m.Shape == nil && m.Smoothness.Method == GCV {
		return unfit("use restricted likelihood, or give the shape", "cross-validation cannot choose the shape of the %s distribution", m.Distribution)
	}
	if l := m.Smoothness.Lambda; m.Smoothness.Method == Given && !(l >= 0 && !bad(l)) {
		return unfit("give a smaller penalty as a smaller number: 0 interpolates", "a smoothness of %g is not a number from 0 up", l)
	}
	return nil
}

// lengths is the panic of calls whose slices do not belong together.
const lengths = "spatial: slices differ in length"

// checkLengths panics if a covariate does not have n values.
func checkLengths(z []Covariate, n int) {
	for _, c := range z {
		if c.Number != nil && len(c.Number) != n || c.Code != nil && len(c.Code) != n {
			panic(lengths)
		}
	}
}

func positive(v float64) bool { return v > 0 && !math.IsInf(v, 1) }

func bad(v float64) bool { return math.IsNaN(v) || math.IsInf(v, 0) }
