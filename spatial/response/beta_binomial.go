package response

import (
	"fmt"
	"math"
)

// BetaBinomial is the distribution of the number positive among trials that are alike within a place, with the logit
// link: the probability itself has a beta distribution with mean p, and the variance is m p (1-p) (1 + (m-1) rho)
// (Skellam 1948; Williams 1975). With t = rho/(1-rho) and q = 1-p the log-likelihood is
//
//	log C(m, y) + sum_{j<y} log(p + j t) + sum_{j<m-y} log(q + j t) - sum_{j<m} log(1 + j t),
//
// which goes over into the binomial one to rounding as rho goes to 0. Observed weights may be negative. Numbers positive
// and trials are whole numbers.
type BetaBinomial struct {
	Correlation float64 // rho, from 0, which is the binomial, to below 1
}

// The search for the correlation ends at these.
const (
	leastCorrelation = 1e-7
	mostCorrelation  = 0.99
)

// sumTrials is the largest number of trials for which expected weights are summed over the outcomes, at some 10 ns each.
const sumTrials = 100

func (BetaBinomial) Name() string          { return "beta-binomial" }
func (BetaBinomial) Link() string          { return "logit" }
func (BetaBinomial) KnownDispersion() bool { return true }
func (BetaBinomial) Curvature() Curvature  { return Observed }
func (BetaBinomial) ConstantWeight() bool  { return false }

// Mean returns the probability 1/(1 + exp(-eta)).
func (BetaBinomial) Mean(eta float64) float64 { return Binomial{}.Mean(eta) }

// MeanSlope returns p (1 - p).
func (BetaBinomial) MeanSlope(eta float64) float64 { return Binomial{}.MeanSlope(eta) }

// Linear returns log(p/(1 - p)).
func (BetaBinomial) Linear(p float64) float64 { return Binomial{}.Linear(p) }

// Start returns the row's share of positives moved towards the overall one.
func (BetaBinomial) Start(o Obs, overall float64) float64 { return Binomial{}.Start(o, overall) }

// ShapeName returns "correlation".
func (BetaBinomial) ShapeName() string { return "correlation" }

// Shape returns the correlation.
func (d BetaBinomial) Shape() float64 { return d.Correlation }

// Working returns logit rho, which is log t.
func (d BetaBinomial) Working() float64 { return math.Log(d.step()) }

// WithWorking returns the distribution with logit rho = s.
func (BetaBinomial) WithWorking(s float64) Shaped {
	rho, _ := logistic(s)
	return BetaBinomial{Correlation: rho}
}

// WithShape returns the distribution with another correlation. The error says what it may be.
func (BetaBinomial) WithShape(rho float64) (Shaped, error) {
	if !(rho >= leastCorrelation && rho <= mostCorrelation) {
		return nil, fmt.Errorf("the correlation of a beta-binomial distribution is between %g and %g, not %g", leastCorrelation, mostCorrelation, rho)
	}
	return BetaBinomial{Correlation: rho}, nil
}

// Box returns the bounds of logit rho.
func (BetaBinomial) Box() (lo, hi float64) {
	return Binomial{}.Linear(leastCorrelation), Binomial{}.Linear(mostCorrelation)
}

// Simpler returns "binomial" for the lower bound.
func (BetaBinomial) Simpler(upper bool) string {
	if upper {
		return ""
	}
	return "binomial"
}

// step returns t = rho/(1 - rho).
func (d BetaBinomial) step() float64 { return d.Correlation / (1 - d.Correlation) }

// bbRow is a row's two ladders at a probability: y rungs from p, m - y from q, each divided by its height.
type bbRow struct {
	p, q    float64
	yes, no rungs
}

func (d BetaBinomial) row(y, n, p, q float64) bbRow {
	t := d.step()
	return bbRow{p: p, q: q, yes: ladder(climb(t, p), y), no: ladder(climb(t, q), n)}
}

// score returns dl/deta.
func (r bbRow) score() float64 { return r.q*r.yes.inverse - r.p*r.no.inverse }

// weight returns -d2l/deta2, written so that nothing cancels for small p, q or t.
func (r bbRow) weight() float64 {
	return r.p*r.q*(r.yes.inverse+r.no.inverse) - r.q*r.q*r.yes.lean - r.p*r.p*r.no.lean
}

// slope returns -d3l/deta3.
func (r bbRow) slope() float64 {
	p, q := r.p, r.q
	return p*q*((q-p)*(r.yes.inverse+r.no.inverse)+3*q*r.yes.lean-3*p*r.no.lean) +
		q*q*q*(2*r.yes.steep-r.yes.lean) - p*p*p*(2*r.no.steep-r.no.lean)
}

// scoreShape and weightShape return the derivatives of score and weight in log t, rise that of the log-likelihood but
// for the part that does not depend on p.
func (r bbRow) scoreShape() float64 { return r.p*r.no.lean - r.q*r.yes.lean }

