package spatial

import (
	"context"
	"math"
	"math/rand/v2"

	"drumlin/basis2d"
	"drumlin/spatial/internal/penfit"
	"drumlin/spatial/response"

	"gonum.org/v1/gonum/blas"
	"gonum.org/v1/gonum/blas/blas64"
	"gonum.org/v1/gonum/stat/distuv"
)

// Surface is a fitted model. It is immutable and safe for concurrent use.
type Surface struct {
	model   Model
	dist    response.Distribution
	core    *core
	knots   basis2d.Knots
	border  *border
	beta    []float64 // surface's columns, then the border's free ones, then its bound ones
	mean    []float64 // of the model matrix's columns over the rows
	factor  []float64 // R with R'R = X'WX + S, p x p row-major, upper triangular
	phi     float64
	spread  blas64.General // p x k root of what the smoothness' uncertainty and shared factors add to the covariance; k may be 0
	report  Report
	rows    *Rows
	effects []EffectFigure
	workers int
}

// Coefficient is a coefficient on the link scale.
type Coefficient struct {
	Name                    string
	Estimate, StandardError float64
}

// Report says how the fit went and what it came to.
type Report struct {
	Distribution, Link string
	Rows               int
	Converged          bool
	Iterations         int
	Passes             int
	ProjectedGradient  float64
	Method             Method
	// CriterionValue is the restricted likelihood on the coefficient scale with unpenalised columns 1, x, y in metres
	// and the covariates as they are, whatever chose the smoothness; or the cross-validation score for GCV.
	CriterionValue  float64
	Lambda          float64 // of the surface, in metres: see Smoothness; NaN without a penalty
	AtUpper         bool    // the data chose the plane
	SurfaceDF       float64 // degrees of freedom of the surface, its constant not counted
	DF              float64 // total
	Knots           int
	KnotsInGaps     int
	DistinctPlaces  int
	Dispersion      float64
	KnownDispersion bool
	Pearson         float64 // sum of squared Pearson residuals over n - df
	Deviance        float64
	ConstantDev     float64 // of intercept and offset alone
	DevianceShare   float64
	LogLikelihood   float64
	AIC             float64
	// AICCorrected counts what choosing the smoothness costs as well; NaN unless the model asked for its uncertainty.
	AICCorrected   float64
	Coefficients   []Coefficient // the intercept is the surface's mean over rows; curves and groups are not among them
	Smooths        []Smooth      // the parts with a penalty of their own
	ShapeName      string        // of the distribution; empty if it has none
	Shape          float64
	ShapeEstimated bool
	Simpler        string // the simpler distribution that the shape ended at; empty if it did not
}

// Smooth is a part of the model with a penalty of its own.
type Smooth struct {
	Name    string
	Kind    SmoothKind
	Lambda  float64 // see SmoothKind
	DF      float64 // degrees of freedom, constants not counted
	AtUpper bool    // the data chose the part without a penalty alone
}

// Report returns the record of the fit.
func (s *Surface) Report() Report { return s.report }

// Model returns the model that was fitted.
func (s *Surface) Model() Model { return s.model }

