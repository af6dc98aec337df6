package plan

import (
	"slices"
	"strings"
	"unicode"
)

// Resolve validates s, lays it over Defaults and makes the choices that need no data: the distribution, the link and
// the unit of an area. Settings that are resolved already come back unchanged. The error is an *Error.
func (s Settings) Resolve() (Settings, error) {
	if err := s.Validate(); err != nil {
		return Settings{}, err
	}
	out := s.Over(Defaults())
	if out.Distribution == nil {
		name, why := s.distribution()
		out.Choose("distribution", name, why)
	}
	if out.Link == nil {
		out.Choose("link", links[*out.Distribution][0], "the usual link of "+*out.Distribution)
	}
	if out.Area != nil && out.AreaUnit == nil {
		out.Choose("area-unit", unitInName(*out.Area), "the name of the area column ends in it")
	}
	if out.Length != nil {
		out.measureStrips()
	}
	return out, nil
}

// measureStrips settles the units of strips.
func (s *Settings) measureStrips() {
	if s.LengthUnit == nil {
		s.Choose("length-unit", lengthUnitInName(*s.Length), "the name of the length column ends in it")
	}
	if s.AreaUnit == nil {
		unit := map[string]string{Metres: Hectares, Kilometres: SquareKilometres}[*s.LengthUnit]
		s.Choose("area-unit", unit, "the strips' length is in "+*s.LengthUnit)
	}
}

// links lists the links that suit a distribution, the usual one first. A mean that may be negative adds up as it is;
// a count multiplies; a share adds up in its logit (common practice, no source).
var links = map[string][]string{
	Gaussian:         {Identity, Log},
	Gamma:            {Log},
	Tweedie:          {Log},
	Poisson:          {Log},
	NegativeBinomial: {Log},
	Binomial:         {Logit, ComplementaryLogLog},
	BetaBinomial:     {Logit},
}

// distribution returns what was said or else what follows from the other words, and why.
func (s Settings) distribution() (name, why string) {
	kind, column := s.Denominator()
	switch {
	case s.Distribution != nil:
		return *s.Distribution, s.why["distribution"]
	case s.Trials != nil:
		return Binomial, "the response is a number positive, with the number examined in " + *s.Trials
	case kind != "":
		return Poisson, "the response is a count with " + kind + " (" + column + ") behind it"
	}
	return Gaussian, "no denominator and no trials are named, so the response is taken for a measurement"
}

func (s Settings) link() string {
	if s.Link != nil {
		return *s.Link
	}
	d, _ := s.distribution()
	return links[d][0]
}

// unitInName finds the unit of an area at the end of the name of its column, as in area_ha or "Area (km2)", or
// returns "".
func unitInName(column string) string {
	return lastWord(column, SquareMetres, Hectares, SquareKilometres)
}

// lengthUnitInName does so for the unit of a length.
func lengthUnitInName(column string) string { return lastWord(column, Metres, Kilometres) }

// lastWord is the last word of a column's name if it is one of among, else "".
func lastWord(column string, among ...string) string {
	parts := strings.FieldsFunc(strings.ToLower(column), func(r rune) bool {
		return !unicode.IsLetter(r) && !unicode.IsDigit(r)
	})
	if len(parts) == 0 || !slices.Contains(among, parts[len(parts)-1]) {
		return ""
	}
	return parts[len(parts)-1]
}
