package plan

import (
	"strings"
	"testing"
)

func TestValidateAccepts(t *testing.T) {
	tests := map[string][]string{
		"a measurement":                  with(),
		"a weighted measurement":         with("weight w", "distribution gaussian", "link log"),
		"coordinates named":              with("x e", "y n", "crs EPSG:32633"),
		"density with totals":            with("area ground", "area-unit ha", "zones z.geojson", "zone-name name", "per 10"),
		"rate":                           with("people pop", "per 100000", "threshold 50", "reference overall"),
		"relative risk":                  with("expected e", "per 1", "threshold 1.5", "reference 1"),
		"prevalence in per cent":         with("trials n", "per 100", "threshold 40"),
		"counts as they are":             with("distribution poisson", "threshold 3"),
		"a negative level":               with("threshold -3"),
		"covariates held":                with("linear depth", "category soil", "hold depth=-2", "hold soil=peat"),
		"covariates from places":         with("linear depth", "category soil", "at p.csv"),
		"one from places, one held":      with("linear depth", "category soil", "at p.csv", "hold soil=commonest"),
		"no surface":                     with("surface none", "linear depth", "at p.csv"),
		"no surface and nothing else":    with("surface none"),
		"smoothness given":               with("smoothness 0.1", "max-knots 4"),
		"a covariate that is the area":   with("area a_ha", "linear a_ha", "at p.csv"),
		"defaults said in so many words": with("surface thin-plate", "smoothness reml", "cells-across 100", "max-knots auto", "smoothness-uncertainty auto"),
		"theta given":                    with("people p", "distribution negative-binomial", "shape 2.5"),
		"theta at its least":             with("people p", "distribution negative-binomial", "shape 0.001"),
		"theta at its most":              with("people p", "distribution negative-binomial", "shape 1e7"),
		"correlation given":              with("trials n", "distribution beta-binomial", "shape 0.99"),
		"power given":                    with("distribution tweedie", "shape 1.01"),
		"a shape and cross-validation":   with("distribution tweedie", "shape 1.5", "smoothness gcv"),
		"amounts for an effort":          with("distribution tweedie", "effort hours", "per 10"),
		"amounts on ground":              with("distribution tweedie", "area a_ha", "zones z.geojson"),
		"weighted positive measurements": with("distribution gamma", "weight w", "threshold 3"),
		"weighted amounts":               with("distribution tweedie", "weight w"),
		"extreme values":                 with("trials n", "link complementary-log-log"),
		"extreme values that scatter":    with("trials n", "link complementary-log-log", "extra-variation scale"),
		"scaled counts":                  with("people p", "extra-variation scale"),
		"scaled counts as they are":      with("distribution poisson", "extra-variation scale"),
		"a choice for bare counts":       with("distribution poisson", "extra-variation auto"),
		"no extra variation anywhere":    with("extra-variation none", "distribution gamma"),
		"counts and cross-validation":    with("people p", "smoothness gcv"),
		"uncertain smoothness":           with("smoothness-uncertainty on"),
		"certain smoothness":             with("smoothness-uncertainty off", "smoothness gcv"),
		"a curve's smoothness uncertain": with("smoothness-uncertainty on", "smoothness 3", "curve d", "at p.csv"),
		"curves held":                    with("curve d", "curve-per e=soil", "hold d=mean", "hold e=2", "hold soil=commonest"),
		"curves and their category":      with("curve-per d=soil", "category soil", "hold d=mean", "hold soil=clay"),
		"curves of one category":         with("curve-per d=soil", "curve-per e=soil", "at p.csv"),
		"groups need no value":           with("group observer", "group site"),
		"surfaces held":                  with("surface-per year", "surface-smoothness own", "hold year=2021"),
		"surfaces at places":             with("surface-per year", "at p.csv"),
		"surfaces and steps":             with("surface-per year", "category year", "group site", "curve-per d=year", "at p.csv"),
		"a surface that may vanish":      with("shrink"),
		"curves without a surface":       with("surface none", "curve d", "smoothness gcv", "at p.csv"),
		"alternatives":                   with("test-variation", "also surface=none", "also distribution=gamma; link=log", "also shrink", "also curve=d"),
		"groups without a surface":       with("surface none", "group g", "smoothness-uncertainty on"),
	}
	for name, said := range tests {
		t.Run(name, func(t *testing.T) {
			s := say(t, said...)
			if err := s.Validate(); err != nil {
				t.Fatal(err)
			}
			// Layering the defaults first must not turn them into something that was said.
			if err := s.Over(Defaults()).Validate(); err != nil {
				t.Fatalf("over the defaults: %v", err)
			}
			if _, err := s.Resolve(); err != nil {
				t.Fatal(err)
			}
		})
	}
}

