package inspect

import (
	"fmt"
	"math"
	"slices"
	"strconv"
	"strings"

	"drumlin/io/plan"
)

// propose puts the likeliest candidate into a command.
func (e *examiner) propose() {
	c := e.report.Coordinates
	if c == nil || len(e.report.Candidates) == 0 {
		return
	}
	best := e.report.Candidates[0]
	var s plan.Settings
	set := func(word, value string) {
		if w, ok := plan.Lookup(word); ok && w.Set(&s, value) != nil {
			e.undecided(fmt.Sprintf("how to say %s %s", word, value))
		}
	}
	set("response", best.Response)
	e.sayPlaces(set)
	p := &Proposal{Open: append([]string{}, e.first...)}
	if best.Word != "" {
		set(best.Word, best.Column)
		if best.Word == "people" {
			if per := e.per(best); per > 1 {
				set("per", short(per))
			}
		}
	}
	if best.Kind == "count" && best.Word == "" {
		set("distribution", plan.Poisson)
		set("extra-variation", plan.Auto)
	}
	if best.unsure {
		share := "large"
		if best.Word == "people" {
			share = "small"
		}
		e.undecided(fmt.Sprintf("whether %s holds people (--people) or examined (--trials): it is taken for %s, because %s is a %s share of it",
			best.Column, best.Word, best.Response, share))
	}
	s = s.Over(e.said)
	if best.Word == "area" && s.AreaUnit == nil && !slices.Contains(areaUnits, lastPart(best.Column)) {
		p.Open = append(p.Open, fmt.Sprintf("the unit of %s is not told: add --area-unit m2, ha or km2", best.Column))
	}
	p.settings = s
	p.Command = command(s, "map-"+slug(best.Response))
	p.Settings = map[string]any{}
	for _, entry := range s.Effective() {
		p.Settings[entry.Key] = entry.Value
	}
	p.Settings["observations"] = e.report.File
	p.Choices = e.choices(s)
	e.report.Proposal = p
}

func lastPart(name string) string {
	list := parts(name)
	if len(list) == 0 {
		return ""
	}
	return list[len(list)-1]
}

// sayPlaces names what tells the places where map would not find it by itself.
func (e *examiner) sayPlaces(set func(word, value string)) {
	c, s := e.report.Coordinates, e.survey
	x, y := c.X, c.Y
	if e.swapped {
		x, y = y, x
	}
	switch {
	case s.Features:
	case s.Shapes != nil:
		set("geometry", s.GeometryName)
	case c.Found != "by name" || e.swapped:
		set("x", x)
		set("y", y)
	}
	switch {
	case e.crs != "":
		set("crs", e.crs)
	case e.swapped && c.Taken == "degrees":
		set("crs", "EPSG:4326")
	}
	if key := e.key(); key != "" {
		set("key", key)
	}
}

// per is the power of ten of people among whom there is a case or more, on the whole, or 1.
func (e *examiner) per(c Candidate) float64 {
	cases, people := e.survey.Column(c.Response).Mean, e.survey.Column(c.Column).Mean
	if !(cases > 0 && people > 0) {
		return 1
	}
	return min(1e6, math.Pow(10, max(0, math.Ceil(-math.Log10(cases/people)))))
}

// slug is a name as the name of a folder.
func slug(name string) string {
	list := parts(name)
	if len(list) == 0 {
		return "response"
	}
	return strings.Join(list, "-")
}

// command is the command line of a map, for a POSIX shell.
func command(s plan.Settings, out string) string {
	obs := *s.Observations
	if strings.HasPrefix(obs, "-") {
		obs = "./" + obs
	}
	words := []string{"drumlin", "map", quoted(obs)}
	for _, entry := range s.Effective() {
		if entry.Key == "observations" {
			continue
		}
		words = append(words, flags(strings.ReplaceAll(entry.Key, "_", "-"), entry.Value)...)
	}
	return strings.Join(append(words, "--out", quoted(out)), " ")
}

// flags says a word, once for each value of a list.
func flags(name string, value any) []string {
	switch v := value.(type) {
	case bool:
		if v {
			return []string{"--" + name}
		}
		return []string{"--" + name + "=false"}
	case []string:
		var list []string
		for _, one := range v {
			list = append(list, flags(name, one)...)
		}
		return list
	case float64:
		return flags(name, strconv.FormatFloat(v, 'f', -1, 64))
	}
	text := fmt.Sprint(value)
	if strings.HasPrefix(text, "-") {
		return []string{quoted("--" + name + "=" + text)}
	}
	return []string{"--" + name, quoted(text)}
}

// choices says what map would choose for these settings, and why.
func (e *examiner) choices(s plan.Settings) []string {
	if s.Area != nil && s.AreaUnit == nil && !slices.Contains(areaUnits, lastPart(*s.Area)) {
		s.AreaUnit = new(plan.Hectares) // stands in for any: nothing else depends on it
	}
	resolved, err := s.Resolve()
	if err != nil {
		return []string{"these words do not go together: " + err.Error()}
	}
	var list []string
	for _, entry := range resolved.Effective() {
		switch entry.Key {
		case "distribution", "link", "area_unit":
			if entry.Chosen {
				list = append(list, fmt.Sprintf("%s %v: %s", strings.ReplaceAll(entry.Key, "_", " "), entry.Value, entry.Why))
			}
		}
	}
	if resolved.ChoosesVariation() {
		wider := plan.NegativeBinomial
		if *resolved.Distribution == plan.Binomial {
			wider = plan.BetaBinomial
		}
		list = append(list, fmt.Sprintf("%s in place of %s, if the data scatter more than that allows", wider, *resolved.Distribution))
	}
	if e.spanning() {
		list = append(list, e.spans(resolved))
	}
	return append(list, e.lattice(resolved), e.knots())
}

// lattice says in words what the surface would be predicted onto.
func (e *examiner) lattice(s plan.Settings) string {
	c := e.report.Coordinates
	across := *s.CellsAcross
	over := "surroundings of the places"
	if e.onlyAreas() {
		over = "union of the areas"
	}
	words := fmt.Sprintf("a lattice of %d cells along the longer side of the %s", across, over)
	side := max(c.Most[0]-c.Least[0], c.Most[1]-c.Least[1]) / float64(across)
	if c.Taken == "plane" && e.crs == "" && side > 0 {
		words += fmt.Sprintf(", so cells of about %s m", short(round(2, side)))
	}
	return words
}

// knots says in words what the surface would be made of.
func (e *examiner) knots() string {
	c := e.report.Coordinates
	if c.Places < fewPlaces {
		return "hardly a surface: there are too few places"
	}
	if c.Places <= 50 && !c.MorePlaces && !e.spanning() {
		return fmt.Sprintf("a thin-plate surface with a knot at each of the %d places, its smoothness chosen by the data", c.Places)
	}
	return "a thin-plate surface with 50 knots, doubled while the fit still moves, its smoothness chosen by the data"
}

// Starter is the plan that the report proposes: the proposal's words, for the regions that a column names if there is one.
func (r Report) Starter() plan.Starter {
	s := plan.Starter{File: r.File, Settings: r.said, Notes: slices.Clone(r.Undecided)}
	if r.Proposal != nil {
		s.Settings = r.Proposal.settings
		s.Notes = append(s.Notes, r.Proposal.Open...)
	}
	if len(r.Regions) > 0 {
		s.SplitBy = r.Regions[0]
	}
	return s
}
