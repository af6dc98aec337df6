package spatial

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"gonum.org/v1/gonum/mat"
	"gonum.org/v1/gonum/stat/distuv"
)

func compare(t testing.TB, list []Candidate, d Data, o Options) []Comparison {
	t.Helper()
	rows, err := Compare(context.Background(), list, d, o, nil)
	if err != nil {
		t.Fatal(err)
	}
	if len(rows) != len(list) {
		t.Fatalf("%d rows for %d candidates", len(rows), len(list))
	}
	return rows
}

// why returns the reason for a missing figure, or empty.
func (r Comparison) why(figure string) string {
	for _, m := range r.Missing {
		if m.Figure == figure {
			return m.Reason
		}
	}
	return ""
}

// atStations gives n rows at ten stations, so that the blocks are known: a station each.
func atStations(n int, random *rand.Rand) (d Data, station []int) {
	u := Covariate{Name: "u"}
	for i := 0; i < n; i++ {
		k := i * 7 % 10
		station = append(station, k)
		d.Places.X, d.Places.Y = append(d.Places.X, float64(k%5)), append(d.Places.Y, 3*float64(k/5))
		u.Number = append(u.Number, random.NormFloat64())
	}
	d.Covariates = []Covariate{u}
	return d, station
}

// ratioError is the standard error of a mean from ten stations' totals, as in the books on sampling.
func ratioError(v []float64, station []int) (mean, se float64) {
	n := float64(len(v))
	for _, x := range v {
		mean += x / n
	}
	for k := 0; k < 10; k++ {
		rest := 0.0
		for i, x := range v {
			if station[i] == k {
				rest += x - mean
			}
		}
		se += rest * rest
	}
	return mean, math.Sqrt(se*10/9) / n
}

// TestLogScoreByBruteForce leaves out one station after the other by the test's own means: least squares with the
// unbiased variance for the normal distribution, the ratio of totals for counts.
func TestLogScoreByBruteForce(t *testing.T) {
	random := rand.New(rand.NewPCG(31, 1))
	const n = 47
	d, station := atStations(n, random)
	for i := 0; i < n; i++ {
		d.Response = append(d.Response, 1+0.7*d.Covariates[0].Number[i]+0.3*float64(station[i]%3)+0.4*random.NormFloat64())
	}
	line := Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "u", Role: Linear}}}
	level := Model{Distribution: "gaussian", Surface: None}
	score := func(slope bool) []float64 {
		s := make([]float64, n)
		for k := 0; k < 10; k++ {
			var x, y []float64
			rows := 0
			for i := range station {
				if station[i] != k {
					x, y, rows = append(x, 1), append(y, d.Response[i]), rows+1
					if slope {
						x = append(x, d.Covariates[0].Number[i])
					}
				}
			}
			a := mat.NewDense(rows, len(x)/rows, x)
			var b, fitted mat.VecDense
			if err := b.SolveVec(a, mat.NewVecDense(rows, y)); err != nil {
				t.Fatal(err)
			}
			fitted.MulVec(a, &b)
			rss := 0.0
			for i, v := range y {
				rss += sq(v - fitted.AtVec(i))
			}
			sigma := math.Sqrt(rss / float64(rows-b.Len()))
			for i := range station {
				if station[i] == k {
					mean := b.AtVec(0)
					if slope {
						mean += b.AtVec(1) * d.Covariates[0].Number[i]
					}
					s[i] = distuv.Normal{Mu: mean, Sigma: sigma}.LogProb(d.Response[i])
				}
			}
		}
		return s
	}
	rows := compare(t, []Candidate{{Name: "line", Model: line}, {Name: "level", Model: level}}, d, Options{})
	own, other := score(true), score(false)
	check := func(what string, got, gotSE float64, v []float64) {
		t.Helper()
		mean, se := ratioError(v, station)
		near(t, what, got, mean, 1e-10)
		near(t, what+", its error", gotSE, se, 1e-10)
	}
	check("line", rows[0].LogScore, rows[0].LogScoreSE, own)
	check("level", rows[1].LogScore, rows[1].LogScoreSE, other)
	difference := make([]float64, n)
	for i := range own {
		difference[i] = other[i] - own[i]
	}
	check("difference", rows[1].Difference, rows[1].DifferenceSE, difference)
	if r := rows[0]; r.Difference != 0 || r.DifferenceSE != 0 || r.Blocks != 10 || r.Scored != n || r.LeftOut != 0 || len(r.Missing) != 0 {
		t.Errorf("%+v", r)
	}

	c := Data{Places: d.Places, Exposure: make([]float64, n), Response: make([]float64, n)}
	for i := range station {
		c.Exposure[i] = 0.5 + 3*random.Float64()
		c.Response[i] = distuv.Poisson{Lambda: 2 * c.Exposure[i], Src: random}.Rand()
	}
	want := make([]float64, n)
	for k := 0; k < 10; k++ {
		cases, exposure := 0.0, 0.0
		for i := range station {
			if station[i] != k {
				cases, exposure = cases+c.Response[i], exposure+c.Exposure[i]
			}
		}
		for i := range station {
			if station[i] == k {
				want[i] = distuv.Poisson{Lambda: c.Exposure[i] * cases / exposure}.LogProb(c.Response[i])
			}
		}
	}
	p := compare(t, []Candidate{{Name: "level", Model: Model{Distribution: "poisson", Surface: None}}}, c, Options{})[0]
	check("counts", p.LogScore, p.LogScoreSE, want)
}