func TestValidateRefuses(t *testing.T) {
	tests := []struct {
		name, message, hint string
		said                []string
	}{
		{"nothing said", "observations: no file is named", "name the table", nil},
		{"no response", "response: the column with the response is not named", "--response", []string{"observations a.csv"}},
		{"x alone", "x: x is named without y", "--y", with("x e")},
		{"y alone", "y: y is named without x", "--x", with("y n")},
		{"x is y", `y: column "e" is already the x`, "", with("x e", "y e")},
		{"response is the denominator", `people: column "stems" is already the response`, "", with("people stems")},
		{"two denominators", "area: people is named as well", "keep the one", with("people p", "area a_ha")},
		{"two others", "expected: effort is named as well", "keep the one", with("effort h", "expected e")},
		{"trials and people", "trials: people is named as well", "keep --people", with("people p", "trials n")},
		{"area without a unit", `area: the unit of column "a" is not given`, "--area-unit", with("area a")},
		{"unit without an area", "area-unit: no area is named", "--area", with("area-unit ha")},
		{"gamma with effort", "distribution: effort is for counts and amounts, and gamma is for measurements, which have no denominator", "divide the measurement yourself, or use tweedie for amounts", with("effort h", "distribution gamma")},
		{"beta-binomial with people", "distribution: people is for counts, and beta-binomial is for positives among trials", "--trials", with("people p", "distribution beta-binomial")},
		{"beta-binomial without trials", "distribution: beta-binomial needs the number examined behind each number positive", "--trials", with("distribution beta-binomial")},
		{"negative-binomial with trials", "distribution: positives among trials are binomial, not negative-binomial", "leave out", with("trials n", "distribution negative-binomial")},
		{"tweedie with trials", "distribution: positives among trials are binomial, not tweedie", "leave out", with("trials n", "distribution tweedie")},
		{"gaussian with people", "distribution: people is for counts, and gaussian is for measurements", "divide", with("people p", "distribution gaussian")},
		{"binomial with people", "distribution: people is for counts, and binomial", "--trials", with("people p", "distribution binomial")},
		{"gaussian with trials", "distribution: positives among trials are binomial, not gaussian", "leave out", with("trials n", "distribution gaussian")},
		{"poisson with trials", "distribution: positives among trials are binomial, not poisson", "leave out", with("trials n", "distribution poisson")},
		{"binomial without trials", "distribution: binomial needs the number examined", "--trials", with("distribution binomial")},
		{"logit for a measurement", "link: logit does not go with gaussian, which takes identity or log", "--trials", with("link logit")},
		{"identity for counts", "link: identity does not go with poisson, which takes log", "leave out --link", with("people p", "link identity")},
		{"log for positives", "link: log does not go with binomial, which takes logit or complementary-log-log", "leave out --link", with("trials n", "link log")},
		{"identity for amounts", "link: identity does not go with tweedie, which takes log", "leave out --link", with("distribution tweedie", "link identity")},
		{"identity for gamma", "link: identity does not go with gamma, which takes log", "leave out --link", with("distribution gamma", "link identity")},
		{"logit for negative-binomial", "link: logit does not go with negative-binomial, which takes log", "leave out --link", with("people p", "distribution negative-binomial", "link logit")},
		{"extreme values of beta-binomial", "link: complementary-log-log does not go with beta-binomial, which takes logit", "leave out --link", with("trials n", "distribution beta-binomial", "link complementary-log-log")},
		{"extreme values of a measurement", "link: complementary-log-log does not go with gaussian, which takes identity or log", "leave out --link", with("link complementary-log-log")},
		{"the shape of a measurement", "shape: gaussian has no shape", "name negative-binomial, beta-binomial or tweedie with --distribution, or leave out --shape", with("shape 2")},
		{"the shape of gamma", "shape: gamma has no shape", "leave out --shape", with("distribution gamma", "shape 2")},
		{"the shape of counts", "shape: poisson has no shape", "leave out --shape", with("people p", "shape 2")},
		{"theta too small", "shape: the theta of negative-binomial lies between 0.001 and 10000000, not at 0.0009", "let the data choose", with("people p", "distribution negative-binomial", "shape 0.0009")},
		{"theta too large", "shape: the theta of negative-binomial lies between 0.001 and 10000000, not at 2e+07", "let the data choose", with("people p", "distribution negative-binomial", "shape 2e7")},
		{"correlation too large", "shape: the correlation of beta-binomial lies between 0.0000001 and 0.99, not at 1", "let the data choose", with("trials n", "distribution beta-binomial", "shape 1")},
		{"power too small", "shape: the power of tweedie lies between 1.01 and 1.99, not at 1", "let the data choose", with("distribution tweedie", "shape 1")},
		{"power too large", "shape: the power of tweedie lies between 1.01 and 1.99, not at 2.5", "let the data choose", with("distribution tweedie", "shape 2.5")},
		{"scaled measurements", "extra-variation: gaussian estimates its variation itself; this is for poisson and binomial", "leave it out", with("extra-variation scale")},
		{"scaled negative-binomial", "extra-variation: negative-binomial estimates its variation itself", "leave it out", with("people p", "distribution negative-binomial", "extra-variation scale")},
		{"a choice for beta-binomial", "extra-variation: beta-binomial estimates its variation itself", "leave it out", with("trials n", "distribution beta-binomial", "extra-variation auto")},
		{"a choice by cross-validation", "extra-variation: cross-validation cannot choose a shape or a scale", "leave out --smoothness gcv", with("people p", "extra-variation auto", "smoothness gcv")},
		{"a scale by cross-validation", "extra-variation: cross-validation cannot choose a shape or a scale", "leave out --smoothness gcv", with("people p", "extra-variation scale", "smoothness gcv")},
		{"a choice of extreme values", "extra-variation: beta-binomial has no complementary log-log link to choose it with", "use scale, or the logit link", with("trials n", "link complementary-log-log", "extra-variation auto")},
		{"uncertain by cross-validation", "smoothness-uncertainty: it follows from the restricted likelihood, and cross-validation chooses the smoothness", "leave out --smoothness gcv", with("smoothness gcv", "smoothness-uncertainty on")},
		{"uncertain and scaled", "smoothness-uncertainty: it is not known where the variation is scaled", "leave out --extra-variation scale", with("people p", "extra-variation scale", "smoothness-uncertainty on")},
		{"uncertain and given", "smoothness-uncertainty: the smoothness is given as a number, so nothing about it is uncertain", "leave out --smoothness", with("smoothness 3", "smoothness-uncertainty on")},
		{"uncertain without a smooth", "smoothness-uncertainty: there is no surface for it to act on", "leave out --smoothness-uncertainty, or --surface none", with("surface none", "linear d", "hold d=mean", "smoothness-uncertainty on")},
		{"weighted counts", "weight: counts and positives carry their own weight", "leave out --weight", with("people p", "weight w")},
		{"weighted positives", "weight: counts and positives carry their own weight", "leave out --weight", with("trials n", "weight w")},
		{"gcv of nothing", "smoothness: there is no surface", "leave out --smoothness", with("surface none", "smoothness gcv")},
		{"number for nothing", "smoothness: there is no surface", "leave out --smoothness", with("surface none", "smoothness 2")},
		{"number for curves", "smoothness: there is no surface", "leave out --smoothness", with("surface none", "curve d", "smoothness 2", "at p.csv")},
		{"levels of nothing", "surface-per: there is no surface", "leave out --surface-per, or --surface none", with("surface none", "surface-per year", "hold year=2021")},
		{"nothing vanishes", "shrink: there is no surface", "leave out --shrink", with("surface none", "shrink")},
		{"smoothness of one surface", "surface-smoothness: there is one surface only", "--surface-per", with("surface-smoothness own")},
		{"knots of nothing", "max-knots: there is no surface", "leave out --max-knots", with("surface none", "max-knots 20")},
		{"response explains itself", `linear: column "stems" is the response`, "", with("linear stems", "at p.csv")},
		{"named twice", `linear: column "d" is named twice`, "", with("linear d", "linear d", "at p.csv")},
		{"line and levels", `category: column "d" is already linear`, "keep one", with("linear d", "category d", "at p.csv")},
		{"line and curve", `curve: column "d" is already linear`, "keep one", with("linear d", "curve d", "at p.csv")},
		{"curve and curves", `curve-per: column "d" is already curve`, "keep one", with("curve d", "curve-per d=soil", "at p.csv")},
		{"curves twice", `curve-per: column "d" is named twice`, "", with("curve-per d=soil", "curve-per d=year", "at p.csv")},
		{"curves per themselves", `curve-per: column "d" is named twice`, "", with("curve-per d=d", "at p.csv")},
		{"curves per a group", `curve-per: column "g" is already group`, "keep one", with("curve-per d=g", "group g", "at p.csv")},
		{"surfaces per a group", `surface-per: column "g" is already group`, "keep one", with("surface-per g", "group g", "at p.csv")},
		{"surfaces per a line", `surface-per: column "d" is already linear`, "keep one", with("surface-per d", "linear d", "at p.csv")},
		{"category and group", `group: column "g" is already category`, "keep one", with("category g", "group g", "at p.csv")},
		{"surfaces per the response", `surface-per: column "stems" is the response and cannot explain itself`, "", with("surface-per stems", "at p.csv")},
		{"groups of the response", `group: column "stems" is the response`, "", with("group stems")},
		{"two sizes", "cells-across: cell-size is given as well", "keep one", with("cell-size 5", "cells-across 20")},
		{"name of no zones", "zone-name: no zones are named", "--zones", with("zone-name name")},
		{"cells and places", "cell-size: it shapes or sums the cells", "two runs", with("at p.csv", "cell-size 5")},
		{"cell count and places", "cells-across: it shapes or sums the cells", "two runs", with("at p.csv", "cells-across 5")},
		{"edge and places", "within: it shapes or sums the cells", "two runs", with("at p.csv", "within e.geojson")},
		{"zones and places", "zones: it shapes or sums the cells", "two runs", with("at p.csv", "zones z.geojson")},
		{"hold of nothing", "hold: depht is not a covariate of the model", "did you mean depth?", with("linear depth", "hold depht=1")},
		{"hold of no covariate", "hold: depth is not a covariate of the model", "--linear", with("hold depth=1")},
		{"held twice", "hold: depth is held twice", "", with("linear depth", "hold depth=1", "hold depth=mean")},
		{"a line held at a level", `hold: depth is a number and is held at one or at mean, not at "deep"`, "depth=mean", with("linear depth", "hold depth=deep")},
		{"a line held at the commonest", "hold: depth is a number and is held at one or at mean", "depth=mean", with("linear depth", "hold depth=commonest")},
		{"a category held at its mean", "hold: soil is a category and has no mean", "soil=commonest", with("category soil", "hold soil=mean")},
		{"a curve held at a level", `hold: d is a number and is held at one or at mean, not at "deep"`, "d=mean", with("curve d", "hold d=deep")},
		{"a group held", "hold: g is a group, and the map shows the average one", "leave it out", with("group g", "hold g=a")},
		{"a group held at places", "hold: g is a group, and the map shows the average one", "leave it out", with("group g", "hold g=a", "at p.csv")},
		{"surfaces held at their mean", "hold: year is a category and has no mean", "year=commonest", with("surface-per year", "hold year=mean")},
		{"surfaces not held", "hold: the map has no values of year", "add --hold year=commonest, or", with("surface-per year")},
		{"curves not held", "hold: the map has no values of d, e, soil", "add --hold d=mean --hold e=mean --hold soil=commonest, or", with("curve d", "curve-per e=soil")},
		{"nothing held", "hold: the map has no values of depth, soil", "add --hold depth=mean --hold soil=commonest, or", with("linear depth", "category soil")},
		{"one not held", "hold: the map has no values of soil", "add --hold soil=commonest, or", with("linear depth", "category soil", "hold depth=mean")},
		{"per for a measurement", "per: it scales rates", "--people", with("per 100")},
		{"per for bare counts", "per: it scales rates", "--people", with("distribution poisson", "per 100")},
		{"per expected", "per: counts against expected ones give a relative risk", "leave out", with("expected e", "per 100")},
		{"a count never below", "threshold: the mean is above 0 everywhere", "above 0", with("people p", "threshold 0")},
		{"a logged measurement", "threshold: the mean is above 0 everywhere, so it exceeds -1", "above 0", with("link log", "threshold -1")},
		{"a share never above", "threshold: a share per 100 stays below 100, so it never exceeds 120", "--per", with("trials n", "per 100", "threshold 120")},
		{"a share in per cent without per", "threshold: a share per 1 stays below 1, so it never exceeds 40", "--per", with("trials n", "threshold 40")},
		{"a negative amount", "threshold: the mean is above 0 everywhere, so it exceeds -2 with certainty", "above 0", with("distribution tweedie", "threshold -2")},
		{"a share of beta-binomial never above", "threshold: a share per 1 stays below 1", "--per", with("trials n", "distribution beta-binomial", "threshold 1")},
		{"an alternative twice", `also: "surface=none" is said twice`, "", with("also surface=none", "also surface=none")},
		{"an alternative that cannot be fitted", `also: "link=logit" cannot be fitted: link: logit does not go with gaussian, which takes identity or log`, "--trials", with("also link=logit")},
		{"an alternative with a bad value", `also: "max-knots=few" has a part that cannot be: max-knots: "few" is neither auto nor a whole number`, "leave out --max-knots", with("also max-knots=few")},
		{"reference of a measurement", "reference: relative risks compare rates", "--people", with("reference overall")},
		{"reference of positives", "reference: relative risks compare rates", "--people", with("trials n", "reference 0.2")},
	}
	seen := map[string]bool{}
	for _, test := range tests {
		if seen[test.name] {
			t.Errorf("two cases named %q", test.name)
		}
		seen[test.name] = true
		t.Run(test.name, func(t *testing.T) {
			s := say(t, test.said...)
			for _, s := range []Settings{s, s.Over(Defaults())} {
				err := s.Validate()
				e, ok := err.(*Error)
				if !ok {
					t.Fatalf("got %v", err)
				}
				if !strings.HasPrefix(e.Error(), test.message) {
					t.Errorf("got %q, want %q", e.Error(), test.message)
				}
				if !strings.Contains(e.Hint(), test.hint) || (test.hint == "") != (e.Hint() == "") {
					t.Errorf("hint %q, want %q", e.Hint(), test.hint)
				}
				if strings.HasSuffix(e.Error(), ".") {
					t.Error("an error ends in a stop")
				}
			}
			if _, err := s.Resolve(); err == nil {
				t.Error("Resolve takes it")
			}
		})
	}
}

