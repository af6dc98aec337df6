package spatial

import (
	"math"

	"drumlin/spatial/internal/penfit"

	"gonum.org/v1/gonum/mat"
)

// EffectFigure is what an effect does to the linear predictor, at values of its covariate.
type EffectFigure struct {
	Name          string // the covariate; for a curve of one level "depth, soil=loam"
	Covariate     string
	Level         string  // of a curve for each level of a category: "soil=loam"; else empty
	DF, Lambda    float64 // degrees of freedom, and the penalty where there is one, as in Smooth
	Role          Role
	X             []float64 // of a slope or a curve: values of the covariate, ascending
	Label         []string  // of a category or group: the levels
	Estimate      []float64 // zero at the covariate's mean for a slope, on average over rows for a curve, at the base for a category
	StandardError []float64 // of a slope or curve with that of the overall level (Marra & Wood 2012, Scand. J. Stat. 39:53-74)
	// Overlap is the share of the effect's variation over the rows that the other parts of the model, with their
	// penalties, could take over: near 1 the data cannot tell them apart.
	Overlap float64
}

// Effects returns the model's effects in their order, curves at figurePoints values; nil for a surface that was restored.
func (s *Surface) Effects() []EffectFigure { return s.effects }

// figurePoints is the number of values that slopes and curves are told at.
const figurePoints = 101

// figures works the effects out.
func (s *Surface) figures(overlap []float64) (list []EffectFigure) {
	q := s.border.size()
	free, bound, done := 0, s.core.columns()+q, 0
	for i, e := range s.border.Effects {
		switch e.Role {
		case Linear:
			list = append(list, s.slopeFigure(e, free, q))
		case Category:
			list = append(list, s.stepFigure(e, free, q))
		case Curve:
			for k := range e.Curve {
				list = append(list, s.curveFigure(e, k, free+k, q, bound+k*(e.Curve[k].Dim()-1)))
			}
		case Group:
			list = append(list, s.groupFigure(e, bound))
		}
		for k := done; k < len(list); k++ {
			s.complete(&list[k], e, k-done, overlap[i])
		}
		done = len(list)
		free, bound = free+e.free(), bound+e.bound()
	}
	return list
}

// complete adds what the report knows of the k-th figure of an effect.
func (s *Surface) complete(f *EffectFigure, e fitted, k int, overlap float64) {
	f.Covariate, f.Overlap, f.DF = e.Name, overlap, float64(e.free())
	if e.Role == Curve && e.Per != "" {
		f.Level = e.Per + "=" + e.Level[k]
	}
	for _, t := range s.report.Smooths {
		if t.Kind == CurveSmooth && e.Role == Curve && t.Name == "curve "+f.Name || t.Kind == GroupSmooth && e.Role == Group && t.Name == "group "+f.Name {
			f.DF, f.Lambda = t.DF, t.Lambda
		}
	}
}

// slopeFigure: b (x - mean x).
func (s *Surface) slopeFigure(e fitted, j, q int) EffectFigure {
	f := EffectFigure{Name: e.Name, Role: e.Role}
	for _, x := range between(e.Lo, e.Hi) {
		f.X = append(f.X, x)
		g := make([]float64, len(s.beta))
		s.addFree(g, j, q, x-e.Mean)
		f.add(dot(g, s.beta), s.errorOf(s.plusMean(g)))
	}
	return f
}

func (s *Surface) curveFigure(e fitted, k, j, q, bound int) EffectFigure {
	f := EffectFigure{Name: e.curveName(k), Role: e.Role}
	c := e.Curve[k]
	row := make([]float64, c.Dim())
	for _, x := range between(c.Lo, c.Hi) {
		f.X = append(f.X, x)
		c.RowTo(row, x)
		g := make([]float64, len(s.beta))
		s.addFree(g, j, q, row[0])
		copy(g[bound:], row[1:])
		f.add(dot(g, s.beta), s.errorOf(s.plusMean(g)))
	}
	return f
}

func (s *Surface) stepFigure(e fitted, j, q int) EffectFigure {
	f := EffectFigure{Name: e.Name, Role: e.Role, Label: e.Level}
	f.add(0, 0)
	for l := range e.Level[1:] {
		g := make([]float64, len(s.beta))
		s.addFree(g, j+l, q, 1)
		f.add(dot(g, s.beta), s.errorOf(g))
	}
	return f
}

func (s *Surface) groupFigure(e fitted, bound int) EffectFigure {
	f := EffectFigure{Name: e.Name, Role: e.Role, Label: e.Level}
	for l := range e.Level {
		g := make([]float64, len(s.beta))
		g[bound+l] = 1
		f.add(s.beta[bound+l], s.errorOf(g))
	}
	return f
}