// TestLogScoreChoosesTheTruth: a smooth truth is told from none, spread counts from plain ones, by more than twice the
// difference's error; where there is nothing to tell the scores are even.
func TestLogScoreChoosesTheTruth(t *testing.T) {
	d := sample("gaussian", 250, 41)
	rows := compare(t, []Candidate{
		{Name: "surface", Model: Model{Distribution: "gaussian", MaxKnots: 60}},
		{Name: "none", Model: Model{Distribution: "gaussian", Surface: None}},
	}, d, Options{})
	if r := rows[1]; !(r.Difference < -2*r.DifferenceSE) || !(r.AIC > rows[0].AIC+20) {
		t.Errorf("without a surface: difference %g, error %g, AIC %g and %g", r.Difference, r.DifferenceSE, r.AIC, rows[0].AIC)
	}
	flat := replaced(d, func(i int, _, _ float64) float64 { return math.Sin(float64(i * i)) }) // no surface at all
	rows = compare(t, []Candidate{
		{Name: "surface", Model: Model{Distribution: "gaussian", MaxKnots: 60}},
		{Name: "none", Model: Model{Distribution: "gaussian", Surface: None}},
	}, flat, Options{})
	if r := rows[1]; !(r.Difference > -0.005) {
		t.Errorf("nothing to map: without a surface the score is %g, error %g", r.Difference, r.DifferenceSE)
	}

	random := rand.New(rand.NewPCG(42, 1))
	plain, spread := sample("poisson", 300, 43), sample("poisson", 300, 43)
	for i := range spread.Response { // theta 1.5
		mu := spread.Exposure[i] * math.Exp(0.3+franke(spread.Places.X[i], spread.Places.Y[i]))
		plain.Response[i] = distuv.Poisson{Lambda: mu, Src: random}.Rand()
		spread.Response[i] = distuv.Poisson{Lambda: mu * gammaDraw(random, 1.5) / 1.5, Src: random}.Rand()
	}
	both := []Candidate{{Name: "poisson", Model: Model{Distribution: "poisson", MaxKnots: 50}}, {Name: "negative-binomial", Model: Model{Distribution: "negative-binomial", MaxKnots: 50}}}
	rows = compare(t, both, spread, Options{})
	if r := rows[1]; !(r.Difference > 2*r.DifferenceSE) || !(r.AIC < rows[0].AIC-20) || !(r.RestrictedLikelihood < rows[0].RestrictedLikelihood-10) {
		t.Errorf("spread counts: %+v beside %+v", r, rows[0])
	}
	rows = compare(t, both, plain, Options{})
	if r := rows[1]; !(math.Abs(r.Difference) < 2*r.DifferenceSE) || !(r.AIC > rows[0].AIC) {
		t.Errorf("plain counts: %+v beside %+v", r, rows[0])
	}
}