// TestAlternatives: an alternative replaces what it names and drops what it rules out.
func TestAlternatives(t *testing.T) {
	s := say(t, with("max-knots 60", "shrink true", "curve depth", "linear slope", "hold depth=mean", "hold slope=mean",
		"also surface=none", "also linear=depth", "also distribution=gamma; link=log")...)
	list, err := s.Candidates()
	if err != nil {
		t.Fatal(err)
	}
	if len(list) != 4 || list[0].Name != "as asked" || list[2].Name != "linear=depth" {
		t.Fatalf("got %d candidates", len(list))
	}
	if own := list[0]; own.MaxKnots.N != 60 || !*own.Shrink || len(own.Curve) != 1 {
		t.Errorf("as asked: %v", own.Effective())
	}
	if none := list[1]; *none.Surface != NoSurface || none.Said("max-knots") || *none.Shrink || len(none.Curve) != 1 {
		t.Errorf("surface=none: %v", none.Effective())
	}
	if line := list[2]; len(line.Curve) != 0 || len(line.Linear) != 1 || line.Linear[0] != "depth" {
		t.Errorf("linear=depth: %v", line.Effective())
	}
	if gamma := list[3]; *gamma.Distribution != Gamma || *gamma.Link != Log || gamma.MaxKnots.N != 60 {
		t.Errorf("gamma: %v", gamma.Effective())
	}
	for _, test := range []struct{ also, message, hint string }{
		{"threshold=3", `also: "threshold" is no word in which a model can differ`, "it may differ in"},
		{"curv=depth", `also: "curv" is no word in which a model can differ`, "did you mean curve?"},
	} {
		w, _ := Lookup("also")
		err := w.Set(&Settings{}, test.also)
		e, ok := err.(*Error)
		if !ok || e.Error() != test.message || !strings.HasPrefix(e.Hint(), test.hint) {
			t.Errorf("%s: %v", test.also, err)
		}
	}
	bad := say(t, with("also distribution=binomial")...)
	if err := bad.Validate(); err == nil || !strings.Contains(err.Error(), "cannot be fitted") {
		t.Errorf("binomial without trials: %v", err)
	}
}
