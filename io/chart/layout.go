package chart

import (
	"cmp"
	"fmt"
	"image/color"
	"math"
	"slices"

	"github.com/paulmach/orb"
)

// Styles of the page. The smallest is still 11 pixels high when the picture is shown at half size.
var (
	titleStyle    = style{42, true}
	longTitle     = style{34, true} // for titles of more than three lines
	subtitleStyle = style{28, false}
	captionStyle  = style{27, true}
	labelStyle    = style{24, false}
	tickStyle     = style{22, false}
	footStyle     = style{22, false}
	nameStyle     = style{22, true}
)

// Distances in pixels.
const (
	margin     = 40 // page edge
	gap        = 40 // between blocks
	nearby     = 12 // between things that belong together
	tickLength = 10
	tickPad    = 6 // between a tick and its label
	swatchW    = 56
	swatchH    = 42
	keyW       = 56
	keyH       = 36
	stripH     = 40
	barH       = 14
	arrowW     = 40
	arrowH     = 78
	leastPage  = 860 // narrowest page, for the title and the cautions
	leastMap   = 240 // what the texts must leave for the map's longer side
)

// A box is a rectangle in pixels, y down.
type box struct{ x0, y0, x1, y1 float64 }

func (b box) moved(dx, dy float64) box { return box{b.x0 + dx, b.y0 + dy, b.x1 + dx, b.y1 + dy} }
func (b box) overlaps(o box) bool {
	return b.x0 < o.x1 && o.x0 < b.x1 && b.y0 < o.y1 && o.y0 < b.y1
}
func (b box) within(o box) bool {
	return b.x0 >= o.x0 && b.y0 >= o.y0 && b.x1 <= o.x1 && b.y1 <= o.y1
}

// A label is one line of text in its box.
type label struct {
	box
	text   string
	style  style
	colour color.RGBA
}

// A swatch shows a class; class -1 is no value.
type swatch struct {
	box
	class int
}

// What a key shows.
type keyKind int

const (
	keyObservation keyKind = iota
	keyOutline
	keyZone
)

type key struct {
	box
	kind keyKind
}

// A block is a part of the page in its own coordinates, upper left corner at the origin.
type block struct {
	w, h     float64
	labels   []label
	swatches []swatch
	keys     []key
	bars     []box // halves of the scale bar, filled and empty in turn
	arrow    []box // north arrow, at most one
	rules    []box // filled rectangles beside the cautions
}

// put adds o with its corner at (x, y) and grows b to hold it.
func (b *block) put(o block, x, y float64) {
	for _, l := range o.labels {
		l.box = l.moved(x, y)
		b.labels = append(b.labels, l)
	}
	for _, s := range o.swatches {
		s.box = s.moved(x, y)
		b.swatches = append(b.swatches, s)
	}
	for _, k := range o.keys {
		k.box = k.moved(x, y)
		b.keys = append(b.keys, k)
	}
	for _, r := range o.bars {
		b.bars = append(b.bars, r.moved(x, y))
	}
	for _, r := range o.arrow {
		b.arrow = append(b.arrow, r.moved(x, y))
	}
	for _, r := range o.rules {
		b.rules = append(b.rules, r.moved(x, y))
	}
	b.w, b.h = max(b.w, x+o.w), max(b.h, y+o.h)
}

// under adds o below what b holds, a distance apart; an empty block adds nothing.
func (b *block) under(o block, apart float64) {
	if o.h == 0 {
		return
	}
	if b.h == 0 {
		apart = 0
	}
	b.put(o, 0, b.h+apart)
}

// boxes lists everything in b, with a name for messages.
func (b block) boxes() (all []box, name []string) {
	add := func(r box, n string) { all, name = append(all, r), append(name, n) }
	for _, l := range b.labels {
		add(l.box, fmt.Sprintf("label %q", l.text))
	}
	for _, s := range b.swatches {
		add(s.box, fmt.Sprintf("swatch %d", s.class))
	}
	for _, k := range b.keys {
		add(k.box, fmt.Sprintf("key %d", k.kind))
	}
	for _, r := range b.bars {
		add(r, "scale bar")
	}
	for _, r := range b.arrow {
		add(r, "north arrow")
	}
	for _, r := range b.rules {
		add(r, "rule")
	}
	return all, name
}

