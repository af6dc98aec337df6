package plan

import (
	"reflect"
	"slices"
	"strings"
	"testing"

	"drumlin/spatial/response"
)

// say makes settings from pairs of "word value", as they would be said.
func say(t *testing.T, said ...string) Settings {
	t.Helper()
	var s Settings
	for _, pair := range said {
		name, value, _ := strings.Cut(pair, " ")
		w, ok := Lookup(name)
		if !ok {
			t.Fatalf("no word %q", name)
		}
		if err := w.Set(&s, value); err != nil {
			t.Fatal(err)
		}
	}
	return s
}

func with(said ...string) []string {
	return append([]string{"observations plots.csv", "response stems"}, said...)
}

func entry(list []Entry, key string) (Entry, bool) {
	i := slices.IndexFunc(list, func(e Entry) bool { return e.Key == key })
	if i < 0 {
		return Entry{}, false
	}
	return list[i], true
}

func TestOver(t *testing.T) {
	base := say(t, "response a", "title base", "linear depth", "linear height")
	base.Choose("crs", "local", "the columns are x and y")
	top := say(t, "response b", "linear slope")
	out := top.Over(base)
	if *out.Response != "b" || *out.Title != "base" || !slices.Equal(out.Linear, []string{"slope"}) || *out.CRS != "local" {
		t.Errorf("got %v", out.Effective())
	}
	if e, _ := entry(out.Effective(), "crs"); !e.Chosen || e.Why != "the columns are x and y" {
		t.Errorf("the reason is lost: %+v", e)
	}
	// What is said later is no longer a choice of the program's.
	out = say(t, "crs EPSG:4326").Over(base)
	if e, _ := entry(out.Effective(), "crs"); e.Chosen || e.Why != "" || e.Value != "EPSG:4326" {
		t.Errorf("got %+v", e)
	}
	if e, _ := entry(base.Effective(), "crs"); !e.Chosen {
		t.Errorf("layering changed the base: %+v", e)
	}
}

func TestOverOfNothing(t *testing.T) {
	s := say(t, with("hold depth=mean", "write csv")...)
	if got := (Settings{}).Over(s); !reflect.DeepEqual(got.Effective(), s.Effective()) {
		t.Errorf("got %v", got.Effective())
	}
	if got := s.Over(Settings{}); !reflect.DeepEqual(got.Effective(), s.Effective()) {
		t.Errorf("got %v", got.Effective())
	}
}

func TestChoose(t *testing.T) {
	s := say(t, "response stems")
	copied := s
	s.Choose("x", "lon", "the name is recognised")
	s.Choose("max-knots", "17", "that is all the places there are")
	if copied.X != nil || len(copied.why) != 0 {
		t.Error("a copy made before shares the choice")
	}
	later := s
	later.Choose("x", "easting", "another")
	if e, _ := entry(s.Effective(), "x"); e.Value != "lon" || e.Why != "the name is recognised" {
		t.Errorf("a copy made after changed the original: %+v", e)
	}
	want := []Entry{
		{Key: "response", Value: "stems"},
		{Key: "x", Value: "lon", Chosen: true, Why: "the name is recognised"},
		{Key: "max_knots", Value: 17, Chosen: true, Why: "that is all the places there are"},
	}
	if got := s.Effective(); !reflect.DeepEqual(got, want) {
		t.Errorf("got %+v", got)
	}
	if s.Said("x") || !s.Said("response") || s.Said("y") || s.Said("nonsense") {
		t.Error("Said confuses what was said with what was chosen")
	}
}

func TestChoosePanics(t *testing.T) {
	for _, bad := range [][3]string{{"nonsense", "1", "why"}, {"per", "-1", "why"}, {"per", "1", ""}} {
		func() {
			defer func() {
				if recover() == nil {
					t.Errorf("%q did not panic", bad)
				}
			}()
			new(Settings).Choose(bad[0], bad[1], bad[2])
		}()
	}
}

// TestDefaults spells out the defaults that the design fixes.
func TestDefaults(t *testing.T) {
	want := map[string]string{
		"surface": "thin-plate", "max-knots": "auto", "extra-variation": "auto", "smoothness-uncertainty": "auto", "smoothness": "reml", "cells-across": "100", "per": "1",
		"confidence": "0.95", "isolines": "lines", "write": "csv,geojson,tif,pictures,saved", "seed": "1",
	}
	for _, w := range Words() {
		if got := w.Default(); got != want[w.Name] {
			t.Errorf("%s: default %q, want %q", w.Name, got, want[w.Name])
		}
	}
	d := Defaults()
	if *d.Strict || *d.Force || *d.Quiet || *d.Workers < 1 {
		t.Errorf("got %v %v %v %v", *d.Strict, *d.Force, *d.Quiet, *d.Workers)
	}
	for _, e := range d.Effective() {
		if e.Chosen || e.Why != "default" {
			t.Errorf("%+v", e)
		}
	}
}