func (f *EffectFigure) add(estimate, se float64) {
	f.Estimate, f.StandardError = append(f.Estimate, estimate), append(f.StandardError, se)
}

// addFree adds v times the j-th raw free coefficient to the functional g.
func (s *Surface) addFree(g []float64, j, q int, v float64) {
	k := s.core.columns()
	for l, w := range s.border.functional(j, q) {
		g[k+l] += v * w
	}
}

// plusMean adds the linear predictor's mean over rows to a functional, for errors that include the level's.
func (s *Surface) plusMean(g []float64) []float64 {
	sum := make([]float64, len(g))
	for i := range g {
		sum[i] = g[i] + s.mean[i]
	}
	return sum
}

func between(lo, hi float64) []float64 {
	x := make([]float64, figurePoints)
	for i := range x {
		x[i] = lo + (hi-lo)*float64(i)/(figurePoints-1)
	}
	return x
}

// overlaps returns for each effect the weighted R2 of its fitted contribution on everything else in the model at the
// current penalties. gram is X'WX in the fit's columns; the raw columns, in which effects are apart from one another,
// are X A.
func (s *Surface) overlaps(gram *mat.SymDense, list []smooth, r *penfit.Result) []float64 {
	if len(s.border.Effects) == 0 {
		return nil
	}
	p, k, q := len(s.beta), s.core.columns(), s.border.size()
	a := mat.NewDense(p, p, nil)
	for i := 0; i < p; i++ {
		a.Set(i, i, 1)
	}
	for j := 0; j < q; j++ { // a raw column is T Mix + Q R
		for l := 0; l <= j; l++ {
			a.Set(k+l, k+j, s.border.R[l*q+j])
		}
		for m := 0; m < s.border.null; m++ {
			a.Set(m/s.border.keep*s.core.width()+m%s.border.keep, k+j, s.border.Mix[m*q+j])
		}
	}
	var half, raw mat.Dense
	half.Mul(gram, a)
	raw.Mul(a.T(), &half)
	penalty := make([]float64, p)
	for j, t := range list {
		for _, span := range t.ridge {
			for c := span.First; c < span.First+span.Size; c++ {
				penalty[c] = r.Lambda[j]
			}
		}
	}
	own := make([]float64, p) // raw coefficients
	copy(own, s.beta)
	for j := 0; j < q; j++ {
		own[k+j] = dot(s.border.functional(j, q), s.beta[k:k+q])
	}
	var out []float64
	free, bound := k, k+q
	for _, e := range s.border.Effects {
		mine := make([]bool, p)
		for c := free; c < free+e.free(); c++ {
			mine[c] = true
		}
		for c := bound; c < bound+e.bound(); c++ {
			mine[c] = true
		}
		out = append(out, share(&raw, penalty, own, mine))
		free, bound = free+e.free(), bound+e.bound()
	}
	return out
}

// share returns the R2 of X_m b_m on the other columns, penalised.
func share(gram *mat.Dense, penalty, b []float64, mine []bool) float64 {
	var others []int
	for c, m := range mine {
		if !m {
			others = append(others, c)
		}
	}
	cross, size := make([]float64, len(b)), 0.0 // X'W f and f'W f
	for i := range b {
		for c, m := range mine {
			if m {
				cross[i] += gram.At(i, c) * b[c]
			}
		}
		if mine[i] {
			size += b[i] * cross[i]
		}
	}
	size -= cross[0] * cross[0] / gram.At(0, 0) // about the mean: column 0 is a constant
	h := mat.NewSymDense(len(others), nil)
	right := mat.NewVecDense(len(others), nil)
	for i, c := range others {
		right.SetVec(i, cross[c])
		for j := i; j < len(others); j++ {
			h.SetSym(i, j, gram.At(c, others[j]))
		}
		h.SetSym(i, i, h.At(i, i)+penalty[c])
	}
	var chol mat.Cholesky
	var x mat.VecDense
	if !(size > 0) || !chol.Factorize(h) || chol.SolveVecTo(&x, right) != nil {
		return math.NaN()
	}
	// |f - X x|^2 = f'f - 2 x'X'f + x'X'X x, with X'X x = right - penalty x.
	explained, fitted := mat.Dot(&x, right), mat.Dot(&x, right)
	for i, c := range others {
		fitted -= penalty[c] * x.AtVec(i) * x.AtVec(i)
	}
	total := size + cross[0]*cross[0]/gram.At(0, 0)
	return math.Max(0, math.Min(1, 1-(total-2*explained+fitted)/size))
}
