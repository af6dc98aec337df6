package plan

// joinsSuit holds together the words that join files.
func joinsSuit(s Settings) error {
	joined := s.Places != nil || len(s.Join) > 0
	d, _ := s.distribution()
	switch {
	case joined && s.Key == nil:
		return refuse("key", "add --key COLUMN, or COLUMN=PROPERTY if the file calls it something else",
			"nothing says which column of the observations finds its place in %s", s.firstJoined())
	case !joined && s.Key != nil && s.Key.Property != s.Key.Column:
		return refuse("key", "name a file with --places or --join, or leave out the property", "there is no file to find %q in", s.Key.Property)
	case s.Places == nil && s.Absent != nil:
		return refuse("absent", "name the file of places with --places", "without places none can be without a row")
	case s.Absent != nil && *s.Absent == AbsentZero && (d == Gaussian || d == Gamma):
		return refuse("absent", "use --absent missing", "nothing measured is not a measurement of 0")
	case s.Key != nil && s.Response != nil && s.Key.Column == *s.Response:
		return refuse("key", "", "column %q is already the response", s.Key.Column)
	}
	return nil
}

func (s Settings) firstJoined() string {
	if s.Places != nil {
		return "--places"
	}
	return "--join"
}

// sumSuits refuses to add up what has no sum.
func sumSuits(s Settings) error {
	if s.SumBy == nil {
		return nil
	}
	d, _ := s.distribution()
	switch {
	case d == Gaussian || d == Gamma:
		return refuse("sum-by", "give every place one row, or leave out --sum-by: rows at one place are fitted as they are",
			"measurements (%s) do not add up", d)
	case s.Weight != nil:
		return refuse("sum-by", "leave out --weight", "the weights of rows that are added up have no meaning")
	case s.Response != nil && *s.SumBy == *s.Response:
		return refuse("sum-by", "", "column %q is already the response", *s.SumBy)
	}
	return nil
}