func TestResolveChooses(t *testing.T) {
	tests := []struct {
		name         string
		said         []string
		distribution string
		link         string
		chosen       []string
	}{
		{"a measurement", with(), "gaussian", "identity", []string{"distribution", "link"}},
		{"a measurement that multiplies", with("link log"), "gaussian", "log", []string{"distribution"}},
		{"people", with("people pop"), "poisson", "log", []string{"distribution", "link"}},
		{"effort", with("effort hours"), "poisson", "log", []string{"distribution", "link"}},
		{"expected", with("expected e"), "poisson", "log", []string{"distribution", "link"}},
		{"area with its unit", with("area ground", "area-unit ha"), "poisson", "log", []string{"distribution", "link"}},
		{"area with the unit in the name", with("area area_ha"), "poisson", "log", []string{"area_unit", "distribution", "link"}},
		{"trials", with("trials n"), "binomial", "logit", []string{"distribution", "link"}},
		{"counts without a denominator", with("distribution poisson"), "poisson", "log", []string{"link"}},
		{"amounts", with("distribution tweedie", "effort hours"), "tweedie", "log", []string{"link"}},
		{"positive measurements", with("distribution gamma"), "gamma", "log", []string{"link"}},
		{"counts that scatter", with("people pop", "distribution negative-binomial"), "negative-binomial", "log", []string{"link"}},
		{"positives that scatter", with("trials n", "distribution beta-binomial"), "beta-binomial", "logit", []string{"link"}},
		{"extreme values", with("trials n", "link complementary-log-log"), "binomial", "complementary-log-log", []string{"distribution"}},
		{"all said", with("distribution binomial", "trials n", "link logit"), "binomial", "logit", nil},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s, err := say(t, test.said...).Resolve()
			if err != nil {
				t.Fatal(err)
			}
			if *s.Distribution != test.distribution || *s.Link != test.link {
				t.Errorf("got %s, %s", *s.Distribution, *s.Link)
			}
			var chosen []string
			for _, e := range s.Effective() {
				if e.Chosen {
					chosen = append(chosen, e.Key)
					if e.Why == "" || e.Why == byDefault {
						t.Errorf("%s is chosen without a reason", e.Key)
					}
				}
			}
			if !slices.Equal(chosen, test.chosen) {
				t.Errorf("chosen: %v, want %v", chosen, test.chosen)
			}
			again, err := s.Resolve()
			if err != nil || !reflect.DeepEqual(again, s) {
				t.Errorf("resolving twice changes something: %v, %v", err, again.Effective())
			}
		})
	}
}

// TestChoosesVariation: the data decide about extra variation where a count or a number positive is all that is known.
func TestChoosesVariation(t *testing.T) {
	tests := []struct {
		name string
		said []string
		want bool
	}{
		{"counts", with("people pop"), true},
		{"positives", with("trials n"), true},
		{"asked for", with("people pop", "extra-variation auto"), true},
		{"asked for beside a distribution", with("distribution poisson", "extra-variation auto"), true},
		{"a distribution that was said", with("people pop", "distribution poisson"), false},
		{"scaled", with("people pop", "extra-variation scale"), false},
		{"none", with("trials n", "extra-variation none"), false},
		{"cross-validated", with("people pop", "smoothness gcv"), false},
		{"a number", with("people pop", "smoothness 4"), true},
		{"another link", with("trials n", "link complementary-log-log"), false},
		{"measurements", with(), false},
		{"scattering already", with("people pop", "distribution negative-binomial"), false},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s, err := say(t, test.said...).Resolve()
			if err != nil {
				t.Fatal(err)
			}
			if s.ChoosesVariation() != test.want {
				t.Errorf("got %v", !test.want)
			}
		})
	}
	// What the data chose is not what somebody said, and the record keeps that they were to choose.
	s, err := say(t, with("people pop")...).Resolve()
	if err != nil {
		t.Fatal(err)
	}
	s.Choose("distribution", NegativeBinomial, "the counts scatter more than poisson")
	if e, ok := entry(s.Effective(), "extra_variation"); !ok || e.Value != Auto || e.Chosen {
		t.Errorf("recorded %v: %+v", ok, e)
	}
}

// TestCovariates: numbers and categories with those that curves and surfaces are per, each once.
func TestCovariates(t *testing.T) {
	s := say(t, "linear a", "curve b", "curve-per c=soil", "curve-per d=soil", "category lime", "surface-per year", "group observer")
	if got := s.Numbers(); !slices.Equal(got, []string{"a", "b", "c", "d"}) {
		t.Errorf("numbers %q", got)
	}
	if got := s.Categories(); !slices.Equal(got, []string{"lime", "soil", "year"}) {
		t.Errorf("categories %q", got)
	}
	s = say(t, "curve-per c=soil", "category soil", "surface-per soil")
	if got := s.Categories(); !slices.Equal(got, []string{"soil"}) {
		t.Errorf("categories %q", got)
	}
}

