package summary

import (
	"bufio"
	"fmt"
	"io"
	"maps"
	"math"
	"slices"
	"strconv"
	"strings"
)

// width is where lines of the telling are broken.
const width = 96

// Words tells the run in ten to twenty lines: what went in, what was fitted, what it says and how sure it is, what to
// look at, and where it was written. A reader without statistics can stop after the level; the figures in brackets are
// for one with.
func (d Document) Words(w io.Writer) error {
	t := &telling{out: bufio.NewWriter(w)}
	t.line("data", d.dataWords())
	t.line("places", d.placeWords())
	t.line("model", d.modelWords())
	t.line("surface", d.surfaceWords())
	if c := d.covariateWords(); c != "" {
		t.line("effects", c)
	}
	t.line("level", d.levelWords())
	t.line("sure", d.sureWords())
	if e := d.Estimates; !math.IsNaN(float64(e.Threshold)) {
		t.line("above", fmt.Sprintf("%s of the map exceeds %s with a chance over 0.95", percent(e.Above), Short(e.Threshold)))
	}
	if d.Zones != nil {
		for _, l := range d.Zones.Lines {
			t.line("zone", l)
		}
		if d.Zones.Note != "" {
			t.line("zones", d.Zones.Note)
		}
	}
	for _, c := range d.checksToTell() {
		t.line(string(c.Level), c.Sentence)
	}
	if len(d.Cautions) > 0 {
		t.line("caution", d.Cautions[0]+map[bool]string{true: fmt.Sprintf(" (%d more in summary.json)", len(d.Cautions)-1)}[len(d.Cautions) > 1])
	}
	t.line("written", d.writtenWords())
	return t.out.Flush()
}

// telling writes lines with a word in front, broken at width with the rest indented.
type telling struct{ out *bufio.Writer }

func (t *telling) line(word, text string) {
	const indent = 9
	fmt.Fprintf(t.out, "%-*s", indent, word)
	at := indent
	for i, part := range strings.Fields(text) {
		if i > 0 && at+1+len([]rune(part)) > width {
			fmt.Fprintf(t.out, "\n%*s", indent, "")
			at = indent
		} else if i > 0 {
			fmt.Fprint(t.out, " ")
			at++
		}
		fmt.Fprint(t.out, part)
		at += len([]rune(part))
	}
	fmt.Fprintln(t.out)
}

func (d Document) dataWords() string {
	s := fmt.Sprintf("%s: %s used of %d", d.Input.Name, count(d.Input.Used, "observation"), d.Input.Rows)
	if len(d.Input.SetAside) == 0 {
		return s
	}
	var reasons []string
	for _, r := range slices.Sorted(maps.Keys(d.Input.SetAside)) {
		reasons = append(reasons, fmt.Sprintf("%d %s", d.Input.SetAside[r], strings.ReplaceAll(r, "-", " ")))
	}
	return s + "; set aside: " + strings.Join(reasons, ", ")
}

func (d Document) placeWords() string {
	s := fmt.Sprintf("%s, median spacing %s; %s", count(d.Input.DistinctPlaces, "distinct place"), metres(d.Input.MedianSpacing), d.Input.Coordinates)
	if d.Lattice.Kind == "places" {
		return s + fmt.Sprintf("; predicted at %s of your own", count(d.Lattice.Count, "place"))
	}
	return s + fmt.Sprintf("; mapped on %d cells of %s", d.Lattice.Count, metres(d.Lattice.Cell))
}

func (d Document) modelWords() string {
	s := fmt.Sprintf("%s with %s link", d.Fit.Distribution, d.Fit.Link)
	for _, e := range d.Settings {
		switch e.Key {
		case "people", "area", "effort", "expected", "trials":
			s += fmt.Sprintf(", %s from column %v", e.Key, e.Value)
		}
	}
	if !d.Fit.DispersionKnown {
		s += fmt.Sprintf("; residual standard deviation %s", Short(Number(math.Sqrt(float64(d.Fit.Dispersion)))))
	}
	return s
}