// TestComparisonOfUnits: in another unit every row's log density moves by the logarithm of the unit, and places in
// another unit or order change nothing.
func TestComparisonOfUnits(t *testing.T) {
	d := sample("gaussian", 120, 51)
	for i := 0; i < 30; i++ { // rows that share a place
		d.Places.X[i], d.Places.Y[i] = d.Places.X[40+i], d.Places.Y[40+i]
	}
	list := []Candidate{{Name: "surface", Model: Model{Distribution: "gaussian", MaxKnots: 40}}, {Name: "none", Model: Model{Distribution: "gaussian", Surface: None}}}
	a := compare(t, list, d, Options{})
	const unit = 1000
	e := Data{}
	for i := range d.Response {
		j := (i*37 + 11) % len(d.Response)
		e.Response = append(e.Response, unit*d.Response[j])
		e.Places.X, e.Places.Y = append(e.Places.X, 4e5+1e3*d.Places.X[j]), append(e.Places.Y, 1e3*d.Places.Y[j])
	}
	b := compare(t, list, e, Options{})
	for k := range a {
		near(t, "log score", b[k].LogScore, a[k].LogScore-math.Log(unit), 1e-6)
		near(t, "its error", b[k].LogScoreSE, a[k].LogScoreSE, 1e-6)
		near(t, "difference", b[k].Difference, a[k].Difference, 1e-6)
		near(t, "its error", b[k].DifferenceSE, a[k].DifferenceSE, 1e-6)
		near(t, "share of the deviance", b[k].DevianceShare, a[k].DevianceShare, 1e-8)
	}
}

// TestComparisonOfWorkers: every bit is the same whatever the number of workers.
func TestComparisonOfWorkers(t *testing.T) {
	d := simulated(220, 52)
	list := []Candidate{
		{Name: "one", Model: Model{Distribution: "gaussian", MaxKnots: 30, Effects: []Effect{{Name: "site", Role: Group}, {Name: "depth", Role: Curve}}}},
		{Name: "two", Model: Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "soil", Role: Category}}}},
	}
	a, b := compare(t, list, d, Options{Workers: 1}), compare(t, list, d, Options{Workers: 3})
	for k := range a {
		x, y := a[k], b[k]
		sameBits(t, "figures", []float64{x.AIC, x.AICCorrected, x.RestrictedLikelihood, x.DevianceShare, x.DF, x.LogScore, x.LogScoreSE, x.Difference, x.DifferenceSE},
			[]float64{y.AIC, y.AICCorrected, y.RestrictedLikelihood, y.DevianceShare, y.DF, y.LogScore, y.LogScoreSE, y.Difference, y.DifferenceSE})
	}
	if !(a[0].AICCorrected > a[0].AIC) || a[1].AICCorrected != a[1].AIC {
		t.Errorf("corrected AIC %g of %g; without a penalty %g of %g", a[0].AICCorrected, a[0].AIC, a[1].AICCorrected, a[1].AIC)
	}
}