// A page is a map laid out: everything that paint needs to know.
type page struct {
	block
	m       Map
	classes classes
	letters *letters
	view    view
	frame   box // the map itself; whole pixels
	ticks   []tick
	names   []label // of zones, inside the frame
}

// A sheet is a way to arrange a page: the size that holds it, and where the legend stands.
type sheet struct {
	w, h float64
	side bool // legend beside the map, else below it
}

var sheets = []sheet{{1600, 1240, true}, {1600, 1240, false}, {1240, 1600, true}, {1240, 1600, false}}

// newPage lays m out on the sheet that shows the map largest. A legend beside the map is preferred: its classes stand in
// order of height, and their labels need no abbreviating.
func newPage(m Map) page {
	if m.Shapes.given() {
		m.Observations = Points{}
	}
	t := &setter{m: m, classes: cut(m), letters: newLetters(), extent: extent(m)}
	t.shown = m.Observations.count(t.extent)
	t.blanks = hasBlanks(m, t.classes)
	var best page
	bestScore := 0.0
	for _, s := range sheets {
		p := t.filled(s)
		score := float64(p.view.w) * float64(p.view.h)
		if s.side {
			score *= 1.35
		}
		// A page that outgrew its sheet is read scaled down.
		score /= max(1, p.h/s.h) * max(1, p.h/s.h)
		if score > bestScore {
			best, bestScore = p, score
		}
	}
	best.names = best.placeNames()
	return best
}

// longSide is the intended length of a page's longer side.
const longSide = 1600

// filled composes a page and again on a larger or smaller sheet until its long side is about right: what a sheet's other side leaves
// unused goes to the map.
func (t *setter) filled(s sheet) page {
	p := t.compose(s)
	for range 3 {
		f := longSide / max(p.w, p.h)
		if math.Abs(f-1) < 0.01 {
			break
		}
		s.w, s.h = min(s.w*f, longSide), min(s.h*f, longSide)
		p = t.compose(s)
	}
	return p
}

func hasBlanks(m Map, c classes) bool {
	return slices.ContainsFunc(m.Values(), func(v float64) bool { return c.of(v) < 0 })
}

// A setter builds the blocks of a page.
type setter struct {
	m       Map
	classes classes
	letters *letters
	extent  orb.Bound
	shown   int  // observations within the extent
	blanks  bool // cells of the study area, dots or shapes without a value
}

// compose lays the page out on one sheet.
func (t *setter) compose(s sheet) page {
	p := page{m: t.m, classes: t.classes, letters: t.letters}
	c := t.settle(s)
	p.view, p.ticks = c.view, c.ticks
	head, aside, foot := t.head(c.inner), t.aside(s, c), t.foot(c.note, c.inner)
	p.put(head, margin, margin)
	p.frame = t.frame(s, c, margin+head.h+gap/2)
	beyond := p.frame.x1 + gap // what the last label below the frame must not reach
	below := p.frame.y1 + tickRoom()
	if s.side {
		p.put(aside, beyond, p.frame.y0)
		p.put(t.measures(c.view), beyond, max(p.frame.y1-arrowH, p.frame.y0+aside.h+gap/2))
		below = max(below, p.block.h)
	} else {
		p.put(aside, margin, below+gap/2)
		below = p.block.h
		beyond = c.inner + 2*margin
	}
	p.labelTicks(beyond - nearby)
	p.put(foot, margin, below+gap/2)
	p.w = math.Ceil(2*margin + c.inner)
	p.h = math.Ceil(p.block.h + margin)
	return p
}

// A cast is a page in the making: the map, and what its size depends on.
type cast struct {
	view    view
	ticks   []tick
	note    string  // about the ticks
	inner   float64 // width between the margins
	leftPad float64 // for the labels on the left of the frame
}

// settle finds the size of the map on a sheet. It depends on the widths of the tick labels and on the wrapping of the
// texts, and these depend on it; a few rounds do.
func (t *setter) settle(s sheet) cast {
	c := cast{note: "Ticks", inner: s.w - 2*margin, leftPad: 100}
	for range 6 {
		aside := t.aside(s, c)
		w := s.w - 2*margin - c.leftPad
		h := s.h - 2*margin - t.head(c.inner).h - gap/2 - tickRoom() - gap/2 - t.foot(c.note, c.inner).h
		beside := 0.0
		if s.side {
			beside = gap + aside.w
		} else {
			h -= gap/2 + aside.h
		}
		c.view = fit(t.extent, max(w-beside, leastMap), max(h, leastMap))
		c.ticks, c.note = ticks(c.view, t.m.Lattice.CRS)
		c.leftPad = t.leftRoom(c.ticks)
		c.inner = max(c.leftPad+float64(c.view.w)+beside, leastPage-2*margin)
	}
	return c
}