func (r bbRow) weightShape() float64 {
	p, q := r.p, r.q
	return q*q*(r.yes.lean-2*r.yes.steep) + p*p*(r.no.lean-2*r.no.steep) - p*q*(r.yes.lean+r.no.lean)
}

func (r bbRow) rise() float64 { return r.yes.rise + r.no.rise }

// logKernel returns the part of the log-likelihood that depends on p.
func (d BetaBinomial) logKernel(y, n float64, at share) float64 {
	t := d.step()
	return logProduct(at.logP, at.p, t, y) + logProduct(at.logQ, at.q, t, n)
}

// share is a probability and its complement with their logarithms, which stay finite where the numbers underflow.
type share struct{ p, q, logP, logQ float64 }

func shareAt(eta float64) share {
	p, q := logistic(eta)
	return share{p, q, -softplus(-eta), -softplus(eta)}
}

func (s share) mirrored() share { return share{s.q, s.p, s.logQ, s.logP} }

// At returns the contributions of o at eta. Expected is the mean of the squared score over all outcomes for up to
// sumTrials trials. For more it is m p q/(1 + (m-1) rho), the information of the first two moments, a little less: it
// serves only where observed weights will not do as curvature, on the way to the mode.
func (d BetaBinomial) At(o Obs, eta float64) Point {
	at := shareAt(eta)
	y, n := o.Y, o.Trials-o.Y
	r := d.row(y, n, at.p, at.q)
	lost := d.logKernel(y, n, d.ownShare(y, n)) - d.logKernel(y, n, at)
	i := d.information(o.Trials, at.p, at.q)
	w := o.Weight
	return Point{
		Deviance: 2 * w * math.Max(0, lost), Score: w * r.score(), Weight: w * r.weight(), Slope: w * r.slope(),
		Expected: w * i.value, ExpectedSlope: w * i.slope,
	}
}

// ShapeAt returns the derivatives in logit rho.
func (d BetaBinomial) ShapeAt(o Obs, eta float64) ShapePoint {
	p, q := logistic(eta)
	y, n := o.Y, o.Trials-o.Y
	r := d.row(y, n, p, q)
	return ShapePoint{
		Deviance: 2 * o.Weight * (d.ownRise(y, n) - r.rise()), Score: o.Weight * r.scoreShape(),
		Weight: o.Weight * r.weightShape(), Expected: o.Weight * d.information(o.Trials, p, q).shape,
	}
}

// Saturated returns w times the log probability of the number positive at the probability that makes it largest, which
// is not y/m.
func (d BetaBinomial) Saturated(o Obs, _ float64) float64 {
	return o.Weight * d.logProbability(o.Y, o.Trials, d.ownShare(o.Y, o.Trials-o.Y))
}

// SaturatedSlope returns dSaturated/dlogit rho.
func (d BetaBinomial) SaturatedSlope(o Obs, _ float64) float64 {
	return o.Weight * (d.ownRise(o.Y, o.Trials-o.Y) - ladder(d.step(), o.Trials).rise)
}

// LogLikelihood returns w times the log probability of the number positive.
func (d BetaBinomial) LogLikelihood(o Obs, eta, _ float64) float64 {
	return o.Weight * d.logProbability(o.Y, o.Trials, shareAt(eta))
}

func (d BetaBinomial) logProbability(y, m float64, at share) float64 {
	return logChoose(m, y) + d.logKernel(y, m-y, at) - logLadder(d.step(), m)
}

// Pearson returns w (y - m p)^2 / (m p q (1 + (m-1) rho)).
func (d BetaBinomial) Pearson(o Obs, eta float64) float64 {
	return Binomial{}.Pearson(o, eta) / (1 + (o.Trials-1)*d.Correlation)
}

// ownShare returns the probability p* that maximises a row's own likelihood: 0 or 1 where y = 0 or n = 0, else the root of
// the score, which is unique since the log-likelihood is concave in p. The score as a function of p is a straight line for
// rho = 0 and nearly one for rho near 1, so Newton's method, kept inside a bracket, takes few steps.
func (d BetaBinomial) ownShare(y, n float64) share {
	switch {
	case y == 0:
		return share{p: 0, q: 1, logP: math.Inf(-1)}
	case y > n: // look for the smaller share, which has the digits
		return d.ownShare(n, y).mirrored()
	case y == n:
		return share{0.5, 0.5, -math.Ln2, -math.Ln2}
	}
	p := y / (y + n) // the root lies between this and 1/2
	lo, hi := p, 0.5
	for range 100 {
		r := d.row(y, n, p, 1-p)
		score := r.score()
		if score > 0 {
			lo = p
		} else {
			hi = p
		}
		fall := r.yes.inverse + r.no.inverse - r.q/p*r.yes.lean - p/r.q*r.no.lean
		next := p + score/fall
		if !(next >= lo && next <= hi) {
			next = (lo + hi) / 2
		}
		change := math.Abs(next-p) / p
		p = next
		if change < 1e-7 { // another step would be below rounding
			break
		}
	}
	return share{p, 1 - p, math.Log(p), math.Log1p(-p)}
}

