package batch

import (
	"bytes"
	"fmt"
	"math"
	"math/rand/v2"
	"strings"
	"testing"

	"drumlin/io/plan"
	"drumlin/io/summary"

	"github.com/google/go-cmp/cmp"
	"gonum.org/v1/gonum/stat/distuv"
	"pgregory.net/rapid"
)

// missing is what a fitted region has where a figure has no meaning.
var missing = summary.Number(math.NaN())

// measured is a region with a mean between limits.
func measured(name, link string, mean, lower, upper float64) Outcome {
	return Outcome{Region: name, Folder: name, Status: Done, Figures: Figures{
		Observations: 50, DegreesOfFreedom: 8, DevianceShare: 0.4, Distribution: "poisson", Response: "gulls", Unit: "gulls per km2", Per: 1,
		Link: link, Confidence: 0.95, Total: missing, TotalCV: missing, TotalLower: missing, TotalUpper: missing,
		Mean: summary.Number(mean), MeanCV: 0.1, MeanLower: summary.Number(lower), MeanUpper: summary.Number(upper), WorstLevel: summary.Clear,
	}}
}

// The whole file, by hand. Ranks are among a, b and d only: c is not to be used, e failed, f counts something else. The
// intervals of a and d overlap, that of b lies above both by far.
func TestWriteRegions(t *testing.T) {
	list := []Outcome{
		measured("a", plan.Log, 10, 9, 11.1),
		measured("b", plan.Log, 40, 38, 42.1),
		measured("c", plan.Log, 900, 800, 1000),
		measured("d", plan.Log, 9.5, 8.5, 10.6),
		{Region: "=e,1", Folder: "e-1", Status: Failed, Reason: `no column "gulls"`},
		measured("f", plan.Log, 20, 19, 21),
	}
	list[0].Figures.Total, list[0].Figures.TotalCV, list[0].Figures.TotalLower, list[0].Figures.TotalUpper = 100, 0.05, 90, 111
	list[1].Status, list[1].Figures.WorstLevel, list[1].Figures.WorstCheck, list[1].Figures.SetAside = Look, summary.Look, "spread", 2
	list[2].Status, list[2].Figures.WorstLevel, list[2].Figures.WorstCheck = Stop, summary.Stop, "convergence"
	list[5].Figures.Response = "terns"
	var b bytes.Buffer
	if err := WriteRegions(&b, list); err != nil {
		t.Fatal(err)
	}
	want := `region,folder,status,reason,observations,set_aside,distribution,degrees_of_freedom,deviance_share,unit,` +
		`total,total_cv,total_lower,total_upper,mean,mean_cv,mean_lower,mean_upper,rank,rank_lower,rank_upper,ranked_among,worst_level,worst_check
a,a,done,,50,0,poisson,8,0.4,gulls per km2,100,0.05,90,111,10,0.1,9,11.1,2,2,3,3,clear,
b,b,look,,50,2,poisson,8,0.4,gulls per km2,,,,,40,0.1,38,42.1,1,1,1,3,look,spread
c,c,stop,,50,0,poisson,8,0.4,gulls per km2,,,,,900,0.1,800,1000,,,,,stop,convergence
d,d,done,,50,0,poisson,8,0.4,gulls per km2,,,,,9.5,0.1,8.5,10.6,3,2,3,3,clear,
"'=e,1",e-1,failed,"no column ""gulls""",,,,,,,,,,,,,,,,,,,,
f,f,done,,50,0,poisson,8,0.4,gulls per km2,,,,,20,0.1,19,21,,,,,clear,
`
	if diff := cmp.Diff(want, b.String()); diff != "" {
		t.Error(diff)
	}
	b.Reset()
	if err := WriteRegions(&b, nil); err != nil || strings.Count(b.String(), "\n") != 1 {
		t.Errorf("without regions: %q, %v", b.String(), err)
	}
}