// aside is what stands beside or below the map.
func (t *setter) aside(s sheet, c cast) block {
	if s.side {
		return t.panel()
	}
	return t.lower(c.view, c.inner)
}

// frame places the map on whole pixels; above the legend it is centred on a page that the texts made wider.
func (t *setter) frame(s sheet, c cast, y float64) box {
	x := math.Ceil(margin + c.leftPad)
	if !s.side {
		x += math.Floor(max(0, c.inner-c.leftPad-float64(c.view.w)) / 2)
	}
	y = math.Ceil(y)
	return box{x, y, x + float64(c.view.w), y + float64(c.view.h)}
}

// tickRoom is the height taken by ticks and labels below the frame.
func tickRoom() float64 { return tickLength + tickPad + tickStyle.line() }

// leftRoom is the width taken by ticks and labels on the left of the frame.
func (t *setter) leftRoom(all []tick) float64 {
	w := 0.0
	for _, k := range all {
		if k.edge == left {
			w = max(w, t.letters.width(k.text, tickStyle))
		}
	}
	return math.Ceil(w + tickPad + tickLength)
}

// labelTicks sets the texts of the ticks, leaving out those that would touch another or leave the page; a tick whose text is
// left out stays. Nothing may reach beyond limit on the right.
func (p *page) labelTicks(limit float64) {
	lastX, lastY := math.Inf(-1), math.Inf(1)
	for _, side := range []edge{bottom, left} {
		for _, k := range sortedTicks(p.ticks, side) {
			w, h := p.letters.width(k.text, tickStyle), tickStyle.line()
			var b box
			if side == bottom {
				x, y := p.frame.x0+k.at-w/2, p.frame.y1+tickLength+tickPad
				b = box{x, y, x + w, y + h}
				if b.x0 < max(nearby, lastX+nearby) || b.x1 > limit {
					continue
				}
				lastX = b.x1
			} else {
				x, y := p.frame.x0-tickLength-tickPad-w, p.frame.y0+k.at-h/2
				b = box{x, y, x + w, y + h}
				// The lowest label must not meet the first one below the frame, which may reach to the left of it.
				if b.y1 > min(lastY, p.frame.y1+tickLength) {
					continue
				}
				lastY = b.y0
			}
			p.labels = append(p.labels, label{b, k.text, tickStyle, softInk})
		}
	}
}

// sortedTicks returns the labelled ticks of one side, from the left or from below.
func sortedTicks(all []tick, side edge) []tick {
	var s []tick
	for _, k := range all {
		if k.edge != side || k.text == "" {
			continue
		}
		i := len(s)
		s = append(s, k)
		for i > 0 && (side == bottom && s[i-1].at > k.at || side == left && s[i-1].at < k.at) {
			s[i] = s[i-1]
			i--
		}
		s[i] = k
	}
	return s
}

// lines sets text wrapped to width; no text is an empty block.
func (t *setter) lines(text string, st style, colour color.RGBA, width float64) block {
	return t.rows(t.letters.wrap(text, st, width), st, colour)
}

// even sets text in as few lines as width allows, of about equal length: a heading with a single word in its last line looks like a slip.
func (t *setter) even(text string, st style, width float64) block {
	if n := len(t.letters.wrap(text, st, width)); n > 1 {
		return t.rows(t.letters.balance(text, st, n), st, ink)
	}
	return t.lines(text, st, ink, width)
}

func (t *setter) rows(lines []string, st style, colour color.RGBA) block {
	var b block
	for i, s := range lines {
		w := t.letters.width(s, st)
		y := float64(i) * st.line()
		b.labels = append(b.labels, label{box{0, y, w, y + st.line()}, s, st, colour})
		b.w, b.h = max(b.w, w), y+st.line()
	}
	return b
}

func (t *setter) head(width float64) block {
	st := titleStyle
	if len(t.letters.wrap(t.m.Title, st, width)) > 3 {
		st = longTitle
	}
	b := t.even(t.m.Title, st, width)
	b.under(t.lines(t.m.Subtitle, subtitleStyle, softInk, width), 4)
	return b
}