func (d Document) surfaceWords() string {
	f := d.Fit
	df, ok := f.DegreesOfFreedom["surface"]
	if !ok {
		return fmt.Sprintf("none; a regression with %s degrees of freedom accounts for %s of the deviance", Short(f.DegreesOfFreedom["total"]), percent(f.DevianceShare))
	}
	shape := fmt.Sprintf("thin-plate with %d knots, of which the data use %s degrees of freedom", f.Knots, Short(df))
	if f.Plane {
		shape = "thin-plate; the data ask for no more than a tilted plane"
	}
	return fmt.Sprintf("%s (smoothness by %s); the fit accounts for %s of the deviance", shape, f.Criterion, percent(f.DevianceShare))
}

func (d Document) covariateWords() string {
	var parts []string
	for _, c := range d.Coefficients {
		if c.Name == "intercept" {
			continue
		}
		parts = append(parts, fmt.Sprintf("%s %s (%s to %s)", c.Name, Short(c.Estimate), Short(c.Lower), Short(c.Upper)))
	}
	if len(parts) == 0 {
		return ""
	}
	const most = 6
	more := ""
	if len(parts) > most {
		more = fmt.Sprintf(" and %d more", len(parts)-most)
		parts = parts[:most]
	}
	var held []string
	for _, e := range d.Effects {
		if e.Held != "" {
			held = append(held, e.Name+" = "+e.Held)
		}
	}
	s := "on the " + d.Fit.Link + " scale: " + strings.Join(parts, ", ") + more
	if d.Fit.Link == "identity" {
		s = strings.TrimPrefix(s, "on the identity scale: ")
	}
	if held != nil {
		s += "; the map is adjusted to " + strings.Join(held, ", ")
	}
	return s
}

func (d Document) levelWords() string {
	e := d.Estimates
	return fmt.Sprintf("%s to %s, half of the map below %s (%s)", Short(e.Least), Short(e.Most), Short(e.Median), e.Unit)
}

func (d Document) sureWords() string {
	e := d.Estimates
	return fmt.Sprintf("median standard error %s; limits are %s %% for the mean, not for a future observation",
		Short(e.MedianStandardError), Short(100*e.Confidence))
}

// checksToTell returns the checks that found something, or one that says all are clear.
func (d Document) checksToTell() []Check {
	var told []Check
	for _, level := range []Level{Stop, Look} {
		for _, c := range d.Checks {
			if c.Level == level {
				told = append(told, c)
			}
		}
	}
	if told == nil {
		var names []string
		for _, c := range d.Checks {
			names = append(names, c.Name)
		}
		return []Check{{Level: Clear, Sentence: "nothing to remark on " + strings.Join(names, ", ")}}
	}
	return told
}

func (d Document) writtenWords() string {
	names := []string{"summary.json"}
	for _, o := range d.Outputs {
		names = append(names, o.File)
	}
	return d.Folder + ": " + strings.Join(names, ", ")
}

// Short writes a number in three significant digits, without an exponent between a thousandth and a million.
func Short(n Number) string {
	v := float64(n)
	switch a := math.Abs(v); {
	case math.IsNaN(v):
		return "unknown"
	case a == 0:
		return "0"
	case a >= 1e6 || a < 1e-3:
		return strconv.FormatFloat(v, 'g', 3, 64)
	case a >= 100:
		return strconv.FormatFloat(v, 'f', 0, 64)
	default:
		digits := 2 - int(math.Floor(math.Log10(a)))
		s := strconv.FormatFloat(v, 'f', digits, 64)
		return strings.TrimSuffix(strings.TrimRight(s, "0"), ".")
	}
}

func percent(n Number) string { return Short(100*n) + " %" }

func metres(n Number) string {
	if n >= 10000 {
		return Short(n/1000) + " km"
	}
	return Short(n) + " m"
}

func count(n int, noun string) string {
	if n == 1 {
		return "1 " + noun
	}
	return strconv.Itoa(n) + " " + noun + "s"
}