// TestShapeBounds: what a shape may be is what the distribution takes.
func TestShapeBounds(t *testing.T) {
	for name, shape := range shapes {
		d, err := response.New(name, "")
		if err != nil {
			t.Fatal(err)
		}
		shaped := d.(response.Shaped)
		if shaped.ShapeName() != shape.name {
			t.Errorf("%s: its shape is the %s, not the %s", name, shaped.ShapeName(), shape.name)
		}
		for v, want := range map[float64]bool{shape.lo: true, shape.hi: true, shape.lo * (1 - 1e-9): false, shape.hi * (1 + 1e-9): false} {
			if _, err := shaped.WithShape(v); (err == nil) != want {
				t.Errorf("%s takes a %s of %g: %v, %v", name, shape.name, v, !want, err)
			}
		}
	}
	for _, name := range response.Names() {
		d, err := response.New(name, "")
		if err != nil {
			t.Fatal(err)
		}
		_, shaped := d.(response.Shaped)
		if _, ok := shapes[name]; ok != shaped {
			t.Errorf("%s has a shape: %v, and a bound: %v", name, shaped, ok)
		}
		if _, ok := links[name]; !ok {
			t.Errorf("no word of links for %s", name)
		}
		for _, link := range links[name] {
			if _, err := response.New(name, link); err != nil {
				t.Errorf("%s with %s: %v", name, link, err)
			}
		}
	}
}

func TestUnitInName(t *testing.T) {
	for column, want := range map[string]string{
		"area_ha": "ha", "Area (km2)": "km2", "m2": "m2", "area.HA": "ha", "alpha": "", "area": "", "ha_left": "", "": "", "%": "",
		"area km²": "", "areaha": "",
	} {
		if got := unitInName(column); got != want {
			t.Errorf("%q: got %q, want %q", column, got, want)
		}
	}
}

// TestMootDefaults: a default that has no bearing is not recorded, what was said always is.
func TestMootDefaults(t *testing.T) {
	tests := []struct {
		name    string
		said    []string
		absent  []string
		present []string
	}{
		{"lattice", with(), []string{"per", "cell_size"}, []string{"cells_across", "max_knots", "smoothness"}},
		{"cell size", with("cell-size 5"), []string{"cells_across"}, []string{"cell_size"}},
		{"places", with("at p.csv"), []string{"cells_across"}, []string{"at"}},
		{"no surface", with("surface none"), []string{"max_knots", "smoothness"}, []string{"surface", "cells_across"}},
		{"rates", with("people pop"), nil, []string{"per", "extra_variation"}},
		{"measurements", with(), []string{"extra_variation"}, []string{"smoothness_uncertainty", "shrink"}},
		{"a distribution that was said", with("people pop", "distribution poisson"), []string{"extra_variation"}, []string{"distribution"}},
		{"a regression", with("surface none", "linear d", "at p.csv"), []string{"smoothness_uncertainty", "shrink", "max_knots"}, nil},
		{"curves alone", with("surface none", "curve d", "at p.csv"), []string{"shrink", "max_knots"}, []string{"smoothness_uncertainty", "smoothness"}},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			s, err := say(t, test.said...).Resolve()
			if err != nil {
				t.Fatal(err)
			}
			list := s.Effective()
			for _, key := range test.absent {
				if e, ok := entry(list, key); ok {
					t.Errorf("recorded: %+v", e)
				}
			}
			for _, key := range test.present {
				if _, ok := entry(list, key); !ok {
					t.Errorf("%s is not recorded", key)
				}
			}
			if s.CellsAcross == nil || s.MaxKnots == nil || s.Smoothness == nil || s.Per == nil {
				t.Error("a resolved setting with a default is nil")
			}
		})
	}
}

func TestEffectiveHidesTheMachine(t *testing.T) {
	s, err := say(t, "observations /home/someone/data/plots.csv", "response stems", "zones ../shapes/zones.geojson",
		"workers 7", "force", "quiet").Resolve()
	if err != nil {
		t.Fatal(err)
	}
	for _, e := range s.Effective() {
		switch e.Key {
		case "workers", "force", "quiet":
			t.Errorf("recorded: %+v", e)
		case "observations":
			if e.Value != "plots.csv" {
				t.Errorf("the path shows: %v", e.Value)
			}
		case "zones":
			if e.Value != "zones.geojson" {
				t.Errorf("the path shows: %v", e.Value)
			}
		}
	}
}

func TestFilesAndRelativeTo(t *testing.T) {
	s := say(t, "observations data/plots.csv", "response stems", "at /abs/places.csv", "within edge.geojson")
	moved := s.RelativeTo("plans")
	if got := moved.Files(); !slices.Equal(got, []string{"plans/data/plots.csv", "plans/edge.geojson", "/abs/places.csv"}) {
		t.Errorf("got %q", got)
	}
	if got := s.Files(); !slices.Equal(got, []string{"data/plots.csv", "edge.geojson", "/abs/places.csv"}) {
		t.Errorf("the original changed: %q", got)
	}
}

func TestDenominator(t *testing.T) {
	s := say(t, "area ground")
	if kind, column := s.Denominator(); kind != "area" || column != "ground" {
		t.Errorf("got %q, %q", kind, column)
	}
	if kind, column := (Settings{}).Denominator(); kind != "" || column != "" {
		t.Errorf("got %q, %q", kind, column)
	}
}