func (s *Surface) describe(r *penfit.Result, d Data, list []smooth, spreadDF float64) Report {
	free := float64(s.border.size())
	rep := Report{
		Distribution: s.dist.Name(), Link: s.dist.Link(), Rows: len(d.Response),
		Converged: r.Converged, Iterations: r.Iterations, Passes: r.Passes, ProjectedGradient: r.Gradient,
		Method: s.model.Smoothness.Method, Lambda: math.NaN(),
		DF: r.Edf, SurfaceDF: float64(s.border.null) - 1,
		Dispersion: r.Phi, KnownDispersion: s.knownDispersion(), Pearson: r.Pearson,
		Deviance: r.Deviance, ConstantDev: r.Constant, LogLikelihood: r.LogLikelihood,
	}
	if r.Constant > 0 {
		rep.DevianceShare = 1 - r.Deviance/r.Constant
	}
	if shaped, ok := s.dist.(response.Shaped); ok {
		rep.ShapeName, rep.Shape, rep.ShapeEstimated = shaped.ShapeName(), shaped.Shape(), s.model.Shape == nil
		if r.ShapeAtLower || r.ShapeAtUpper {
			rep.Simpler = shaped.Simpler(r.ShapeAtUpper)
		}
	}
	rep.AIC, rep.AICCorrected = -2*r.LogLikelihood+2*(r.Edf+rep.extra()), math.NaN()
	if s.model.SmoothnessUncertainty {
		rep.AICCorrected = rep.AIC + 2*spreadDF
	}
	rep.CriterionValue = r.Value
	if b := s.core.basis; b != nil {
		rep.Knots, rep.KnotsInGaps, rep.DistinctPlaces = b.Dim(), s.knots.InGaps, s.knots.Distinct
	}
	for j, t := range list {
		smooth := Smooth{Name: t.name, Kind: t.kind, Lambda: r.Lambda[j] * t.scale, DF: r.TermEdf[j] + float64(t.free), AtUpper: r.AtUpper[j]}
		rep.Smooths = append(rep.Smooths, smooth)
		switch t.kind {
		case SurfaceSmooth:
			if math.IsNaN(rep.Lambda) {
				rep.Lambda, rep.AtUpper = smooth.Lambda, smooth.AtUpper
			}
			rep.SurfaceDF += r.TermEdf[j]
		case SlopeSmooth:
			rep.SurfaceDF += r.TermEdf[j]
		}
	}
	if rep.Method != GCV || len(list) == 0 {
		rep.CriterionValue += s.border.logDet(int(free))
		if b := s.core.basis; b != nil && s.border.keep == basis2d.Null {
			rep.CriterionValue += 2 * math.Log(b.Scale) * float64(s.core.copies())
		}
	}
	if s.model.ScaleVariation { // there is no likelihood
		rep.CriterionValue, rep.LogLikelihood, rep.AIC = math.NaN(), math.NaN(), math.NaN()
	}
	rep.Coefficients = s.coefficients()
	return rep
}

// extra counts what was estimated beside the coefficients and the smoothness.
func (r Report) extra() (n float64) {
	if !r.KnownDispersion {
		n++
	}
	if r.ShapeEstimated {
		n++
	}
	return n
}

// knownDispersion reports whether phi is 1 rather than estimated.
func (s *Surface) knownDispersion() bool { return s.dist.KnownDispersion() && !s.model.ScaleVariation }

// coefficients reads the raw coefficients off the orthogonal ones the fit works with. The intercept is the surface's
// mean over rows.
func (s *Surface) coefficients() []Coefficient {
	k, q := s.core.columns(), s.border.size()
	g := make([]float64, len(s.beta))
	copy(g, s.mean[:k])
	t := make([]float64, s.border.null)
	s.core.nullTo(t, s.mean, s.border.keep)
	for j := 0; j < q; j++ { // T a_T = T (a~ - Mix R^-1 c)
		for l, v := range s.border.functional(j, q) {
			for m, tm := range t {
				g[k+l] -= tm * s.border.Mix[m*q+j] * v
			}
		}
	}
	list := []Coefficient{s.linearForm("intercept", g)}
	at := 0
	for _, e := range s.border.Effects {
		for _, name := range e.names() {
			if e.Role != Curve { // the straight part of a curve is told with the curve
				clear(g)
				copy(g[k:], s.border.functional(at, q))
				list = append(list, s.linearForm(name, g))
			}
			at++
		}
	}
	return list
}

// meanRow returns the mean of the model matrix's columns over its rows, the mean of a row's points by their shares being the
// row's: what linear predictors move by where the coefficients are zero.
func meanRow(ctx context.Context, e penfit.Engine) ([]float64, error) {
	one := func(int, float64, float64) (weight, value float64) { return 0, 1 }
	if err := e.Pass(ctx, make([]float64, e.Coefs()), one, penfit.NoGram); err != nil {
		return nil, err
	}
	mean := append([]float64(nil), e.Score()...)
	for j := range mean {
		mean[j] /= float64(e.Rows())
	}
	return mean, nil
}

// linearForm returns g'beta with its standard error; it overwrites nothing.
func (s *Surface) linearForm(name string, g []float64) Coefficient {
	return Coefficient{Name: name, Estimate: dot(g, s.beta), StandardError: s.errorOf(g)}
}

// errorOf returns the standard error of g'beta.
func (s *Surface) errorOf(g []float64) float64 {
	l := s.length(g)
	return math.Sqrt(s.phi*l*l + s.spreadOf(g))
}

// spreadOf returns what the smoothness' uncertainty and shared factors add to the variance of g'beta.
func (s *Surface) spreadOf(g []float64) (v float64) {
	for c := 0; c < s.spread.Cols; c++ {
		sum := 0.0
		for i, x := range g {
			sum += x * s.spread.Data[i*s.spread.Stride+c]
		}
		v += sum * sum
	}
	return v
}

