package summary

import (
	"cmp"
	"fmt"
	"io"
	"maps"
	"math"
	"slices"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

const (
	width  = 96 // columns, where lines of the telling are broken
	indent = 9  // of the sentences, behind the word in front
	most   = 20 // lines that the telling comes to, as far as zones can give way
)

// Words tells the run in ten to twenty lines, each a word and a sentence: what went in, what was fitted, what it says and
// how sure it is, what to look at, and where it was written. A reader without statistics can stop after the level; the
// figures in brackets are for one with. Long lists are shortened: the whole is in summary.json and the tables.
func (d Document) Words(w io.Writer) error {
	before := []line{
		{"data", d.dataWords()},
		{"joined", d.joinWords()},
		{"places", d.placeWords()},
		{"model", d.modelWords()},
		{"surface", d.surfaceWords()},
		{"effects", d.covariateWords()},
		{"level", d.levelWords()},
		{"limits", d.limitWords()},
		{"above", d.aboveWords()},
	}
	after := []line{}
	if d.Zones != nil {
		after = append(after, line{"zones", d.Zones.Note})
	}
	for _, t := range d.Tests {
		after = append(after, line{"test", t.words()})
	}
	after = append(after, line{"compare", d.candidateWords()})
	after = append(after, d.checkWords()...)
	after = append(after, line{"caution", d.cautionWords()}, line{"written", d.writtenWords()})
	zones := d.zoneWords(most - height(before) - height(after))
	for _, l := range slices.Concat(before, zones, after) {
		if _, err := io.WriteString(w, l.broken()); err != nil {
			return err
		}
	}
	return nil
}

// line is a word in front and the text behind it; without text nothing is told.
type line struct{ word, text string }

// tie is a blank at which no line is broken.
const tie = '\u00a0'

// broken is the line as it is shown: broken at width, with the rest indented. What could steer a terminal is taken out,
// for names come from the user's files.
func (l line) broken() string {
	if l.text == "" {
		return ""
	}
	var b strings.Builder
	fmt.Fprintf(&b, "%-*s", indent, l.word)
	at := indent
	for i, part := range strings.FieldsFunc(l.text, func(r rune) bool { return r != tie && unicode.IsSpace(r) }) {
		part = strings.Map(shown, part)
		n := utf8.RuneCountInString(part)
		switch {
		case i > 0 && at+1+n > width:
			fmt.Fprintf(&b, "\n%*s", indent, "")
			at = indent
		case i > 0:
			b.WriteByte(' ')
			at++
		}
		b.WriteString(part)
		at += n
	}
	b.WriteByte('\n')
	return b.String()
}

func shown(r rune) rune {
	switch {
	case r == tie:
		return ' '
	case !unicode.IsGraphic(r):
		return unicode.ReplacementChar
	}
	return r
}

// height is how many lines a terminal shows.
func height(lines []line) (n int) {
	for _, l := range lines {
		n += strings.Count(l.broken(), "\n")
	}
	return n
}

// zoneWords tells the zones in about the room there is, but two at least.
func (d Document) zoneWords(room int) []line {
	if d.Zones == nil {
		return nil
	}
	var told []line
	for _, text := range d.Zones.Lines {
		told = append(told, line{"zone", text})
	}
	const least = 2
	if height(told) <= room {
		return told
	}
	for len(told) > least && height(told)+1 > room {
		told = told[:len(told)-1]
	}
	if rest := d.Zones.Count - len(told); rest > 0 {
		told = append(told, line{"zone", fmt.Sprintf("and %d more in zones.csv", rest)})
	}
	return told
}

// words tells a test.
func (t Test) words() string {
	switch {
	case t.Skipped != "":
		return fmt.Sprintf("%s: no test, %s", t.Of, t.Skipped)
	case t.Draws > 0:
		return fmt.Sprintf("%s: p %s; %d of %d draws without it gain as much", t.Of, Short(t.P), t.Exceeded, t.Draws)
	}
	return fmt.Sprintf("%s: p %s; statistic %s on %s degrees of freedom", t.Of, Short(t.P), Short(t.Statistic), Short(t.DegreesOfFreedom))
}

// candidateWords names the alternatives that predict rows left out better than the map's own model, or says that none do.
func (d Document) candidateWords() string {
	if len(d.Candidates) == 0 {
		return ""
	}
	var parts []string
	for _, c := range d.Candidates[1:] {
		switch {
		case math.IsNaN(float64(c.Difference)):
			parts = append(parts, c.Name+": no score")
		default:
			parts = append(parts, fmt.Sprintf("%s: %s a row (standard error %s)", c.Name, signed(c.Difference), Short(c.DifferenceSE)))
		}
	}
	return "log score of rows left out in blocks, against the model as asked, more is better: " + strings.Join(parts, ", ") + "; see candidates.csv"
}

func signed(n Number) string {
	if n > 0 {
		return "+" + Short(n)
	}
	return Short(n)
}

func (d Document) dataWords() string {
	s := fmt.Sprintf("%s: %d of %s used", d.Input.Name, d.Input.Used, count(d.Input.Rows, "row"))
	if d.Input.Fitted != 0 {
		s += fmt.Sprintf(", fitted as %d", d.Input.Fitted)
	}
	if r := d.Input.Raster; r != nil {
		s += fmt.Sprintf(" (a raster of %s with a value", count(r.Cells, "cell"))
		if r.Step > 1 {
			s += fmt.Sprintf(", one in %d in both directions taken", r.Step)
		}
		s += ")"
	} else if d.Input.Format != "" {
		s += " (" + d.Input.Format + ")"
	}
	reasons := slices.SortedFunc(maps.Keys(d.Input.SetAside), func(a, b string) int {
		return cmp.Or(cmp.Compare(d.Input.SetAside[b], d.Input.SetAside[a]), cmp.Compare(a, b))
	})
	if len(reasons) == 0 {
		return s
	}
	const most = 4
	var parts []string
	other := 0
	for k, r := range reasons {
		if n := d.Input.SetAside[r]; k < most || len(reasons) == most+1 {
			parts = append(parts, fmt.Sprintf("%d %s", n, strings.ReplaceAll(r, "-", " ")))
		} else {
			other += n
		}
	}
	if other > 0 {
		parts = append(parts, fmt.Sprintf("%d for other reasons", other))
	}
	return s + "; set aside: " + strings.Join(parts, ", ")
}

// joinWords says what became of the keys, both ways.
func (d Document) joinWords() string {
	var parts []string
	for _, j := range d.Input.Joined {
		s := fmt.Sprintf("%s found in %s", count(j.Rows, "row"), j.Name)
		if j.Unmatched > 0 {
			s += fmt.Sprintf(", %s not", count(j.Unmatched, "key"))
		}
		if j.Unused > 0 {
			s += fmt.Sprintf(", %d of its keys without a row", j.Unused)
		}
		if j.Added > 0 {
			s += " and taken for " + count(j.Added, "zero")
		}
		if j.WithoutKey > 0 {
			s += fmt.Sprintf(", %s of it without a key passed over", count(j.WithoutKey, "row"))
		}
		parts = append(parts, s)
	}
	if d.Input.Summed > 0 {
		parts = append(parts, fmt.Sprintf("%s added up into others", count(d.Input.Summed, "row")))
	}
	return strings.Join(parts, "; ")
}

// kindWords says what the places are.
func (p Places) kindWords() string {
	var parts []string
	for _, k := range []struct {
		n    int
		what string
	}{{p.Areas, "area"}, {p.Lines, "line"}, {p.Points, "point"}} {
		if k.n > 0 {
			parts = append(parts, count(k.n, k.what))
		}
	}
	s := strings.Join(parts, ", ")
	if p.Inside != "" {
		s += ", " + p.Inside
	}
	if p.Unseen > 0 {
		s += fmt.Sprintf("; nobody looked at %d of them", p.Unseen)
	}
	return s
}

// stripWords says what makes the area searched, beside its own column.
func stripWords(said map[string]string) (s string) {
	if column, ok := said["length"]; ok {
		s = fmt.Sprintf("; counts divided by area, %s in %s times a width of %s", column, said["length_unit"], said["width"])
		if _, err := strconv.ParseFloat(said["width"], 64); err == nil {
			s += " m"
		}
	}
	if share, ok := said["detection"]; ok {
		s += " times the share detected, " + share + ","
	}
	return s
}

func (d Document) placeWords() string {
	s := count(d.Input.DistinctPlaces, "distinct place")
	if d.Places != nil {
		s = d.Places.kindWords()
	}
	if !math.IsNaN(float64(d.Input.MedianSpacing)) {
		s += ", median spacing " + metres(d.Input.MedianSpacing)
	}
	s += "; " + d.Input.Coordinates
	if d.ownPlaces() {
		return s + "; predicted at " + count(d.Lattice.Count, "place") + " of your own"
	}
	return s + fmt.Sprintf("; mapped on %s, %s across", count(d.Lattice.Count, "cell"), metres(d.Lattice.Cell))
}

func (d Document) ownPlaces() bool { return d.Lattice.Kind == "places" }

func (d Document) modelWords() string {
	s := fmt.Sprintf("%s with %s link", d.Fit.Distribution, d.Fit.Link)
	said := map[string]string{}
	for _, e := range d.Settings {
		said[e.Key] = fmt.Sprint(e.Value)
	}
	for _, kind := range []string{"people", "area", "effort", "expected"} {
		if column, ok := said[kind]; ok {
			what := "counts"
			if d.Fit.Distribution == "tweedie" {
				what = "amounts"
			}
			s += fmt.Sprintf("; %s divided by %s, column %s", what, kind, column)
		}
	}
	s += stripWords(said)
	if unit := said["area_unit"]; unit != "" {
		s += " in " + unit
	}
	if column, ok := said["trials"]; ok {
		s += "; positives among trials, column " + column
	}
	if column, ok := said["weight"]; ok {
		s += "; weights, column " + column
	}
	if v := d.Fit.ExtraVariation; v != nil { // the reason tells the shape
		s += fmt.Sprintf("; chosen over %s: %s", v.other(), v.Reason)
	} else if shape := d.Fit.Shape; shape != nil {
		s += shape.words()
	}
	switch {
	case d.Fit.DispersionKnown:
	case d.Fit.Distribution == "gaussian":
		s += "; residual standard deviation " + Short(Number(math.Sqrt(float64(d.Fit.Dispersion))))
	default:
		s += "; dispersion " + Short(d.Fit.Dispersion)
	}
	return s
}

func (d Document) surfaceWords() string {
	f := d.Fit
	kind := "thin-plate"
	if per := d.said("surface_per"); per != "" {
		kind += " for each level of " + per
	}
	share := fmt.Sprintf("the fit accounts for %s of the variation (deviance)", percent(f.DevianceShare))
	df, ok := f.DegreesOfFreedom["surface"]
	switch {
	case !ok:
		return fmt.Sprintf("none: a regression with %s; %s", freedom(f.DegreesOfFreedom["total"]), share)
	case f.Plane:
		return fmt.Sprintf("%s on %d knots, which came out as a tilted plane (smoothness by %s); %s", kind, f.Knots, f.Criterion, share)
	case df < vanished:
		return fmt.Sprintf("%s on %d knots, which vanished: no variation between places was found (smoothness by %s); %s", kind, f.Knots, f.Criterion, share)
	case kind != "thin-plate":
		return fmt.Sprintf("%s on %d knots, %s used in all (smoothness by %s); %s", kind, f.Knots, freedom(df), f.Criterion, share)
	}
	return fmt.Sprintf("%s on %d knots, %s used of %d (smoothness by %s); %s", kind, f.Knots, freedom(df), f.Knots-1, f.Criterion, share)
}

// vanished is the degrees of freedom below which nothing is left of a surface.
const vanished = 0.05

// freedom is so many degrees of freedom.
func freedom(n Number) string {
	if s := Short(n); s != "1" {
		return s + " degrees of freedom"
	}
	return "1 degree of freedom"
}

// said returns the value of a setting in force, or nothing.
func (d Document) said(key string) string {
	for _, e := range d.Settings {
		if e.Key == key {
			return fmt.Sprint(e.Value)
		}
	}
	return ""
}

func (s Shape) words() string {
	if s.Simpler != "" {
		return fmt.Sprintf("; %s at its bound, %s, where it is as good as %s", s.Name, Short(s.Value), s.Simpler)
	}
	return fmt.Sprintf("; %s %s", s.Name, Short(s.Value))
}

// other is the distribution that was not chosen.
func (v ExtraVariation) other() string {
	if v.Chosen == v.Plain {
		return v.Extra
	}
	return v.Plain
}

func (d Document) covariateWords() string {
	var parts []string
	for _, e := range d.Effects {
		switch e.Role {
		case "curve":
			name := e.Name
			if e.Per != "" {
				name += " (" + e.Per + ")"
			}
			parts = append(parts, fmt.Sprintf("%s a curve of %s", name, freedom(e.DegreesOfFreedom)))
		case "group":
			scatter := "scatter by " + Short(e.Deviation)
			if e.DegreesOfFreedom < vanished {
				scatter = "do not differ"
			}
			parts = append(parts, fmt.Sprintf("%s in %s that %s", e.Name, e.Range, scatter))
		}
	}
	for _, c := range d.Coefficients {
		if c.Name == "intercept" {
			continue
		}
		parts = append(parts, fmt.Sprintf("%s %s (%s to %s)", c.Name, Short(c.Estimate), Short(c.Lower), Short(c.Upper)))
	}
	const most = 6
	more := ""
	if len(parts) > most {
		more = fmt.Sprintf(" and %d more", len(parts)-most)
		parts = parts[:most]
	}
	var told []string
	if s := strings.Join(parts, ", ") + more; s != "" && d.Fit.Link != "identity" {
		told = append(told, "on the "+d.Fit.Link+" scale: "+s)
	} else if s != "" {
		told = append(told, s)
	}
	if held := d.held(); held != nil {
		told = append(told, "the map is adjusted to "+strings.Join(held, ", "))
	}
	return strings.Join(told, "; ")
}

// held lists what the map is adjusted to, a covariate with several curves once.
func (d Document) held() (list []string) {
	for _, e := range d.Effects {
		if text := e.Name + " = " + e.Held; e.Held != "" && !slices.Contains(list, text) {
			list = append(list, text)
		}
	}
	return list
}

func (d Document) levelWords() string {
	e, where := d.Estimates, "across the map, half of it"
	if d.ownPlaces() {
		where = "at your places, half of them"
	}
	return fmt.Sprintf("%s to %s %s below %s (%s)", Short(e.Least), Short(e.Most), where, Short(e.Median), e.Unit)
}

func (d Document) limitWords() string {
	e := d.Estimates
	return fmt.Sprintf("%s limits of the mean, not of a future observation; median standard error %s", percent(e.Confidence), Short(e.MedianStandardError))
}

func (d Document) aboveWords() string {
	e := d.Estimates
	if math.IsNaN(float64(e.Threshold)) {
		return ""
	}
	rest := fmt.Sprintf("a chance over 0.95 of more than %s (%s)", Short(e.Threshold), e.Unit)
	switch own := d.ownPlaces(); {
	case e.Above == 0 && own:
		return "none of your places has " + rest
	case e.Above == 0:
		return "nowhere on the map is there " + rest
	case own:
		return percent(e.Above) + " of your places have " + rest
	}
	return percent(e.Above) + " of the map has " + rest
}

// checkWords tells the checks that found something, the gravest first, and names the others.
func (d Document) checkWords() []line {
	var told []line
	var clear []string
	for _, level := range []Level{Stop, Look, Clear} {
		for _, c := range d.Checks {
			switch {
			case c.Level != level:
			case level == Clear:
				clear = append(clear, c.Name)
			default:
				told = append(told, line{string(c.Level), c.Sentence})
			}
		}
	}
	switch {
	case clear == nil:
		return told
	case told == nil:
		return []line{{string(Clear), "nothing was found by the checks of " + listed(clear)}}
	}
	return append(told, line{string(Clear), "nothing was found by the other checks, of " + listed(clear)})
}

// listed joins names as a sentence does.
func listed(names []string) string {
	last := len(names) - 1
	if last == 0 {
		return names[0]
	}
	return strings.Join(names[:last], ", ") + " and " + names[last]
}

func (d Document) cautionWords() string {
	switch n := len(d.Cautions); n {
	case 0:
		return ""
	case 1:
		return d.Cautions[0]
	default:
		return fmt.Sprintf("%s (%d more in summary.json)", d.Cautions[0], n-1)
	}
}

func (d Document) writtenWords() string {
	names := []string{"summary.json"}
	for _, o := range d.Outputs {
		names = append(names, o.File)
	}
	return d.Folder + ": " + strings.Join(names, ", ")
}

// Short writes a number for reading: three significant digits, but whole numbers in full up to a thousand million, and
// an exponent only beyond that or below a thousandth. A number that is not finite is "unknown".
func Short(n Number) string {
	v := float64(n)
	switch a := math.Abs(v); {
	case math.IsNaN(v) || math.IsInf(v, 0):
		return "unknown"
	case a == 0:
		return "0"
	case a >= 1e9 || a < 1e-3:
		return strconv.FormatFloat(v, 'g', 3, 64)
	case a >= 100:
		return strconv.FormatFloat(v, 'f', 0, 64)
	default:
		digits := 2 - int(math.Floor(math.Log10(a)))
		s := strconv.FormatFloat(v, 'f', digits, 64)
		return strings.TrimSuffix(strings.TrimRight(s, "0"), ".")
	}
}

// percent writes a share; what is left of 0 by rounding is 0.
func percent(n Number) string {
	if math.Abs(float64(n)) < 1e-10 {
		n = 0
	}
	return Short(100*n) + string(tie) + "%"
}

func metres(n Number) string {
	if n >= 10000 {
		return Short(n/1000) + string(tie) + "km"
	}
	return Short(n) + string(tie) + "m"
}

func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return strconv.Itoa(n) + " " + noun + "s"
}