// foot holds the cautions, each beside a dark rule, and a last line about the ticks.
func (t *setter) foot(note string, width float64) block {
	const rule, apart = 6, 16
	var b block
	for _, s := range t.m.Foot {
		text := t.lines(s, footStyle, ink, width-rule-apart)
		if text.h == 0 {
			continue
		}
		var one block
		one.put(text, rule+apart, 0)
		one.rules = []box{{0, 4, rule, text.h - 4}}
		b.under(one, 6)
	}
	b.under(t.lines(note, footStyle, softInk, width), nearby)
	return b
}

// Width of the column beside the map.
const (
	narrowPanel = 330
	widePanel   = 460
)

// panel is the column beside the map: caption, classes from high to low, keys. The scale bar and the arrow are set apart,
// at the lower end of the map.
func (t *setter) panel() block {
	ranges := t.classes.ranges()
	widest := t.letters.widest(append(ranges, t.classes.word...), labelStyle)
	width := min(max(narrowPanel, swatchW+nearby+widest), widePanel)
	var b block
	b.under(t.even(t.m.Legend, captionStyle, width), 0)
	b.under(t.column(ranges, width), nearby)
	b.under(t.keyColumn(width), gap/2)
	b.w = width
	return b
}

// column lists the classes, highest first, in touching swatches, and the blank apart from them.
func (t *setter) column(ranges []string, width float64) block {
	var b block
	for k := len(ranges) - 1; k >= 0; k-- {
		b.under(t.entry(k, ranges[k], width), 0)
	}
	if t.blanks {
		b.under(t.entry(-1, "no value", width), nearby)
	}
	return b
}

// entry is one class: swatch, word and range.
func (t *setter) entry(class int, text string, width float64) block {
	lines := t.letters.wrap(text, labelStyle, width-swatchW-nearby)
	words := block{}
	if class >= 0 && t.classes.word != nil {
		words = t.lines(t.classes.word[class], labelStyle, ink, width-swatchW-nearby)
		words.under(t.rows(lines, tickStyle, softInk), 0)
	} else {
		words = t.rows(lines, labelStyle, ink)
	}
	h := math.Ceil(max(swatchH, words.h+6))
	b := block{w: swatchW, h: h, swatches: []swatch{{box{0, 0, swatchW, h}, class}}}
	b.put(words, swatchW+nearby, (h-words.h)/2)
	b.h = h
	return b
}

// keyTexts lists the other signs on the map.
func (t *setter) keyTexts() (kinds []keyKind, texts []string) {
	add := func(k keyKind, s string) { kinds, texts = append(kinds, k), append(texts, s) }
	if t.shown > 0 {
		text := fmt.Sprintf("observation (%s in all)", group(fmt.Sprint(t.shown)))
		if t.shown > crowd {
			text = fmt.Sprintf("observations (%s, thinned where they crowd)", group(fmt.Sprint(t.shown)))
		}
		add(keyObservation, text)
	}
	if len(t.m.Outline) > 0 {
		add(keyOutline, "edge of the study area")
	}
	if len(t.m.Zones) > 0 {
		text := cmp.Or(t.m.ZoneWord, "zone")
		if slices.ContainsFunc(t.m.Zones, func(z Zone) bool { return z.Name != "" }) {
			text += ", named where there is room"
		}
		add(keyZone, text)
	}
	return kinds, texts
}

func (t *setter) keyColumn(width float64) block {
	var b block
	kinds, texts := t.keyTexts()
	for i := range kinds {
		b.under(t.keyEntry(kinds[i], texts[i], width), 0)
	}
	return b
}

func (t *setter) keyEntry(kind keyKind, text string, width float64) block {
	words := t.lines(text, labelStyle, ink, width-keyW-nearby)
	h := max(keyH, words.h)
	b := block{w: keyW, h: h, keys: []key{{box{0, 0, keyW, h}, kind}}}
	b.put(words, keyW+nearby, (h-words.h)/2)
	return b
}

// lower is the row below the map: legend, keys, scale bar and arrow; they go into two or three rows where one is too narrow.
func (t *setter) lower(v view, width float64) block {
	legend := t.strip(width)
	legend = t.captioned(legend, width)
	keys, measures := t.keyColumn(width), t.measures(v)
	var b block
	if legend.w+gap+keys.w+gap+measures.w <= width {
		b.put(legend, 0, 0)
		b.put(keys, legend.w+max(gap, (width-legend.w-keys.w-measures.w)/2), 0)
		b.put(measures, width-measures.w, 0)
		return b
	}
	b.under(legend, 0)
	y := b.h + gap/2
	if keys.w+gap+measures.w <= width {
		b.put(keys, 0, y)
		b.put(measures, width-measures.w, y)
		return b
	}
	b.under(keys, gap/2)
	b.under(measures, gap/2)
	return b
}

