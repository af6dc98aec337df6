package plan

// stripsSuit holds the words of strips together: a length and a width make an area.
func stripsSuit(s Settings) error {
	switch {
	case s.Length == nil && s.Width != nil:
		return refuse("width", "name the column with the length of the strips with --length", "a width makes no area without a length")
	case s.Length == nil && s.LengthUnit != nil:
		return refuse("length-unit", "name the column with the length with --length", "no length is named")
	case s.Length == nil:
		return nil
	case s.Width == nil:
		return refuse("length", "add --width with the whole width of a strip in metres; for a count per length walked use --effort",
			"a length makes no area without a width")
	case s.LengthUnit == nil && lengthUnitInName(*s.Length) == "":
		return refuse("length", "add --length-unit m or km", "the unit of column %q is not given", *s.Length)
	case s.LengthUnit != nil && s.Said("length-unit") && lengthUnitInName(*s.Length) != "" && lengthUnitInName(*s.Length) != *s.LengthUnit:
		return refuse("length-unit", "leave it out, or rename the column", "the name of column %q says %s, not %s",
			*s.Length, lengthUnitInName(*s.Length), *s.LengthUnit)
	case s.Width.Column != "" && lengthUnitInName(s.Width.Column) == Kilometres:
		return refuse("width", "give it in metres", "the name of column %q says kilometres, and a width is in metres", s.Width.Column)
	}
	return nil
}

// exposureSuits refuses factors of a denominator that is not there.
func exposureSuits(s Settings) error {
	kind, _ := s.Denominator()
	if s.Detection != nil && kind != "area" {
		return refuse("detection", "name the area searched with --area, or with --length and --width",
			"it multiplies the area searched, and no area is named")
	}
	if s.ExposureCV != nil && kind == "" {
		return refuse("exposure-cv", "name the denominator with --area, --length, --effort, --people or --expected",
			"it is the uncertainty of a denominator, and none is named")
	}
	if s.ExposureStrata != nil && s.ExposureCV == nil {
		return refuse("exposure-strata", "give the coefficient of variation with --exposure-cv", "there is no factor for rows to share")
	}
	return s.exposureApart()
}

// exposureApart refuses a column of a factor that is already something else.
func (s Settings) exposureApart() error {
	_, denominator := s.Denominator()
	taken := map[string]string{denominator: "the denominator"}
	if s.Response != nil {
		taken[*s.Response] = "the response"
	}
	for _, f := range []struct {
		word string
		*Amount
	}{{"width", s.Width}, {"detection", s.Detection}, {"exposure-cv", s.ExposureCV}} {
		if f.Amount == nil || f.Column == "" {
			continue
		}
		if other, again := taken[f.Column]; again {
			return refuse(f.word, "", "column %q is already %s", f.Column, other)
		}
		taken[f.Column] = f.word
	}
	return nil
}