// TestRestrictedLikelihoodsThatCompare says for each candidate why its restricted likelihood cannot be held against the
// first one's, or that it can.
func TestRestrictedLikelihoodsThatCompare(t *testing.T) {
	d := simulated(150, 53)
	for i, v := range d.Response { // positive, so that several distributions go
		d.Response[i] = math.Exp(v / 3)
	}
	with := func(change func(*Model)) Model {
		m := Model{Distribution: "gaussian", MaxKnots: 20, Effects: []Effect{{Name: "depth", Role: Linear}, {Name: "soil", Role: Category}}}
		change(&m)
		return m
	}
	cases := []struct {
		name string
		m    Model
		want string // why not; empty if it compares
	}{
		{"first", with(func(m *Model) {}), ""},
		{"more knots", with(func(m *Model) { m.MaxKnots = 35 }), ""},
		{"a group more", with(func(m *Model) { m.Effects = append(m.Effects, Effect{Name: "site", Role: Group}) }), ""},
		{"a curve for the slope", with(func(m *Model) { m.Effects[0].Role = Curve }), ""},
		{"effects in another order", with(func(m *Model) { m.Effects[0], m.Effects[1] = m.Effects[1], m.Effects[0] }), ""},
		{"a given smoothness", with(func(m *Model) { m.Smoothness = given(0.1) }), ""},
		{"gamma by identity", with(func(m *Model) { m.Distribution = "gamma" }), "the link is log, that of the first candidate identity"},
		{"log link", with(func(m *Model) { m.Link = "log" }), "the link is log, that of the first candidate identity"},
		{"no category", with(func(m *Model) { m.Effects = m.Effects[:1] }), "without a penalty it has 1 + depth + x + y, the first candidate 1 + depth + soil=loam + soil=sand + x + y"},
		{"no surface", with(func(m *Model) { m.Surface = None }), "without a penalty it has 1 + depth + soil=loam + soil=sand, the first candidate 1 + depth + soil=loam + soil=sand + x + y"},
		{"cross-validation", with(func(m *Model) { m.Smoothness.Method = GCV }), "cross-validation chose the smoothness"},
	}
	var list []Candidate
	for _, c := range cases {
		list = append(list, Candidate{Name: c.name, Model: c.m})
	}
	for k, r := range compare(t, list, d, Options{}) {
		c := cases[k]
		if got := r.why(FigureRestrictedLikelihood); got != c.want || (got == "") == math.IsNaN(r.RestrictedLikelihood) {
			t.Errorf("%s: %g, %q", c.name, r.RestrictedLikelihood, got)
		}
		if bad(r.AIC) || bad(r.LogScore) || bad(r.Difference) {
			t.Errorf("%s: AIC %g, log score %g, difference %g: %v", c.name, r.AIC, r.LogScore, r.Difference, r.Missing)
		}
		if c.name == "a given smoothness" && r.AICCorrected != r.AIC || c.name == "cross-validation" && r.why(FigureAICCorrected) == "" {
			t.Errorf("%s: AIC %g, corrected %g: %v", c.name, r.AIC, r.AICCorrected, r.Missing)
		}
	}

	// Surfaces that may vanish have the constant alone without a penalty, as no surface at all does, and surfaces per level
	// that may have the category's steps.
	d.Response = simulated(150, 53).Response
	one := compare(t, []Candidate{
		{Name: "none", Model: Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "soil", Role: Category}}}},
		{Name: "one", Model: Model{Distribution: "gaussian", MaxKnots: 20, Shrink: true, Effects: []Effect{{Name: "soil", Role: Category}}}},
		{Name: "three", Model: Model{Distribution: "gaussian", MaxKnots: 20, Shrink: true, SurfacePer: "soil"}},
	}, d, Options{})
	if !(one[1].RestrictedLikelihood < one[0].RestrictedLikelihood-5) || bad(one[2].RestrictedLikelihood) {
		t.Errorf("none %g, one %g, a surface each %g", one[0].RestrictedLikelihood, one[1].RestrictedLikelihood, one[2].RestrictedLikelihood)
	}
}

// TestRestrictedLikelihoodOfALine: a curve that the data flatten is the slope, and its restricted likelihood that of the
// slope in the covariate's own unit.
func TestRestrictedLikelihoodOfALine(t *testing.T) {
	d := simulated(100, 54)
	z := d.Covariates[0]
	for i, v := range z.Number {
		z.Number[i] = 250 * v
		d.Response[i] = 3*v + math.Sin(float64(7*i*i))
	}
	rows := compare(t, []Candidate{
		{Name: "slope", Model: Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "depth", Role: Linear}}}},
		{Name: "curve", Model: Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: "depth", Role: Curve}}}},
	}, d, Options{})
	near(t, "degrees of freedom", rows[1].DF, rows[0].DF, 1e-4)
	near(t, "restricted likelihood", rows[1].RestrictedLikelihood, rows[0].RestrictedLikelihood, 1e-4)
	near(t, "difference of the log scores", rows[1].Difference, 0, 0.02) // not every block's fit is flat
}

