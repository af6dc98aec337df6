package chart

import (
	"errors"
	"fmt"
	"image/png"
	"io"
	"math"
	"strings"
	"unicode/utf8"

	"github.com/paulmach/orb"

	"drumlin/grids"
)

// Kind says what the numbers of a Map are; it chooses the colours and the way classes are cut.
type Kind int

const (
	// Level is the estimate itself: a sequential ramp, pale for low.
	Level Kind = iota
	// Uncertainty is a standard error or a coefficient of variation: a sequential ramp of another hue, so that
	// the two maps of one surface are not taken for one another.
	Uncertainty
	// Chance is the probability of exceeding a threshold, 0 to 1, in five classes cut at 0.05, 0.2, 0.8 and 0.95.
	Chance
	// Ratio is a relative risk: classes symmetrical about 1 on a log scale, with a two-sided ramp.
	Ratio
)

// Map is what one picture shows. The zero value is not a map: it needs a Title or a Legend, and exactly one of Value, Dots
// and Shapes.
// WritePNG reads a Map and never changes it.
type Map struct {
	// Title heads the picture; it is wrapped, never cut.
	Title string
	// Subtitle stands under the title in smaller letters, such as "adjusted to depth = 12.5". May be empty.
	Subtitle string
	// Legend says what is shown and in which unit, such as "cases per 1000 people, standard error".
	Legend string
	// Kind chooses colours and classes.
	Kind Kind

	// Lattice places the cells of Value. Where Value is nil only its CRS is read. A nil CRS is taken as local metres.
	// The CRS also decides the ticks: a plane laid around data in longitude and latitude (crs.AzimuthalAround) gets degrees,
	// any other one plane coordinates.
	Lattice grids.Lattice
	// Value is the number in each cell of Lattice. NaN, infinities and magnitudes of 1e300 and over are left blank,
	// as are cells outside the mask. Nil when the map is made of Dots or of Shapes.
	Value []float64
	// Dots are single places with a number each, drawn instead of cells.
	Dots Dots
	// Shapes are areas, lines and points with a number each, drawn instead of cells.
	Shapes Shapes

	// Outline is the edge of the study area in plane metres. May be nil.
	Outline orb.MultiPolygon
	// Zones are drawn as thin outlines with their names where there is room.
	Zones []Zone
	// ZoneWord is what the key calls one of Zones; "zone" if empty.
	ZoneWord string
	// Observations are drawn as small open marks. Those outside the frame are not shown, and none are over Shapes, which
	// are themselves what was observed.
	Observations Points

	// Stamp is written large across the map, such as "NOT FOR USE: the fit did not converge". Empty for none.
	Stamp string
	// Foot holds the cautions below the map, a sentence each; long ones are wrapped.
	Foot []string
	// Breaks are the edges of the classes, strictly increasing, at least 2 and at most 12 of them; values beyond the first and
	// the last fall into the outermost classes. Nil lets Breaks (the function) choose. Chance has fixed classes and ignores them.
	Breaks []float64
	// Shared says that Breaks are those of several maps (see SharedBreaks): the legend does not depend on this map's values,
	// and the top class is open. So n edges of a Level or an Uncertainty, at most 11, make n classes. A first edge of minus
	// infinity leaves the lowest class open as well; breaks that come from elsewhere should go through Reaching, for a map
	// with values below a finite first edge shows that class as open, alone of its group. Without Breaks it says nothing.
	Shared bool
}

// Points are places in plane metres; X and Y have the same length.
type Points struct{ X, Y []float64 }

// Dots are places in plane metres with a number each; the three slices have the same length.
type Dots struct{ X, Y, Value []float64 }

// Values returns the numbers that m shows: those of its cells within the mask, of its dots, or of its shapes. It may be
// the slice that m holds.
func (m Map) Values() []float64 {
	switch {
	case m.Shapes.given():
		return m.Shapes.Value
	case m.Value == nil:
		return m.Dots.Value
	case m.Lattice.Mask != nil:
		return inside(m)
	}
	return m.Value
}

// Zone is a named part of the study area, in plane metres.
type Zone struct {
	Name string // may be empty
	Area orb.MultiPolygon
}

// Limits on what a page can hold: beyond them a picture would be all text, or a legend nobody can match to the map.
const (
	maxLetters = 20000
	maxEdges   = 12
)

// Validate reports the first thing in m that cannot be drawn: slices of unequal length, a lattice without extent,
// coordinates that are not finite, breaks out of order, more text than a page holds.
func (m Map) Validate() error {
	for _, check := range []func() error{m.checkOne, m.checkCells, m.checkPoints, m.Shapes.check, m.checkBreaks, m.checkText} {
		if err := check(); err != nil {
			return fmt.Errorf("chart: %w", err)
		}
	}
	return nil
}

