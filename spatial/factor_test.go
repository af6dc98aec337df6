package spatial

import (
	"context"
	"errors"
	"math"
	"math/rand/v2"
	"reflect"
	"testing"
)

// TestFactorOfAllRows moves the level and nothing else: every linear predictor's variance grows by log(1 + cv^2), those of
// differences do not, and what is said of the fit is what it was.
func TestFactorOfAllRows(t *testing.T) {
	const cv = 0.25
	for _, name := range []string{"poisson", "negative-binomial", "tweedie"} {
		for _, most := range []int{1, 7} {
			m := Model{Distribution: name, MaxKnots: 30, SmoothnessUncertainty: true, Effects: []Effect{{Name: "u", Role: Linear}, {Name: "team", Role: Group}}}
			d := strips(160, most, 21, distOf(t, m))
			if most == 1 {
				d.Places = Places{X: d.Places.X, Y: d.Places.Y}
			}
			plain := fit(t, m, d, Options{})
			d.Factor = &Factor{Of: make([]int32, 160), CV: []float64{cv}}
			s := fit(t, m, d, Options{})
			eta, se := predict(t, plain, d.Places, d.Covariates...)
			own, more := predict(t, s, d.Places, d.Covariates...)
			for i := range se {
				near(t, "linear predictor", own[i], eta[i], 0)
				near(t, "variance", more[i]*more[i]-se[i]*se[i], math.Log1p(cv*cv), 1e-10)
			}
			a, b := plain.Report(), s.Report()
			near(t, "intercept's variance", math.Pow(b.Coefficients[0].StandardError, 2)-math.Pow(a.Coefficients[0].StandardError, 2), math.Log1p(cv*cv), 1e-10)
			near(t, "slope's standard error, relative", b.Coefficients[1].StandardError/a.Coefficients[1].StandardError, 1, 1e-10)
			a.Coefficients, b.Coefficients = nil, nil
			if !reflect.DeepEqual(a, b) {
				t.Errorf("%s: the report changed from\n%+v\nto\n%+v", name, a, b)
			}
			back, err := Restore(s.State(), 1)
			if err != nil {
				t.Fatal(err)
			}
			if _, again := predict(t, back, d.Places, d.Covariates...); !reflect.DeepEqual(again, more) {
				t.Error("the restored surface has other errors")
			}
			d.Factor.CV[0] = 0
			if none := fit(t, m, d, Options{}); none.spread.Cols != plain.spread.Cols {
				t.Error("a factor without an error has one")
			}
		}
	}
}

// TestFactorInTotals: the coefficient of variation of a total is that of the counts and that of the factor, squared and
// added (Buckland et al. 2001, ch. 3): exactly so in the delta method on the log scale, and in the draws to what they allow.
func TestFactorInTotals(t *testing.T) {
	const cv, draws = 0.2, 4000
	m := Model{Distribution: "poisson", MaxKnots: 30}
	d := strips(200, 5, 22, distOf(t, m))
	var at Places
	set := Share{}
	for i := range 400 {
		at.X, at.Y = append(at.X, 200*float64(i%20)+100), append(at.Y, 150*float64(i/20)+75)
		set.Index, set.Weight = append(set.Index, int32(i)), append(set.Weight, 3)
	}
	total := func() Sum {
		list, err := fit(t, m, d, Options{}).Sums(context.Background(), at, nil, []Share{set}, draws, 5)
		if err != nil {
			t.Fatal(err)
		}
		return list[0]
	}
	counts := total()
	d.Factor = &Factor{Of: make([]int32, 200), CV: []float64{cv}}
	both := total()
	near(t, "total, relative", both.Value/counts.Value, 1, 0)
	near(t, "variance by the delta method", math.Pow(both.Delta/both.Value, 2), math.Pow(counts.Delta/counts.Value, 2)+math.Log1p(cv*cv), 1e-10)
	mean, own := 0.0, counts.DrawSD()/counts.Value
	for _, v := range both.Draws {
		mean += v / draws
	}
	// The standard error of a coefficient of variation is about cv/sqrt(2 draws) times 1 + cv^2: four of them.
	near(t, "coefficient of variation of draws, relative", both.DrawSD()/mean/math.Sqrt(own*own+cv*cv), 1, 4*1.05/math.Sqrt(2*draws)+0.01)
}