// ownRise returns the rise of a row at its own probability.
func (d BetaBinomial) ownRise(y, n float64) float64 {
	own := d.ownShare(y, n)
	return d.row(y, n, own.p, own.q).rise()
}

// bbInformation is an expected weight with its derivatives in eta and log t.
type bbInformation struct{ value, slope, shape float64 }

// information returns E[(dl/deta)^2], summed over the outcomes from the mean outwards, each next probability from the last.
func (d BetaBinomial) information(m, p, q float64) bbInformation {
	t := d.step()
	if m > sumTrials {
		value := m * p * q * (1 + t) / (1 + m*t)
		return bbInformation{value, value * (q - p), value * (t/(1+t) - m*t/(1+m*t))}
	}
	centre := math.Round(m * p)
	r := d.row(centre, m-centre, p, q)
	score := r.score()
	total, square, slope := 1.0, score*score, score*(score*score-2*r.weight())
	shape, rise := score*(2*r.scoreShape()+score*r.rise()), r.rise()
	up := d.outcomesAbove(centre, m, r)
	down := d.outcomesAbove(m-centre, m, bbRow{q, p, r.no, r.yes}) // where score and slope have the other sign
	total += up.total + down.total
	value := (square + up.square + down.square) / total
	return bbInformation{
		value, (slope + up.slope - down.slope) / total,
		(shape+up.shape+down.shape)/total - value*(rise+up.rise+down.rise)/total,
	}
}

// bbOutcomes holds sums over outcomes of their probabilities f, of f s^2 with s = dl/deta, of f ds^2/deta + f s^3, of the
// derivative of f s^2 in log t, and of that of log f.
type bbOutcomes struct{ total, square, slope, shape, rise float64 }

// outcomesAbove sums over the outcomes y+1 .. m, with r the row at y and f = 1 there.
func (d BetaBinomial) outcomesAbove(y, m float64, r bbRow) (sum bbOutcomes) {
	t, p, q := d.step(), r.p, r.q
	up, down := climb(t, p), climb(t, q)
	oneTop := p >= t && q >= t // probabilities rise to one top only, so far from it there is nothing more to find
	yesInverse, yesLean, noInverse, noLean, rise := r.yes.inverse, r.yes.lean, r.no.inverse, r.no.lean, r.rise()
	for f := 1.0; y < m; y++ {
		last := m - y - 1
		f *= (m - y) * (p + y*t) / ((y + 1) * (q + last*t))
		x, z := y*up, last*down
		g, h := 1/(1+x), 1/(1+z)
		x *= g
		z *= h
		yesInverse += g
		yesLean += x * g
		noInverse -= h
		noLean -= z * h
		rise += x - z
		s := q*yesInverse - p*noInverse
		w := p*q*(yesInverse+noInverse) - q*q*yesLean - p*p*noLean
		fs := f * s
		sum.total += f
		sum.square += fs * s
		sum.slope += fs * (s*s - 2*w)
		sum.shape += fs * (2*(p*noLean-q*yesLean) + s*rise)
		sum.rise += f * rise
		if oneTop && f < 1e-18 && fs*s < 1e-18*sum.square {
			break
		}
	}
	return sum
}

// CDF returns the distribution function below and at the number positive, as a sum of probabilities on one side of it.
// Where they have a single top the side is the one away from it, else the shorter one, summed from its end inwards.
func (d BetaBinomial) CDF(o Obs, eta, _ float64) (below, upTo float64) {
	at, t := shareAt(eta), d.step()
	m, y := o.Trials, o.Y
	if at.p >= t && at.q >= t {
		own := math.Exp(d.logProbability(y, m, at))
		if y < m*at.p {
			return fromBelow(d.below(y, m, at.p, at.q, own), own)
		}
		return fromAbove(d.below(m-y, m, at.q, at.p, own), own)
	}
	if y <= m/2 {
		return fromBelow(d.fromEnd(y, m, at))
	}
	return fromAbove(d.fromEnd(m-y, m, at.mirrored()))
}

// below returns P(Y < y) given P(Y = y), for probabilities that fall towards 0.
func (d BetaBinomial) below(y, m, p, q, own float64) (sum float64) {
	t := d.step()
	for k, f := y, own; k > 0 && f > 1e-18*sum+leastProbability; k-- {
		f *= k * (q + (m-k)*t) / ((m - k + 1) * (p + (k-1)*t))
		sum += f
	}
	return sum
}

// fromEnd returns P(Y < y) and P(Y = y), counted up from P(Y = 0).
func (d BetaBinomial) fromEnd(y, m float64, at share) (sum, f float64) {
	t := d.step()
	f = math.Exp(d.logProbability(0, m, at))
	for k := 0.0; k < y; k++ {
		sum += f
		f *= (m - k) * (at.p + k*t) / ((k + 1) * (at.q + (m-k-1)*t))
	}
	return sum, f
}