func TestNotRanked(t *testing.T) {
	good := measured("good", plan.Log, 10, 9, 11)
	for name, change := range map[string]func(*Outcome){
		"failed":              func(o *Outcome) { o.Status = Failed },
		"stop":                func(o *Outcome) { o.Status = Stop },
		"another response":    func(o *Outcome) { o.Figures.Response = "terns" },
		"another unit":        func(o *Outcome) { o.Figures.Unit = "gulls per ha" },
		"another link":        func(o *Outcome) { o.Figures.Link = plan.Identity },
		"a link of no name":   func(o *Outcome) { o.Figures.Link = "" },
		"no mean":             func(o *Outcome) { o.Figures.Mean = missing },
		"no lower limit":      func(o *Outcome) { o.Figures.MeanLower = missing },
		"no upper limit":      func(o *Outcome) { o.Figures.MeanUpper = missing },
		"mean beyond a limit": func(o *Outcome) { o.Figures.MeanUpper = 9.5 },
		"mean infinite": func(o *Outcome) {
			o.Figures.Mean, o.Figures.MeanUpper = summary.Number(math.Inf(1)), summary.Number(math.Inf(1))
		},
		"below 0 on a log":     func(o *Outcome) { o.Figures.MeanLower = -1 },
		"no confidence":        func(o *Outcome) { o.Figures.Confidence = missing },
		"a confidence of 1":    func(o *Outcome) { o.Figures.Confidence = 1 },
		"a share without unit": func(o *Outcome) { o.Figures.Link, o.Figures.Per = plan.Logit, 0 },
		"a share above all":    func(o *Outcome) { o.Figures.Link, o.Figures.Per = plan.Logit, 10.5 },
	} {
		bad := good
		change(&bad)
		if got := standings([]Outcome{good, bad}); got[0].among != 0 || got[1].among != 0 {
			t.Errorf("%s: ranked %v", name, got)
		}
		want := standing{1, 1, 2, 2}
		if got := standings([]Outcome{good, bad, good}); got[0] != want || got[2] != want || got[1].among != 0 {
			t.Errorf("%s: beside two good ones %v", name, got)
		}
	}
}

// Limits stretched from 0.95 to a joint level are those made at that level outright, on every link's own scale. The
// quantiles are written out with gonum's distributions.
func TestStretched(t *testing.T) {
	const tail = 0.0004
	z := func(p float64) float64 { return -distuv.UnitNormal.Quantile(p) }
	st := func(p float64) float64 { return -distuv.StudentsT{Sigma: 1, Nu: 42}.Quantile(p) }
	logistic := func(v float64) float64 { return 100 / (1 + math.Exp(-v)) }
	for _, test := range []struct {
		link     string
		from     func(float64) float64
		quantile func(float64) float64
	}{
		{plan.Log, math.Exp, z},
		{plan.Identity, func(v float64) float64 { return v }, st},
		{plan.Logit, logistic, z},
		{plan.ComplementaryLogLog, logistic, z},
	} {
		const eta, down, up = -1.2, 0.3, 0.5 // two sides, as the draws' quantiles have them
		o := measured("r", test.link, test.from(eta), test.from(eta-down*test.quantile(0.025)), test.from(eta+up*test.quantile(0.025)))
		o.Figures.Per = 100
		lower, upper := o.Figures.stretched(tail)
		wantLower, wantUpper := test.from(eta-down*test.quantile(tail)), test.from(eta+up*test.quantile(tail))
		if math.Abs(lower/wantLower-1) > 1e-12 || math.Abs(upper/wantUpper-1) > 1e-12 {
			t.Errorf("%s: %v to %v, want %v to %v", test.link, lower, upper, wantLower, wantUpper)
		}
	}
}

// 1 - (1 - 2 tail)^n is the chance that one of n independent intervals fails.
func TestJointTail(t *testing.T) {
	for _, n := range []int{1, 2, 30, 1000} {
		if got := math.Pow(1-2*jointTail(0.9, n), float64(n)); math.Abs(got-0.9) > 1e-12 {
			t.Errorf("%d intervals: joint level %v", n, got)
		}
	}
	if got, want := jointTail(0.95, 1e9), -math.Log(0.95)/2e9; math.Abs(got/want-1) > 1e-9 {
		t.Errorf("10^9 intervals: tail %v, want %v", got, want)
	}
}

func TestJointLevel(t *testing.T) {
	a, b := measured("a", plan.Log, 10, 9, 11), measured("b", plan.Log, 10, 9, 11)
	a.Figures.Confidence, b.Figures.Confidence = 0.8, 0.8
	if got := jointLevel([]Outcome{a, b}, []int{0, 1}); got != 0.8 {
		t.Errorf("agreed on 0.8: %v", got)
	}
	b.Figures.Confidence = 0.9
	if got := jointLevel([]Outcome{a, b}, []int{0, 1}); got != 0.95 {
		t.Errorf("at odds: %v", got)
	}
}