// TestFactorsOfStrata fits again with each factor's rows' exposures a little larger and smaller, and then with factors drawn.
func TestFactorsOfStrata(t *testing.T) {
	cv := []float64{0.15, 0.3}
	for _, name := range []string{"poisson", "negative-binomial", "tweedie"} {
		m := Model{Distribution: name, MaxKnots: 25, Effects: []Effect{{Name: "u", Role: Linear}}}
		d := strips(150, 6, 23, distOf(t, m))
		centres := d.Places.centres()
		f := &Factor{Of: make([]int32, 150), CV: cv}
		for i, x := range centres.X {
			switch {
			case x > 2600:
				f.Of[i] = 1
			case x > 1800:
				f.Of[i] = -1
			}
		}
		s := fit(t, m, d, Options{})
		m.Smoothness = given(s.report.Lambda)
		if s.report.ShapeEstimated {
			m.Shape = &s.report.Shape
		}
		at := Places{X: []float64{200, 1000, 2200, 3000, 3900}, Y: []float64{300, 2000, 1500, 800, 2800}}
		z := Covariate{Name: "u", Number: []float64{0, 0.2, 0.5, 0.7, 1}}
		refit := func(log [2]float64) []float64 {
			moved := d
			moved.Exposure = append([]float64(nil), d.Exposure...)
			for i, k := range f.Of {
				if k >= 0 {
					moved.Exposure[i] *= math.Exp(log[k])
				}
			}
			eta, _ := predict(t, fit(t, m, moved, Options{}), at, z)
			return eta
		}
		_, plain := predict(t, fit(t, m, d, Options{}), at, z)
		d.Factor = f
		_, se := predict(t, fit(t, m, d, Options{}), at, z)
		d.Factor = nil
		want := make([]float64, len(se))
		for k := range cv {
			const h = 1e-3
			var up, down [2]float64
			up[k], down[k] = h, -h
			a, b := refit(up), refit(down)
			for i := range want {
				want[i] += math.Pow((a[i]-b[i])/(2*h), 2) * math.Log1p(cv[k]*cv[k])
			}
		}
		for i := range se {
			near(t, name+": variance", se[i]*se[i]-plain[i]*plain[i], want[i], 1e-6)
		}
		if name != "poisson" {
			continue
		}
		const runs = 300
		random := rand.New(rand.NewPCG(6, 6))
		first, second := make([]float64, len(se)), make([]float64, len(se))
		for range runs {
			var log [2]float64
			for k, c := range cv {
				log[k] = math.Sqrt(math.Log1p(c*c)) * random.NormFloat64()
			}
			for i, e := range refit(log) {
				first[i], second[i] = first[i]+e/runs, second[i]+e*e/runs
			}
		}
		for i := range se { // a standard deviation from 300 draws is good to 4 per cent: four times that
			near(t, "spread of fits with drawn factors, relative", math.Sqrt((second[i]-first[i]*first[i])/want[i]), 1, 0.17)
		}
	}
}

func TestFactorsThatCannotBe(t *testing.T) {
	good := strips(60, 3, 4, distOf(t, Model{Distribution: "poisson"}))
	for _, c := range []struct {
		distribution string
		of           int32
		cv           float64
		exposure     bool
		says         string
	}{
		{"poisson", 0, 0.1, false, "a factor of the exposure needs an exposure"},
		{"gaussian", 0, 0.1, false, "a factor of the exposure needs an exposure"},
		{"poisson", 0, -0.1, true, "factor 1: a coefficient of variation of -0.1"},
		{"poisson", 0, math.NaN(), true, "factor 1: a coefficient of variation of NaN"},
		{"poisson", 0, math.Inf(1), true, "factor 1: a coefficient of variation of +Inf"},
		{"poisson", 1, 0.1, true, "row 3: there is no factor 1 among 1"},
		{"poisson", -2, 0.1, true, "row 3: there is no factor -2 among 1"},
	} {
		d := good
		d.Factor = &Factor{Of: make([]int32, 60), CV: []float64{c.cv}}
		d.Factor.Of[2] = c.of
		if !c.exposure {
			d.Exposure = nil
		}
		_, err := Fit(context.Background(), Model{Distribution: c.distribution, MaxKnots: 20}, d, Options{})
		var e *Error
		if !errors.As(err, &e) || e.Message != c.says || e.Advice == "" {
			t.Errorf("%s: %v", c.says, err)
		}
	}
	defer func() {
		if recover() == nil {
			t.Error("a factor for fewer rows passes")
		}
	}()
	d := good
	d.Factor = &Factor{Of: make([]int32, 3), CV: []float64{0.1}}
	Fit(context.Background(), Model{Distribution: "poisson"}, d, Options{})
}
