package chart

import (
	"errors"
	"fmt"
	"image/png"
	"io"
	"math"
	"slices"
	"strings"
	"unicode/utf8"
)

// Effects is a page of small panels, one an effect of a fitted model: what each covariate adds to the linear predictor. The
// panels are in one to three columns, in the order given, and of equal size but for levels that need a row each. The zero
// value has no panel and cannot be drawn.
// WritePNG reads an Effects and never changes it.
type Effects struct {
	// Title heads the page; it is wrapped, never cut.
	Title string
	// Subtitle stands under the title in smaller letters; it is the place to say what the intervals are, such as
	// "95 % intervals, other covariates held". May be empty.
	Subtitle string
	// Panels are the effects. Beyond the first 12 they are only counted, in a line that points to effects.csv.
	Panels []Panel
	// Foot holds the cautions below the panels, a sentence each; long ones are wrapped.
	Foot []string
	// SharedScale gives the effect the same range in every panel, so that a strong effect looks stronger than a weak one: set it
	// unless the panels' scales differ in kind or a weak effect's shape is what matters. Without it every panel has a range of
	// its own. The page says which it is.
	SharedScale bool
}

// PanelKind says how the effect in a Panel is drawn.
type PanelKind int

const (
	// Curve is a smooth effect along a covariate: a line with a band, the effect on the vertical axis.
	Curve PanelKind = iota
	// Line is a linear effect along a covariate, drawn as a Curve is.
	Line
	// Levels is a category: a row a level in the order given, a dot with a bar, the effect on the horizontal axis.
	Levels
	// Group is a random intercept: rows as for Levels, the highest estimate first.
	Group
)

// Panel is one effect. A Curve and a Line use X and At, Levels and a Group use Label; the fields of the other kind must be empty.
type Panel struct {
	// Name heads the panel: the covariate, with its level for a curve of one level ("depth, soil = loam"). It is wrapped;
	// one of more than three lines is shortened with an ellipsis and given in full at the foot of the page.
	Name string
	// Scale says what the effect is measured in, such as "log scale: +0.69 doubles the level". What all panels
	// have in common is written once, under the title. Too long ones are treated as names are. May be empty.
	Scale string
	// Kind chooses the drawing.
	Kind PanelKind

	// X are the covariate's values, not decreasing.
	X []float64
	// At are the covariate's values in the observations, in any order: small ticks along the lower edge, thinned
	// where they crowd. May be empty.
	At []float64
	// Label names the levels.
	Label []string
	// Base is the level of Levels that the others are compared with: its row carries a mark of its own, at 0. It is added as
	// the first row when it is not in Label. Empty for none.
	Base string

	// Estimate is the effect at each X or of each Label. NaN, infinities and magnitudes of 1e300 and over are blank: a gap in a
	// curve, an empty row.
	Estimate []float64
	// Lower and Upper are the limits, as many as there are estimates. A NaN in either leaves the interval out; one that is
	// infinite, or so wide that it would dwarf everything else, is drawn to the edge of the panel, and the page says so.
	Lower, Upper []float64
}

// mostPanels is how many panels a page holds: three columns of four are the smallest that still show a shape.
const mostPanels = 12

// along is true for a panel with a covariate on its horizontal axis.
func (p Panel) along() bool { return p.Kind == Curve || p.Kind == Line }

// Validate reports the first thing in e that cannot be drawn: no panels, slices of unequal length, X out of order, limits
// on the wrong side of their estimate, more text than a page holds.
func (e Effects) Validate() error {
	if strings.TrimSpace(e.Title) == "" {
		return errors.New("chart: a page of effects needs a title")
	}
	if len(e.Panels) == 0 {
		return errors.New("chart: no effects to draw")
	}
	for i, p := range e.Panels {
		for _, check := range []func() error{p.checkLengths, p.checkAlong, p.checkBase, p.checkLimits} {
			if err := check(); err != nil {
				return fmt.Errorf("chart: panel %d %q: %w", i+1, p.Name, err)
			}
		}
	}
	if n := e.textLength(); n > maxLetters {
		return fmt.Errorf("chart: %d letters of text, a page holds %d", n, maxLetters)
	}
	return nil
}

func (p Panel) checkLengths() error {
	what, n := "x", len(p.X)
	if !p.along() {
		what, n = "labels", len(p.Label)
	}
	switch {
	case p.Kind < Curve || p.Kind > Group:
		return fmt.Errorf("unknown kind of panel %d", p.Kind)
	case p.along() && len(p.Label) > 0:
		return errors.New("a curve has no labels")
	case !p.along() && (len(p.X) > 0 || len(p.At) > 0):
		return errors.New("levels have no x")
	case n == 0 || n != len(p.Estimate) || n != len(p.Lower) || n != len(p.Upper):
		return fmt.Errorf("%d %s, %d estimates, %d lower and %d upper limits", n, what, len(p.Estimate), len(p.Lower), len(p.Upper))
	}
	return nil
}

func (p Panel) checkAlong() error {
	for i, x := range p.X {
		if !finite(x) || i > 0 && x < p.X[i-1] {
			return fmt.Errorf("x must not decrease: number %d is %g", i+1, x)
		}
	}
	for i, x := range p.At {
		if !finite(x) {
			return fmt.Errorf("observation %d is at %g", i+1, x)
		}
	}
	return nil
}

func (p Panel) checkBase() error {
	if p.Base == "" {
		return nil
	}
	if p.Kind != Levels {
		return fmt.Errorf("base level %q in a panel that is not one of levels", p.Base)
	}
	i := slices.Index(p.Label, p.Base)
	if i >= 0 && slices.Contains(p.Label[i+1:], p.Base) {
		return fmt.Errorf("the base level %q stands there twice", p.Base)
	}
	if i >= 0 && p.Estimate[i] != 0 && !math.IsNaN(p.Estimate[i]) {
		return fmt.Errorf("the base level %q has the estimate %g, must be 0", p.Base, p.Estimate[i])
	}
	return nil
}

func (p Panel) checkLimits() error {
	for i, v := range p.Estimate {
		// Comparisons with NaN are false: a limit left out passes.
		if finite(v) && (p.Lower[i] > v || p.Upper[i] < v) {
			return fmt.Errorf("estimate %d is %g, outside its limits %g and %g", i+1, v, p.Lower[i], p.Upper[i])
		}
	}
	return nil
}

// textLength counts the letters that may have to be written whole.
func (e Effects) textLength() int {
	n := utf8.RuneCountInString(e.Title) + utf8.RuneCountInString(e.Subtitle)
	for _, s := range e.Foot {
		n += utf8.RuneCountInString(s)
	}
	for _, p := range e.shown() {
		n += utf8.RuneCountInString(p.Name) + utf8.RuneCountInString(p.Scale)
	}
	return n
}

// shown are the panels that get a place on the page.
func (e Effects) shown() []Panel { return e.Panels[:min(len(e.Panels), mostPanels)] }

// WritePNG draws e and writes it to w as a PNG with 8 bits a channel. Nothing is written when e is not valid. The same
// Effects gives the same bytes.
func (e Effects) WritePNG(w io.Writer) error {
	if err := e.Validate(); err != nil {
		return err
	}
	img := paintEffects(newEffectsPage(e))
	encoder := png.Encoder{CompressionLevel: png.BestSpeed}
	if err := encoder.Encode(w, img); err != nil {
		return fmt.Errorf("chart: %w", err)
	}
	return nil
}