// TestComparisonGoesOn: candidates that cannot be fitted, or not be scored, say why beside the others.
func TestComparisonGoesOn(t *testing.T) {
	d := simulated(160, 55)
	soil := &d.Covariates[1]
	soil.Level = append(soil.Level, "peat")
	rare := 0
	for i := range d.Response {
		if math.Hypot(d.Places.X[i]-0.1, d.Places.Y[i]-0.1) < math.Hypot(d.Places.X[rare]-0.1, d.Places.Y[rare]-0.1) {
			rare = i
		}
	}
	soil.Code[rare] = 3 // once
	site := &d.Covariates[2]
	site.Level = append(site.Level, "alone")
	site.Code[rare] = 12
	east := Covariate{Name: "side", Level: []string{"west", "east"}, Code: make([]int32, 160)}
	far := 0
	for i, x := range d.Places.X {
		if x > d.Places.X[far] {
			far = i
		}
	}
	east.Code[far] = 1 // without its block there is one side only
	d.Covariates = append(d.Covariates, east)
	category := func(name string) Model {
		return Model{Distribution: "gaussian", Surface: None, Effects: []Effect{{Name: name, Role: Category}}}
	}
	group := Model{Distribution: "gaussian", MaxKnots: 20, Effects: []Effect{{Name: "site", Role: Group}}}
	rows := compare(t, []Candidate{{Name: "group", Model: group}, {Name: "no such word", Model: Model{Distribution: "normal"}}, {Name: "missing", Model: category("rock")},
		{Name: "rare", Model: category("soil")}, {Name: "side", Model: category("side")}, {Name: "counts", Model: Model{Distribution: "poisson"}},
		{Name: "unknown kind", Model: Model{Distribution: "gaussian", Surface: None, Shape: new(float64)}}}, d, Options{})
	for k, want := range map[int]string{1: `there is no distribution "normal"`, 2: `there is no covariate "rock"`, 5: "row ", 6: "the gaussian distribution has no shape to be given"} {
		r := rows[k]
		if !strings.Contains(r.why(FigureFit), want) || !math.IsNaN(r.AIC) || !math.IsNaN(r.LogScore) || !math.IsNaN(r.DF) || len(r.Missing) != 1 {
			t.Errorf("%s: %+v", r.Name, r)
		}
	}
	if r := rows[4]; !strings.Contains(r.why(FigureLogScore), `of 10: covariate "side" has one level only, "west"`) || bad(r.AIC) || !math.IsNaN(r.LogScore) || r.why(FigureDifference) == "" {
		t.Errorf("side: %+v", r)
	}
	// The rare level cannot be scored under its category, and is left out under the group as well, where it could be.
	for _, k := range []int{0, 3} {
		if r := rows[k]; r.LeftOut != 1 || r.Scored != 159 || bad(r.LogScore) || bad(r.DifferenceSE) {
			t.Errorf("%s: %+v", r.Name, r)
		}
	}
	if r := compare(t, []Candidate{{Name: "group", Model: group}}, d, Options{})[0]; r.LeftOut != 0 || r.Scored != 160 || bad(r.LogScore) {
		t.Errorf("group alone: %+v", r)
	}

	rows = compare(t, []Candidate{{Name: "missing", Model: category("rock")}, {Name: "rare", Model: category("soil")}}, d, Options{})
	if r := rows[1]; bad(r.LogScore) || bad(r.AIC) || !math.IsNaN(r.Difference) || r.why(FigureRestrictedLikelihood) != "the first candidate could not be fitted" {
		t.Errorf("after a first one that cannot be fitted: %+v", r)
	}
}

// TestComparisonOfMeasures: probabilities are not held against densities, nor a fit without a likelihood against any.
func TestComparisonOfMeasures(t *testing.T) {
	d := sample("poisson", 90, 56)
	d.Exposure = nil
	rows := compare(t, []Candidate{
		{Name: "poisson", Model: Model{Distribution: "poisson", MaxKnots: 20}},
		{Name: "gaussian", Model: Model{Distribution: "gaussian", Link: "log", MaxKnots: 20}},
		{Name: "scaled", Model: Model{Distribution: "poisson", MaxKnots: 20, ScaleVariation: true}},
	}, d, Options{})
	for _, r := range rows[1:] {
		for figure, v := range map[string]float64{FigureAIC: r.AIC, FigureAICCorrected: r.AICCorrected, FigureRestrictedLikelihood: r.RestrictedLikelihood, FigureLogScore: r.LogScore, FigureDifference: r.Difference} {
			if !math.IsNaN(v) || r.why(figure) == "" {
				t.Errorf("%s: %s is %g, %q", r.Name, figure, v, r.why(figure))
			}
		}
		if bad(r.DF) || bad(r.DevianceShare) {
			t.Errorf("%s: %+v", r.Name, r)
		}
	}
	if got := rows[1].why(FigureAIC); got != "likelihoods of poisson (probabilities of whole numbers) and gaussian (densities) are not on one scale" {
		t.Error(got)
	}
	// Amounts with a zero and without one.
	for i := range d.Response {
		d.Response[i] += 0.5
	}
	list := []Candidate{{Name: "gamma", Model: Model{Distribution: "gamma", MaxKnots: 20}}, {Name: "tweedie", Model: Model{Distribution: "tweedie", MaxKnots: 20}}, {Name: "gaussian", Model: Model{Distribution: "gaussian", MaxKnots: 20}}}
	if rows = compare(t, list, d, Options{}); bad(rows[1].Difference) || bad(rows[2].Difference) || bad(rows[1].RestrictedLikelihood) || !math.IsNaN(rows[2].RestrictedLikelihood) {
		t.Errorf("without a zero: %+v", rows)
	}
	d.Response[3] = 0
	if rows = compare(t, list[1:], d, Options{}); !math.IsNaN(rows[1].AIC) || !math.IsNaN(rows[1].LogScore) {
		t.Errorf("with a zero: %+v", rows)
	}
	// One place: no blocks.
	here := Data{Response: d.Response, Places: Places{X: make([]float64, 90), Y: make([]float64, 90)}}
	if r := compare(t, []Candidate{{Name: "none", Model: Model{Distribution: "gaussian", Surface: None}}}, here, Options{})[0]; bad(r.AIC) || r.why(FigureLogScore) != "all rows lie at one place: there are no blocks to leave out" {
		t.Errorf("one place: %+v", r)
	}
}

