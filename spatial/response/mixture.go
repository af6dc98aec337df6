package response

import "math"

// Mixture is the linear predictor of a row that is a set of points: with h the inverse of the link g and s the points'
// shares, the row's mean is that of its points, and so
//
//	L = g(sum_q s_q h(eta_q)),
//
// the composite link (Thompson & Baker 1981, Appl. Statist. 30:125-131). Its derivatives come as ratios to h'(L), which
// neither overflow nor underflow together with the means.
type Mixture struct {
	Linear    float64   // L
	Bend      float64   // k = -h''(L)/h'(L)
	BendSlope float64   // dk/dL
	First     []float64 // p_q = s_q h'(eta_q)/h'(L) = dL/deta_q
	Second    []float64 // c_q = s_q h''(eta_q)/h'(L), so that dp_q = k p_q dL + c_q deta_q
	Third     []float64 // t_q = s_q h'''(eta_q)/h'(L), so that dc_q = k c_q dL + t_q deta_q
}

// Mixer composes the linear predictors of points.
type Mixer interface {
	// MixTo writes the mixture of points with the given shares, which sum to one, and linear predictors to m. Slices of m
	// are used again where they are long enough.
	MixTo(m *Mixture, share, eta []float64)
}

// MixerOf returns the mixer of a link. It panics for a word that is no link's.
func MixerOf(link string) Mixer {
	switch link {
	case "identity":
		return identityMixer{}
	case "log":
		return logMixer{}
	case "logit":
		return logitMixer{}
	case "complementary-log-log":
		return cloglogMixer{}
	}
	panic("response: no such link")
}

// reset makes room for n points.
func (m *Mixture) reset(n int) {
	if cap(m.First) < n {
		m.First, m.Second, m.Third = make([]float64, n), make([]float64, n), make([]float64, n)
	}
	m.First, m.Second, m.Third = m.First[:n], m.Second[:n], m.Third[:n]
	m.Linear, m.Bend, m.BendSlope = 0, 0, 0
}

// set writes the q-th point's derivatives, second and third those of h over its first. A point that has no part in the
// row has none in its derivatives either, however large its own ratios.
func (m *Mixture) set(q int, first, second, third float64) {
	m.First[q], m.Second[q], m.Third[q] = first, first*second, first*third
	if first == 0 {
		m.Second[q], m.Third[q] = 0, 0
	}
}

type identityMixer struct{}

// MixTo averages.
func (identityMixer) MixTo(m *Mixture, share, eta []float64) {
	m.reset(len(eta))
	for q, s := range share {
		m.Linear += s * eta[q]
		m.set(q, s, 0, 0)
	}
}

type logMixer struct{}

// MixTo takes the largest point out, so that L is a sum of terms that do not overflow; h' = h” = h”'.
func (logMixer) MixTo(m *Mixture, share, eta []float64) {
	m.reset(len(eta))
	most, sum := math.Inf(-1), 0.0
	for _, e := range eta {
		most = math.Max(most, e)
	}
	for q, s := range share {
		m.First[q] = s * math.Exp(eta[q]-most)
		sum += m.First[q]
	}
	m.Linear, m.Bend = most+math.Log(sum), -1
	for q, p := range m.First {
		m.set(q, p/sum, 1, 1)
	}
}

type logitMixer struct{}

// MixTo keeps the mean probability P and Q = 1 - P apart, each a sum of positive terms. h' = p q, h”/h' = q - p and
// h”'/h' = 1 - 6 p q.
func (logitMixer) MixTo(m *Mixture, share, eta []float64) {
	m.reset(len(eta))
	var P, Q float64
	for q, s := range share {
		p, rest := logistic(eta[q])
		P += s * p
		Q += s * rest
	}
	m.Linear, m.Bend, m.BendSlope = math.Log(P)-math.Log(Q), P-Q, 2*P*Q
	for q, s := range share {
		p, rest := logistic(eta[q])
		m.set(q, s*(p/P)*(rest/Q), rest-p, 1-6*p*rest)
	}
}

type cloglogMixer struct{}

// MixTo works with mu = exp(eta), the mean number of events: that of the row is M = -log(sum_q s_q exp(-mu_q)), in which
// the least mu is taken out, so that nothing is lost where all are small or all large. h' = mu exp(-mu), h”/h' = 1 - mu
// and h”'/h' = (1 - mu)^2 - mu.
func (cloglogMixer) MixTo(m *Mixture, share, eta []float64) {
	m.reset(len(eta))
	least := math.Inf(1)
	for _, e := range eta {
		least = math.Min(least, math.Exp(e))
	}
	above := 0.0 // sum_q s_q exp(-(mu_q - least)), less 1
	for q, s := range share {
		above += s * math.Expm1(least-math.Exp(eta[q]))
	}
	M := least - math.Log1p(above)
	m.Linear, m.Bend, m.BendSlope = math.Log(M), M-1, M
	for q, s := range share {
		mu := math.Exp(eta[q])
		m.set(q, s*math.Exp(least-mu)/(1+above)*(mu/M), 1-mu, (1-mu)*(1-mu)-mu)
	}
}