// captioned sets the legend's text over its swatches, a little wider than they are where that saves lines.
func (t *setter) captioned(swatches block, width float64) block {
	b := t.even(t.m.Legend, captionStyle, min(width, max(swatches.w, 640)))
	b.under(swatches, nearby)
	return b
}

// strip is a row of touching swatches with the breaks below their joints, or with words below each; where the labels are
// too wide for that the classes are listed one beside the other.
func (t *setter) strip(width float64) block {
	n := len(t.classes.tone)
	if n == 0 || !math.IsNaN(t.classes.constant) || t.classes.word != nil {
		return t.flow(width)
	}
	printed := t.classes.printed()
	each := max(96, t.letters.widest(printed, labelStyle)+2*nearby)
	if each = math.Ceil(each); each*float64(n+1) > width {
		return t.flow(width)
	}
	// The labels below the ends reach half their width beyond the strip.
	over := math.Ceil(t.letters.width(printed[0], labelStyle) / 2)
	b := block{}
	for k := range n {
		b.swatches = append(b.swatches, swatch{box{over + each*float64(k), 0, over + each*float64(k+1), stripH}, k})
	}
	for i, s := range printed {
		if s == "" {
			continue
		}
		w := t.letters.width(s, labelStyle)
		x, y := over+each*float64(i)-w/2, float64(stripH+4)
		b.labels = append(b.labels, label{box{x, y, x + w, y + labelStyle.line()}, s, labelStyle, ink})
	}
	b.w = over + each*float64(n) + math.Ceil(t.letters.width(printed[n], labelStyle)/2)
	b.h = stripH + 4 + labelStyle.line()
	if t.blanks {
		b.put(t.entry(-1, "no value", width), b.w+gap/2, 0)
	}
	return b
}

// flow sets the classes as entries in equal columns, low to high, as many beside one another as fit.
func (t *setter) flow(width float64) block {
	ranges := t.classes.ranges()
	var entries []block
	each, high := 0.0, 0.0
	for k, s := range ranges {
		entries = append(entries, t.entry(k, s, width))
	}
	if t.blanks {
		entries = append(entries, t.entry(-1, "no value", width))
	}
	for _, e := range entries {
		each, high = max(each, e.w+gap/2), max(high, e.h+8)
	}
	across := max(1, int((width+gap/2)/each))
	var b block
	for i, e := range entries {
		b.put(e, float64(i%across)*each, float64(i/across)*high)
	}
	return b
}

// longestBar bounds the scale bar in pixels.
const longestBar = 280

// measures is the scale bar with the north arrow on its right, no wider than the column beside a map.
func (t *setter) measures(v view) block {
	if v.scale == 0 {
		return block{w: narrowPanel, h: arrowH} // no map yet
	}
	metres := roundDownStep(longestBar / v.scale)
	b := t.measured(metres, v)
	for b.w > narrowPanel {
		metres = roundDownStep(0.9 * metres)
		b = t.measured(metres, v)
	}
	return b
}

func (t *setter) measured(metres float64, v view) block {
	zero, end := "0", length(metres)
	zw, ew := t.letters.width(zero, labelStyle), t.letters.width(end, labelStyle)
	x0, x1 := zw/2, zw/2+metres*v.scale
	y := float64(arrowH) - barH
	above := y - 4 - labelStyle.line()
	endX := max(x1-ew/2, zw+nearby)
	b := block{w: max(endX+ew, x1), h: arrowH}
	b.bars = []box{{x0, y, (x0 + x1) / 2, y + barH}, {(x0 + x1) / 2, y, x1, y + barH}}
	b.labels = []label{
		{box{0, above, zw, above + labelStyle.line()}, zero, labelStyle, ink},
		{box{endX, above, endX + ew, above + labelStyle.line()}, end, labelStyle, ink},
	}
	b.arrow = []box{{b.w + gap/2, 0, b.w + gap/2 + arrowW, arrowH}}
	b.w += gap/2 + arrowW
	return b
}