// TestComparisonStops for a cancelled context and for a panic, which are nobody's candidate's fault.
func TestComparisonStops(t *testing.T) {
	d := sample("gaussian", 60, 57)
	list := []Candidate{{Name: "none", Model: Model{Distribution: "gaussian", Surface: None}}}
	ctx, cancel := context.WithCancel(context.Background())
	calls := 0
	_, err := Compare(ctx, list, d, Options{Workers: 1}, func(ctx context.Context, m Model, d Data, o Options) (*Surface, error) {
		if calls++; calls == 4 {
			cancel()
		}
		return Fit(ctx, m, d, o)
	})
	if !errors.Is(err, context.Canceled) || calls > 5 {
		t.Errorf("cancelled in its fourth fit: %v after %d", err, calls)
	}
	calls = 0
	_, err = Compare(context.Background(), list, d, Options{Workers: 1}, func(ctx context.Context, m Model, d Data, o Options) (*Surface, error) {
		if calls++; calls == 2 {
			panic("lost")
		}
		if o.Workers != 1 {
			t.Errorf("%d workers", o.Workers)
		}
		return Fit(ctx, m, d, o)
	})
	if err == nil || err.Error() != "internal error: lost" {
		t.Errorf("a panic: %v", err)
	}
	if rows, err := Compare(context.Background(), nil, d, Options{}, nil); err != nil || len(rows) != 0 {
		t.Errorf("no candidates: %v, %v", rows, err)
	}
}

// TestSpatialBlocks: about equally many rows each, places kept together, neighbours together, whatever the order.
func TestSpatialBlocks(t *testing.T) {
	random := rand.New(rand.NewPCG(58, 1))
	at := scattered(403, random)
	for i := range at.X {
		at.X[i] *= 3
	}
	for i := 0; i < 100; i++ {
		at.X[i], at.Y[i] = at.X[100+i%20], at.Y[100+i%20]
	}
	block, count := spatialBlocks(at, 10)
	size := make([]int, count)
	var within, between float64
	for i, b := range block {
		size[b]++
		j := random.IntN(len(block))
		if d := math.Hypot(at.X[i]-at.X[j], at.Y[i]-at.Y[j]); block[j] == b {
			within = math.Max(within, d)
		} else {
			between = math.Max(between, d)
		}
		for k := range block {
			if at.X[k] == at.X[i] && at.Y[k] == at.Y[i] && block[k] != b {
				t.Fatal("rows of one place in two blocks")
			}
		}
	}
	if count != 10 || !(within < between/2) {
		t.Errorf("%d blocks; farthest apart within %g, in all %g", count, within, between)
	}
	for b, n := range size {
		if n < 30 || n > 51 {
			t.Errorf("%d of 403 rows in block %d", n, b)
		}
	}
	turned := Places{X: make([]float64, 403), Y: make([]float64, 403)}
	for i := range at.X {
		turned.X[402-i], turned.Y[402-i] = at.X[i], at.Y[i]
	}
	again, _ := spatialBlocks(turned, 10)
	for i, b := range block {
		if again[402-i] != b {
			t.Fatal("another order of rows gives other blocks")
		}
	}
	if block, count := spatialBlocks(Places{X: []float64{1, 1, 2, 1}, Y: []float64{0, 0, 0, 0}}, 10); count != 2 || block[0] != block[1] || block[0] == block[2] {
		t.Errorf("two places: %d blocks, %v", count, block)
	}
	if _, count := spatialBlocks(Places{}, 10); count != 0 {
		t.Errorf("no places: %d blocks", count)
	}
}
