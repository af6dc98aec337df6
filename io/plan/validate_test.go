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
		"smoothness given":               with("smoothness 0.1", "max-knots 3"),
		"a covariate that is the area":   with("area a_ha", "linear a_ha", "at p.csv"),
		"defaults said in so many words": with("surface thin-plate", "smoothness reml", "cells-across 100"),
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
		{"gaussian with people", "distribution: people is for counts, and gaussian is for measurements", "divide", with("people p", "distribution gaussian")},
		{"binomial with people", "distribution: people is for counts, and binomial", "--trials", with("people p", "distribution binomial")},
		{"gaussian with trials", "distribution: positives among trials are binomial, not gaussian", "leave out", with("trials n", "distribution gaussian")},
		{"poisson with trials", "distribution: positives among trials are binomial, not poisson", "leave out", with("trials n", "distribution poisson")},
		{"binomial without trials", "distribution: binomial needs the number examined", "--trials", with("distribution binomial")},
		{"logit for a measurement", "link: logit does not go with gaussian, which takes identity or log", "--trials", with("link logit")},
		{"identity for counts", "link: identity does not go with poisson, which takes log", "leave out --link", with("people p", "link identity")},
		{"log for positives", "link: log does not go with binomial, which takes logit", "leave out --link", with("trials n", "link log")},
		{"weighted counts", "weight: counts and positives carry their own weight", "leave out --weight", with("people p", "weight w")},
		{"weighted positives", "weight: counts and positives carry their own weight", "leave out --weight", with("trials n", "weight w")},
		{"gcv of nothing", "smoothness: there is no surface", "leave out --smoothness", with("surface none", "smoothness gcv")},
		{"number for nothing", "smoothness: there is no surface", "leave out --smoothness", with("surface none", "smoothness 2")},
		{"knots of nothing", "max-knots: there is no surface", "leave out --max-knots", with("surface none", "max-knots 20")},
		{"response explains itself", `linear: column "stems" is the response`, "", with("linear stems", "at p.csv")},
		{"named twice", `linear: column "d" is named twice`, "", with("linear d", "linear d", "at p.csv")},
		{"line and levels", `category: column "d" is already linear`, "keep one", with("linear d", "category d", "at p.csv")},
		{"two sizes", "cells-across: cell-size is given as well", "keep one", with("cell-size 5", "cells-across 20")},
		{"name of no zones", "zone-name: no zones are named", "--zones", with("zone-name name")},
		{"cells and places", "cell-size: it shapes or sums the cells", "two runs", with("at p.csv", "cell-size 5")},
		{"cell count and places", "cells-across: it shapes or sums the cells", "two runs", with("at p.csv", "cells-across 5")},
		{"edge and places", "within: it shapes or sums the cells", "two runs", with("at p.csv", "within e.geojson")},
		{"zones and places", "zones: it shapes or sums the cells", "two runs", with("at p.csv", "zones z.geojson")},
		{"hold of nothing", "hold: depht is not a covariate of the model", "did you mean depth?", with("linear depth", "hold depht=1")},
		{"hold of no covariate", "hold: depth is not a covariate of the model", "--linear", with("hold depth=1")},
		{"held twice", "hold: depth is held twice", "", with("linear depth", "hold depth=1", "hold depth=mean")},
		{"a line held at a level", `hold: depth is linear and is held at a number or at mean, not at "deep"`, "depth=mean", with("linear depth", "hold depth=deep")},
		{"a line held at the commonest", "hold: depth is linear and is held at a number or at mean", "depth=mean", with("linear depth", "hold depth=commonest")},
		{"a category held at its mean", "hold: soil is a category and has no mean", "soil=commonest", with("category soil", "hold soil=mean")},
		{"nothing held", "hold: the map has no values of depth, soil", "add --hold depth=mean --hold soil=commonest, or", with("linear depth", "category soil")},
		{"one not held", "hold: the map has no values of soil", "add --hold soil=commonest, or", with("linear depth", "category soil", "hold depth=mean")},
		{"per for a measurement", "per: it scales rates", "--people", with("per 100")},
		{"per for bare counts", "per: it scales rates", "--people", with("distribution poisson", "per 100")},
		{"per expected", "per: counts against expected ones give a relative risk", "leave out", with("expected e", "per 100")},
		{"a count never below", "threshold: the mean is above 0 everywhere", "above 0", with("people p", "threshold 0")},
		{"a logged measurement", "threshold: the mean is above 0 everywhere, so it exceeds -1", "above 0", with("link log", "threshold -1")},
		{"a share never above", "threshold: a share per 100 stays below 100, so it never exceeds 120", "--per", with("trials n", "per 100", "threshold 120")},
		{"a share in per cent without per", "threshold: a share per 1 stays below 1, so it never exceeds 40", "--per", with("trials n", "threshold 40")},
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