// checkOne returns an error unless the values come in one of the three ways.
func (m Map) checkOne() error {
	cells, dots, shapes := m.Value != nil, m.Dots.X != nil, m.Shapes.given()
	switch {
	case m.Kind < Level || m.Kind > Ratio:
		return fmt.Errorf("unknown kind of map %d", m.Kind)
	case !cells && !dots && !shapes:
		return errors.New("neither cells nor dots nor shapes to draw")
	case cells && dots:
		return errors.New("both cells and dots given")
	case cells && shapes:
		return errors.New("both cells and shapes given")
	case dots && shapes:
		return errors.New("both dots and shapes given")
	}
	return nil
}

func (m Map) checkCells() error {
	l := m.Lattice
	switch {
	case m.Value == nil:
		return nil
	case l.NX <= 0 || l.NY <= 0 || l.NX > len(m.Value) || l.NX*l.NY != len(m.Value):
		return fmt.Errorf("%d values for %d x %d cells", len(m.Value), l.NX, l.NY)
	case l.Mask != nil && len(l.Mask) != len(m.Value):
		return fmt.Errorf("%d mask bits for %d cells", len(l.Mask), len(m.Value))
	case !(l.Cell > 0) || !finite(l.X0) || !finite(l.Y0) || !finite(l.Cell*float64(max(l.NX, l.NY))):
		return fmt.Errorf("lattice at (%g, %g) with cell side %g has no extent", l.X0, l.Y0, l.Cell)
	}
	return nil
}

func (m Map) checkPoints() error {
	d, o := m.Dots, m.Observations
	if len(d.X) != len(d.Y) || len(d.X) != len(d.Value) {
		return fmt.Errorf("dots have %d x, %d y and %d values", len(d.X), len(d.Y), len(d.Value))
	}
	if len(o.X) != len(o.Y) {
		return fmt.Errorf("observations have %d x and %d y", len(o.X), len(o.Y))
	}
	if m.Dots.X != nil && len(d.X) == 0 {
		return errors.New("no dots to draw")
	}
	if err := checkPlaces("dot", d.X, d.Y); err != nil {
		return err
	}
	if err := checkPlaces("observation", o.X, o.Y); err != nil {
		return err
	}
	if err := checkArea("outline", m.Outline); err != nil {
		return err
	}
	for i, z := range m.Zones {
		if err := checkArea(fmt.Sprintf("zone %d %q", i+1, z.Name), z.Area); err != nil {
			return err
		}
	}
	return nil
}

func checkPlaces(what string, x, y []float64) error {
	for i := range x {
		if !finite(x[i]) || !finite(y[i]) {
			return fmt.Errorf("%s %d is at (%g, %g)", what, i+1, x[i], y[i])
		}
	}
	return nil
}

func checkArea(what string, area orb.MultiPolygon) error {
	for _, polygon := range area {
		for _, ring := range polygon {
			for i, p := range ring {
				if !finite(p[0]) || !finite(p[1]) {
					return fmt.Errorf("%s: vertex %d is at (%g, %g)", what, i+1, p[0], p[1])
				}
			}
		}
	}
	return nil
}

func (m Map) checkBreaks() error {
	if m.Breaks == nil || m.Kind == Chance {
		return nil
	}
	if m.Shared {
		return CheckShared(m.Breaks)
	}
	if len(m.Breaks) < 2 || len(m.Breaks) > maxEdges {
		return fmt.Errorf("%d breaks given, from 2 to %d can be drawn", len(m.Breaks), maxEdges)
	}
	return increase(m.Breaks, false)
}

// increase returns an error for edges that do not; the first of open ones may be minus infinity.
func increase(edge []float64, open bool) error {
	for i, b := range edge {
		if !finite(b) && !(open && i == 0 && math.IsInf(b, -1)) || i > 0 && b <= edge[i-1] {
			return fmt.Errorf("breaks must increase: number %d is %g", i+1, b)
		}
	}
	return nil
}

func (m Map) checkText() error {
	if strings.TrimSpace(m.Title+m.Legend) == "" {
		return errors.New("a map needs a title or a legend")
	}
	n := utf8.RuneCountInString(m.Title) + utf8.RuneCountInString(m.Subtitle) + utf8.RuneCountInString(m.Legend) + utf8.RuneCountInString(m.Stamp)
	for _, s := range m.Foot {
		n += utf8.RuneCountInString(s)
	}
	if n > maxLetters {
		return fmt.Errorf("%d letters of text, a page holds %d", n, maxLetters)
	}
	return nil
}

// finite is true for numbers that can be placed on a page; the bound keeps sums and differences of two from overflowing.
func finite(v float64) bool { return math.Abs(v) < 1e300 }

// WritePNG draws m and writes it to w as a PNG with 8 bits a channel. Nothing is written when m is not valid.
func (m Map) WritePNG(w io.Writer) error {
	if err := m.Validate(); err != nil {
		return err
	}
	img := paint(newPage(m))
	// Speed over size: the slower settings save a tenth of the file and cost three times the time.
	encoder := png.Encoder{CompressionLevel: png.BestSpeed}
	if err := encoder.Encode(w, img); err != nil {
		return fmt.Errorf("chart: %w", err)
	}
	return nil
}
