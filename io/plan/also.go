package plan

import (
	"slices"
	"strings"
)

// Alternative is another way to fit the same rows, told by the words in which it differs.
type Alternative struct {
	Name  string // as it was said
	words []said
}

type said struct{ word, value string }

func (a Alternative) plain() any { return a.Name }

// modelWords are the words in which an alternative may differ: those that say what is fitted.
var modelWords = []string{"distribution", "link", "shape", "extra-variation", "surface", "surface-per", "surface-smoothness", "shrink",
	"max-knots", "smoothness", "smoothness-uncertainty", "linear", "curve", "curve-per", "category", "group"}

func parseAlternative(value string) (Alternative, error) {
	a := Alternative{Name: strings.TrimSpace(value)}
	for part := range strings.SplitSeq(value, ";") {
		word, v, _ := strings.Cut(part, "=")
		word, v = strings.ReplaceAll(strings.TrimSpace(word), "_", "-"), strings.TrimSpace(v)
		if !slices.Contains(modelWords, word) {
			hint := "it may differ in " + strings.Join(modelWords, ", ")
			if near, ok := Nearest(word, modelWords); ok {
				hint = "did you mean " + near + "?"
			}
			return a, blame(word, advise("is no word in which a model can differ", hint))
		}
		a.words = append(a.words, said{word, v})
	}
	return a, nil
}

func hintOf(err error) string {
	if e, ok := err.(*Error); ok {
		return e.hint
	}
	return ""
}

// Candidate is a model to compare: its name and the settings it follows from.
type Candidate struct {
	Name string
	Settings
}

// Candidates lists the map's own model, "as asked", and the alternatives, each resolved. Words that say where to predict
// and what to report do not come into it. The error is an *Error.
func (s Settings) Candidates() ([]Candidate, error) {
	base := s.onlyModel()
	own, err := base.Resolve()
	if err != nil {
		return nil, err
	}
	list := []Candidate{{"as asked", own}}
	for _, a := range s.Also {
		var differs Settings
		for _, w := range a.words {
			word, _ := Lookup(w.word)
			if err := word.Set(&differs, w.value); err != nil {
				return nil, refuse("also", hintOf(err), "%q has a part that cannot be: %v", a.Name, err)
			}
		}
		merged, err := differs.Over(base.without(differs)).Resolve()
		if err != nil {
			return nil, refuse("also", hintOf(err), "%q cannot be fitted: %v", a.Name, err)
		}
		list = append(list, Candidate{a.Name, merged})
	}
	return list, nil
}

// without returns s without what an alternative rules out: the surface's words where it has none, and the covariates that
// it gives another role.
func (s Settings) without(differs Settings) Settings {
	if differs.Surface != nil && *differs.Surface == NoSurface {
		s.MaxKnots, s.Shrink, s.SurfacePer, s.SurfaceSmoothness = nil, nil, nil, nil
		if s.Smoothness != nil && s.Smoothness.By == ByNumber {
			s.Smoothness = nil
		}
	}
	taken := map[string]bool{}
	for _, c := range differs.covariates() {
		taken[c.column] = true
	}
	for _, list := range []*[]string{&s.Linear, &s.Curve, &s.Category, &s.Group} {
		*list = slices.DeleteFunc(slices.Clone(*list), func(c string) bool { return taken[c] })
	}
	s.CurvePer = slices.DeleteFunc(slices.Clone(s.CurvePer), func(c CurvePer) bool { return taken[c.Curve] })
	return s
}

// onlyModel keeps what was said of the rows and the model. A map needs values of covariates everywhere, a fit does not:
// places of one's own stand in for them.
func (s Settings) onlyModel() Settings {
	var model Settings
	for _, w := range words {
		keep := slices.Contains(modelWords, w.Name) || w.Group == groupData || w.Group == groupKind || w.RunOnly || w.Name == "seed"
		if keep && s.Said(w.Name) {
			w.copy(&model, &s)
		}
	}
	model.At = new("places")
	return model
}