// length returns |R'^-1 g|, the square root of g'H^-1 g.
func (s *Surface) length(g []float64) float64 {
	v := append([]float64(nil), g...)
	blas64.Trsv(blas.Trans, s.triangle(), blas64.Vector{N: len(v), Inc: 1, Data: v})
	return math.Sqrt(dot(v, v))
}

func (s *Surface) triangle() blas64.Triangular {
	p := len(s.beta)
	return blas64.Triangular{Uplo: blas.Upper, Diag: blas.NonUnit, N: p, Stride: p, Data: s.factor}
}

// Quantile returns the quantile for intervals of the given confidence: normal where the dispersion is known, else
// Student's t with n - df degrees of freedom.
func (s *Surface) Quantile(confidence float64) float64 {
	return s.reference().Quantile(0.5 + confidence/2)
}

// Chance returns the posterior probability that the linear predictor exceeds limit.
func (s *Surface) Chance(eta, se, limit float64) float64 {
	if se == 0 {
		return map[bool]float64{true: 1, false: 0}[eta > limit]
	}
	return s.reference().CDF((eta - limit) / se)
}

type distribution interface {
	Quantile(p float64) float64
	CDF(x float64) float64
}

func (s *Surface) reference() distribution {
	if s.knownDispersion() {
		return distuv.UnitNormal
	}
	return distuv.StudentsT{Mu: 0, Sigma: 1, Nu: math.Max(float64(s.report.Rows)-s.report.DF, 1)}
}

// Mean returns g^-1(eta): the level for one unit of exposure, or the probability.
func (s *Surface) Mean(eta float64) float64 { return s.dist.Mean(eta) }

// MeanSlope returns dMean/deta.
func (s *Surface) MeanSlope(eta float64) float64 { return s.dist.MeanSlope(eta) }

// Linear returns g(mean).
func (s *Surface) Linear(mean float64) float64 { return s.dist.Linear(mean) }

// Rows are what the fit says of each observation, in the order of the data.
type Rows struct {
	Fitted   []float64 // mean of the response, exposure or trials included
	Deviance []float64 // signed root of the deviance contribution
	Quantile []float64 // quantile residual, randomised for counts (Dunn & Smyth 1996, J. Comput. Graph. Stat. 5:236)
	Leverage []float64 // diagonal of the influence matrix of the linearised model; nil above a million rows
}

// leverageRows is the number of rows up to which leverages are kept.
const leverageRows = 1_000_000

// Rows returns the rows' residuals, or nil for a surface that was restored.
func (s *Surface) Rows() *Rows { return s.rows }

func (s *Surface) settleRows(ctx context.Context, e penfit.Engine, p penfit.Problem, r *penfit.Result, d Data, seed uint64) error {
	n := len(p.Obs)
	rows := &Rows{Fitted: make([]float64, n), Deviance: make([]float64, n), Quantile: make([]float64, n)}
	random := rand.New(rand.NewPCG(seed, 0x6472756d6c696e))
	if n <= leverageRows {
		rows.Leverage = make([]float64, n)
		if err := e.LeveragesTo(ctx, rows.Leverage); err != nil {
			return err
		}
	}
	for i, o := range p.Obs {
		eta := r.Eta[i]
		pt := s.dist.At(o, eta)
		rows.Fitted[i] = s.dist.Mean(eta) * o.Trials
		rows.Deviance[i] = math.Copysign(math.Sqrt(math.Max(pt.Deviance, 0)), o.Y-rows.Fitted[i])
		rows.Quantile[i] = quantileResidual(s.dist, o, eta, s.phi, random.Float64())
		if rows.Leverage != nil {
			w := pt.Weight
			if s.dist.Curvature() == response.Expected {
				w = pt.Expected
			}
			rows.Leverage[i] *= w
		}
	}
	s.rows = rows
	return nil
}

// quantileResidual returns the normal quantile of a point drawn between P(Y < y) and P(Y <= y) by u in [0, 1).
func quantileResidual(dist response.Distribution, o response.Obs, eta, phi, u float64) float64 {
	below, upTo := dist.CDF(o, eta, phi)
	p := below + (upTo-below)*u
	const tail = 1e-300
	return distuv.UnitNormal.Quantile(math.Min(math.Max(p, tail), 1-1e-16))
}