// The limits of ranks against their definition, counted pair by pair. Means and limits come from few values, so that
// there are many ties.
func TestStandingsBruteForce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		var list []Outcome
		for i := range rapid.IntRange(2, 30).Draw(t, "regions") {
			mean := float64(rapid.IntRange(0, 12).Draw(t, "mean"))
			half := float64(rapid.IntRange(0, 3).Draw(t, "half"))
			list = append(list, measured(fmt.Sprint(i), plan.Identity, mean, mean-half, mean+half))
		}
		tail := jointTail(0.95, len(list))
		var limits [][2]float64
		for _, o := range list {
			lower, upper := o.Figures.stretched(tail)
			limits = append(limits, [2]float64{lower, upper})
		}
		for k, got := range standings(list) {
			want := standing{rank: 1, lower: 1, upper: len(list), among: len(list)}
			for j := range list {
				if list[j].Figures.Mean > list[k].Figures.Mean {
					want.rank++
				}
				if limits[j][0] > limits[k][1] {
					want.lower++
				}
				if limits[j][1] < limits[k][0] {
					want.upper--
				}
			}
			if got != want {
				t.Fatalf("region %d: %v, want %v", k, got, want)
			}
			if got.rank < got.lower || got.rank > got.upper {
				t.Fatalf("region %d: the rank is beyond its limits: %v", k, got)
			}
		}
	})
}

// The true ranks lie within their limits, all of them together, at least as often as the level says. The design leaves
// little room: eight regions share one true mean, and two known almost exactly lie right above and below it, so that an
// interval of the eight that misses its mean misplaces its region. Then the coverage is about level^(8/10): never under
// the level, and not far above it. Intervals that were not stretched would cover 0.8^8 = 0.17. The tolerance is
// three standard errors of the simulation; the seed is fixed.
func TestRankCoverage(t *testing.T) {
	const level, runs, free = 0.8, 2000, 12
	tailed := distuv.StudentsT{Sigma: 1, Nu: free}
	for _, test := range []struct {
		link string
		to   func(float64) float64
	}{
		{plan.Identity, func(v float64) float64 { return v }},
		{plan.Log, math.Exp},
		{plan.Logit, func(v float64) float64 { return 1 / (1 + math.Exp(-v)) }},
	} {
		t.Run(test.link, func(t *testing.T) {
			random := rand.New(rand.NewPCG(7, 2020))
			truth := []float64{-1e-6, 0, 0, 0, 0, 0, 0, 0, 0, 1e-6}
			error := []float64{1e-9, 0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 1e-9}
			covered := 0
			for range runs {
				var list []Outcome
				for k, v := range truth {
					at, se, q := v+error[k]*random.NormFloat64(), error[k], -distuv.UnitNormal.Quantile((1-level)/2)
					if test.link == plan.Identity { // the error is estimated: chi-squared over its degrees of freedom
						se *= math.Sqrt(distuv.ChiSquared{K: free, Src: random}.Rand() / free)
						q = -tailed.Quantile((1 - level) / 2)
					}
					o := measured("", test.link, test.to(at), test.to(at-q*se), test.to(at+q*se))
					o.Figures.Confidence, o.Figures.Observations = level, free+8
					list = append(list, o)
				}
				if holds(truth, standings(list)) {
					covered++
				}
			}
			got, se := float64(covered)/runs, math.Sqrt(level*(1-level)/runs)
			if got < level-3*se || got > math.Pow(level, 0.8)+3*se {
				t.Errorf("joint coverage %.4f, want %.2f to %.3f", got, level, math.Pow(level, 0.8))
			}
		})
	}
}

// holds reports whether every true rank lies within its limits; regions of equal means may have any of their ranks.
func holds(truth []float64, place []standing) bool {
	for k, v := range truth {
		first, last := 1, len(truth)
		for _, w := range truth {
			if w > v {
				first++
			}
			if w < v {
				last--
			}
		}
		if place[k].lower > first || place[k].upper < last {
			return false
		}
	}
	return true
}
