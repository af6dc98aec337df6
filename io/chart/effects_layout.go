package chart

import (
	"fmt"
	"image/color"
	"math"
	"slices"
	"strings"
)

// Sizes of a panel in pixels.
const (
	headApart  = 18   // between a panel's heading and its plot: half a tick label reaches into it
	bandApart  = 30   // between rows of panels
	leastPlot  = 170  // height of a plot that still shows a shape
	plotShape  = 0.62 // height of a plot over width of a panel, where the page leaves the choice
	steepShape = 0.85 // the same where all rows are taller than that
	labelShare = 0.42 // of a panel's width for the names of levels
	rowApart   = 1
	spareRow   = 45  // most that is added to a row's height where there are few
	rowInset   = 8   // above the first and below the last row
	rugHeight  = 20  // strip below a curve for the ticks of the observations
	crowdRow   = 12  // from row to row of a crowd that has room
	closeLine  = 1.2 // ems for the last line of a level's name: what its letters take
	overhang   = gap / 2
)

// Lines of text that a panel's parts may take.
const (
	headLines  = 3
	labelLines = 2
)

// Numbers of levels that change the drawing.
const (
	mostNamed   = 40 // more are drawn without names
	mostWrapped = 12 // more have their names in one line
	fewNamed    = 12 // a group of so few keeps its names whatever the page's length
)

// Least distances in pixels between ticks of a panel, and the most there should be on a large one.
const (
	panelTicksX = 80
	panelTicksY = 52
	manyTicks   = 8
)

// More signs that a key can show.
const (
	keyAlong keyKind = keyZone + 1 + iota
	keyLevel
	keyBase
	keyRug
)

// A form is how the rows or points of a panel are drawn.
type form int

const (
	asCurve form = iota
	asRows       // levels with their names
	asCrowd      // levels too many to name
)

// An axis runs over lo to hi on so many pixels.
type axis struct{ lo, hi, pixels float64 }

// at is the distance in pixels from the end of lo. Values far outside are brought to where sums of pixels still make sense.
func (a axis) at(v float64) float64 {
	return min(max((v-a.lo)/(a.hi-a.lo), -1e4), 1e4) * a.pixels
}

// A plot is the framed part of a panel.
type plot struct {
	box       // frame; whole pixels
	panel     Panel
	form      form
	covariate axis      // horizontal; of a curve only
	effect    axis      // vertical for a curve, horizontal for levels
	rug       float64   // height of the strip below a curve
	row       []float64 // middle of each level's row, pixels below the upper edge
	pitch     float64   // from row to row of a crowd
	ticks     []tick
}

// An effectsPage is a page laid out: everything that the painter needs to know.
type effectsPage struct {
	block
	letters *letters
	plots   []plot
}

// A sketch is a panel before it has its size.
type sketch struct {
	panel       Panel // levels in the order of their rows, base included
	form        form
	name, scale block
	label       [][]string // lines of the names of levels
	labelW      float64
	tally       block // below the plot, of a crowd
	effect      axis  // without pixels
}

// An effectsSetter builds the blocks of a page of effects; head and foot are those of a map.
type effectsSetter struct {
	setter
	e          Effects
	columns    int
	w          float64 // of a panel
	inner      float64 // between the margins
	sketches   []sketch
	common     string   // the scale that all panels have in common
	inFull     []string // headings that were shortened
	shortNames bool     // names of levels were shortened
}

// columnsFor is the number of columns for n panels: 2 where 3 would leave the page half empty.
func columnsFor(n int) int {
	switch n {
	case 1:
		return 1
	case 2, 4:
		return 2
	}
	return 3
}

// newEffectsPage lays e out. Where the named levels would make the page too long, groups lose the names first, the largest before the
// others; categories, which are read by name, only when the page would be twice as long as intended.
func newEffectsPage(e Effects) effectsPage {
	t := newEffectsSetter(e)
	p := t.compose()
	for p.h > longSide && t.crowdLargest(Group, fewNamed) {
		p = t.compose()
	}
	for p.h > 2*longSide && t.crowdLargest(Levels, fewNamed) {
		p = t.compose()
	}
	return p
}

func newEffectsSetter(e Effects) *effectsSetter {
	shown := e.shown()
	t := &effectsSetter{e: e, columns: columnsFor(len(shown)), inner: longSide - 2*margin}
	t.setter = setter{m: Map{Title: e.Title, Subtitle: e.Subtitle, Foot: e.Foot}, letters: newLetters()}
	t.w = math.Floor((t.inner - float64(t.columns-1)*gap) / float64(t.columns))
	t.common = commonScale(shown)
	for _, p := range shown {
		t.sketches = append(t.sketches, t.sketch(p))
	}
	if e.SharedScale {
		t.share()
	}
	return t
}

// commonScale is the scale of all panels when there are several and it is the same, else empty.
func commonScale(shown []Panel) string {
	for _, p := range shown {
		if len(shown) < 2 || p.Scale != shown[0].Scale {
			return ""
		}
	}
	return shown[0].Scale
}

func (t *effectsSetter) sketch(p Panel) sketch {
	s := sketch{panel: p}
	s.name = t.heading(p.Name, captionStyle, ink)
	if t.common == "" {
		s.scale = t.heading(p.Scale, tickStyle, softInk)
	}
	s.effect.lo, s.effect.hi = effectRange(p)
	if p.along() {
		return s
	}
	s.form, s.panel = asRows, ordered(withBase(p))
	if len(s.panel.Label) > mostNamed {
		t.crowd(&s)
		return s
	}
	lines := labelLines
	if len(s.panel.Label) > mostWrapped {
		lines = 1
	}
	for _, name := range s.panel.Label {
		s.label = append(s.label, t.levelName(name, lines))
		s.labelW = max(s.labelW, t.letters.widest(s.label[len(s.label)-1], tickStyle))
	}
	return s
}

// heading sets text over a panel; what does not fit is kept for the foot.
func (t *effectsSetter) heading(text string, st style, colour color.RGBA) block {
	lines, short := t.letters.shorten(text, st, t.w, headLines)
	if short && !slices.Contains(t.inFull, text) {
		t.inFull = append(t.inFull, text)
	}
	return t.rows(lines, st, colour)
}

func (t *effectsSetter) levelName(name string, lines int) []string {
	if strings.TrimSpace(name) == "" {
		name = "(no name)"
	}
	set, short := t.letters.shorten(name, tickStyle, math.Floor(labelShare*t.w), lines)
	t.shortNames = t.shortNames || short
	return set
}

// longestShort bounds the letters kept of a shortened text, so that a very long one is not measured over and over.
const longestShort = 400

// shorten wraps s into at most n lines no wider than limit. Of what does not fit the middle is left out, an ellipsis in its
// place: names that begin alike often differ at the end.
func (l *letters) shorten(s string, st style, limit float64, n int) (lines []string, short bool) {
	runes := []rune(s)
	if len(runes) <= longestShort {
		if lines = l.wrap(s, st, limit); len(lines) <= n {
			return lines, false
		}
	}
	kept := func(k int) []string {
		tail := k / 3
		return l.wrap(string(runes[:k-tail])+"…"+string(runes[len(runes)-tail:]), st, limit)
	}
	low, high := 0, min(len(runes)-1, longestShort)
	for low < high {
		if k := (low + high + 1) / 2; len(kept(k)) <= n {
			low = k
		} else {
			high = k - 1
		}
	}
	head, end := string(runes[:low-low/3]), string(runes[len(runes)-low/3:])
	if lines = l.wrap(wholeWords(head, end), st, limit); len(lines) <= n {
		return lines, true
	}
	return kept(low), true
}

// wholeWords joins the start and the end of a text by an ellipsis, at the nearest spaces where little is lost by it.
func wholeWords(head, end string) string {
	const little = 12
	if i := strings.LastIndexByte(head, ' '); i > 0 && len(head)-i <= little {
		head = head[:i] + " "
	}
	if i := strings.IndexByte(end, ' '); i >= 0 && i <= little && i < len(end)-1 {
		end = end[i:]
	}
	return head + "…" + end
}

// withBase gives the base level a row: its estimate is 0, and it has no interval.
func withBase(p Panel) Panel {
	if p.Base == "" {
		return p
	}
	i := slices.Index(p.Label, p.Base)
	if i < 0 {
		i = 0
		p.Label = append([]string{p.Base}, p.Label...)
		p.Estimate = append([]float64{0}, p.Estimate...)
		p.Lower, p.Upper = append([]float64{0}, p.Lower...), append([]float64{0}, p.Upper...)
	} else {
		p.Estimate, p.Lower, p.Upper = slices.Clone(p.Estimate), slices.Clone(p.Lower), slices.Clone(p.Upper)
	}
	p.Estimate[i], p.Lower[i], p.Upper[i] = 0, math.NaN(), math.NaN()
	return p
}

// ordered sorts a group and a crowd by estimate, the highest first and blanks last; equal ones keep their order.
func ordered(p Panel) Panel {
	if p.Kind == Levels && len(p.Label) <= mostNamed {
		return p
	}
	return resorted(p)
}

func resorted(p Panel) Panel {
	key := func(i int) float64 {
		if !finite(p.Estimate[i]) {
			return math.Inf(1)
		}
		return -p.Estimate[i]
	}
	order := make([]int, len(p.Label))
	for i := range order {
		order[i] = i
	}
	slices.SortStableFunc(order, func(a, b int) int {
		switch ka, kb := key(a), key(b); {
		case ka < kb:
			return -1
		case ka > kb:
			return 1
		}
		return 0
	})
	q := p
	q.Label, q.Estimate, q.Lower, q.Upper = nil, nil, nil, nil
	for _, i := range order {
		q.Label = append(q.Label, p.Label[i])
		q.Estimate = append(q.Estimate, p.Estimate[i])
		q.Lower, q.Upper = append(q.Lower, p.Lower[i]), append(q.Upper, p.Upper[i])
	}
	return q
}

// crowd turns a sketch into one without names, with a tally instead.
func (t *effectsSetter) crowd(s *sketch) {
	s.form, s.label, s.labelW = asCrowd, nil, 0
	s.panel = resorted(s.panel)
	text := tally(s.panel)
	s.tally = t.rows(t.letters.balance(text, tickStyle, len(t.letters.wrap(text, tickStyle, t.w))), tickStyle, softInk)
}

func tally(p Panel) string {
	above, below, blank := 0, 0, 0
	for i, v := range p.Estimate {
		switch {
		case !finite(v):
			blank++
		case p.Lower[i] > 0:
			above++
		case p.Upper[i] < 0:
			below++
		}
	}
	text := fmt.Sprintf("%s levels, highest first, named in effects.csv. Intervals above 0: %s, below 0: %s.",
		group(fmt.Sprint(len(p.Label))), group(fmt.Sprint(above)), group(fmt.Sprint(below)))
	if blank > 0 {
		text += fmt.Sprintf(" Without an estimate: %s.", group(fmt.Sprint(blank)))
	}
	return text
}

// crowdLargest takes the names from the kind's panel with the most levels, more than least; false when there is none.
func (t *effectsSetter) crowdLargest(kind PanelKind, least int) bool {
	largest := -1
	for i, s := range t.sketches {
		if n := len(s.panel.Label); s.form == asRows && s.panel.Kind == kind && n > least {
			least, largest = n, i
		}
	}
	if largest < 0 {
		return false
	}
	t.crowd(&t.sketches[largest])
	return true
}

// effectRange is what the effect's axis of a panel shows: 0, every estimate, and the limits as far as they do not dwarf the
// rest. One level that the data say nothing about would otherwise press all others into a line.
func effectRange(p Panel) (lo, hi float64) {
	var width []float64
	for i, v := range p.Estimate {
		if !finite(v) {
			continue
		}
		lo, hi = min(lo, v), max(hi, v)
		if w := p.Upper[i] - p.Lower[i]; finite(w) {
			width = append(width, w)
		}
	}
	reach := hi - lo
	if len(width) > 0 {
		slices.Sort(width)
		reach = max(reach, 3*width[len(width)/2])
	}
	low, high := lo, hi
	for i, v := range p.Estimate {
		if finite(v) && p.Lower[i] < low {
			low = max(p.Lower[i], lo-reach)
		}
		if finite(v) && p.Upper[i] > high {
			high = min(p.Upper[i], hi+reach)
		}
	}
	return padded(low, high, 0.04)
}

// padded widens a range by a share of it on both sides, and one that twelve digits hardly resolve to something that can be drawn.
func padded(lo, hi, share float64) (float64, float64) {
	size := max(math.Abs(lo), math.Abs(hi))
	if d := hi - lo; d > 1e-9*size && d > 1e-290 {
		return lo - share*d, hi + share*d
	}
	half := 0.11 * size // no round number, so that no tick falls on a corner
	if half < 1e-290 {
		half = 1.1
	}
	return lo - half, hi + half
}

// share gives all panels the range that holds each panel's own.
func (t *effectsSetter) share() {
	lo, hi := math.Inf(1), math.Inf(-1)
	for _, s := range t.sketches {
		lo, hi = min(lo, s.effect.lo), max(hi, s.effect.hi)
	}
	for i := range t.sketches {
		t.sketches[i].effect.lo, t.sketches[i].effect.hi = lo, hi
	}
}

// rowHeights are the least heights of the rows of levels.
func (s sketch) rowHeights() []float64 {
	var all []float64
	for _, lines := range s.label {
		all = append(all, nameHeight(lines)+rowApart)
	}
	return all
}

func nameHeight(lines []string) float64 {
	return float64(len(lines)-1)*tickStyle.line() + closeLine*tickStyle.size
}

// need is the least height of a sketch's plot.
func (s sketch) need() float64 {
	h := 2.0 * rowInset
	for _, r := range s.rowHeights() {
		h += r
	}
	return max(leastPlot, math.Ceil(h))
}

// A band is a row of panels: the height of the headings, and that of the tallest plot with its tally.
type band struct{ head, body float64 }

func (b band) height() float64 { return math.Ceil(b.head + headApart + b.body + tickRoom()) }

// A cast of panels: their rows, and what the plots have in common. All plots have the same height but for those of levels
// that need more; curves therefore always compare.
type panelCast struct {
	bands []band
	plot  float64
	left  float64 // edge of a curve's plot, behind the widest tick label
	rug   float64
}

// compose lays the page out.
func (t *effectsSetter) compose() effectsPage {
	p := effectsPage{letters: t.letters}
	head := t.head(t.inner)
	if t.common != "" {
		head.under(t.lines(t.common+" (all panels)", footStyle, softInk, t.inner), 4)
	}
	p.put(head, margin, margin)
	c := t.cast(head.h + gap/2 + t.lowerPart(effectsPage{}).h)
	y := math.Ceil(p.block.h + gap/2)
	for i, s := range t.sketches {
		x, row := margin+float64(i%t.columns)*(t.w+gap), c.bands[i/t.columns]
		b, f := t.panel(s, row, c)
		p.put(b, x, y)
		f.box = f.moved(x, y)
		p.plots = append(p.plots, f)
		if i%t.columns == t.columns-1 || i == len(t.sketches)-1 {
			y += row.height() + bandApart
		}
	}
	p.put(t.lowerPart(p), margin, y)
	p.w, p.h = longSide, math.Ceil(p.block.h+margin)
	return p
}

// cast finds the size of the panels: a pleasing shape, or as high as the page's length allows, and never less than they need;
// texts is the height of what stands above and below the panels.
func (t *effectsSetter) cast(texts float64) panelCast {
	var c panelCast
	for i, s := range t.sketches {
		if i%t.columns == 0 {
			c.bands = append(c.bands, band{})
		}
		row := &c.bands[len(c.bands)-1]
		row.head = math.Ceil(max(row.head, s.name.h+s.scale.h))
		row.body = max(row.body, s.need()+s.tally.h)
		if len(s.panel.At) > 0 {
			c.rug = rugHeight
		}
	}
	least := math.Inf(1)
	for _, row := range c.bands {
		least = min(least, row.body)
	}
	c.plot = math.Floor(max(plotShape*t.w, min(steepShape*t.w, least)))
	for c.plot > leastPlot && t.pageHeight(c, texts) > longSide {
		c.plot--
	}
	for i, s := range t.sketches {
		row := &c.bands[i/t.columns]
		row.body = math.Ceil(max(row.body, c.plot+s.tally.h))
	}
	for _, s := range t.sketches {
		if s.form == asCurve {
			c.left = max(c.left, t.leftRoom(effectTicks(axis{s.effect.lo, s.effect.hi, c.plot - c.rug})))
		}
	}
	return c
}

// pageHeight is the height of the page with the plots of a cast.
func (t *effectsSetter) pageHeight(c panelCast, texts float64) float64 {
	tallest := make([]float64, len(c.bands))
	for i, s := range t.sketches {
		tallest[i/t.columns] = max(tallest[i/t.columns], c.bands[i/t.columns].body, c.plot+s.tally.h)
	}
	all := 2*margin + texts
	for r, row := range c.bands {
		row.body = tallest[r]
		all += row.height() + bandApart
	}
	return all
}

// plotHeight is the height of a plot in its row: the common one but for levels, which take what they need, and a crowd, which spreads.
func (s sketch) plotHeight(row band, c panelCast) float64 {
	switch s.form {
	case asCurve:
		return c.plot
	case asCrowd:
		room := math.Floor(row.body - s.tally.h)
		return max(c.plot, min(room, crowdRow*float64(len(s.panel.Label))))
	}
	return max(c.plot, s.need())
}

// panel lays out one panel with its corner at the origin.
func (t *effectsSetter) panel(s sketch, row band, c panelCast) (block, plot) {
	b := block{w: t.w, h: row.height()}
	// The heading stands close to its plot, whatever the length of the others.
	y := row.head - s.name.h - s.scale.h
	b.put(s.name, 0, y)
	b.put(s.scale, 0, y+s.name.h)
	top := row.head + headApart
	f := plot{panel: s.panel, form: s.form, box: box{c.left, top, t.w, top + s.plotHeight(row, c)}}
	if s.form == asCurve {
		t.scaleCurve(&f, s, c)
	} else {
		f.x0 = math.Ceil(s.labelW + nearby)
		if s.form == asCrowd {
			f.x0 = 2
		}
		f.effect = axis{s.effect.lo, s.effect.hi, f.x1 - f.x0}
		f.ticks = t.acrossTicks(f.effect)
		f.placeRows(s)
		b.labels = append(b.labels, t.rowLabels(s, f)...)
	}
	b.put(s.tally, 0, f.y1+tickRoom())
	framed := page{frame: f.box, ticks: f.ticks, letters: t.letters}
	framed.labelTicks(t.w + overhang)
	b.labels = append(b.labels, framed.labels...)
	return b, f
}

func (t *effectsSetter) scaleCurve(f *plot, s sketch, c panelCast) {
	f.rug = c.rug
	lo, hi := span(append(slices.Clone(s.panel.X), s.panel.At...))
	lo, hi = padded(lo, hi, 0.02)
	f.covariate = axis{lo, hi, f.x1 - f.x0}
	f.effect = axis{s.effect.lo, s.effect.hi, f.y1 - f.y0 - f.rug}
	f.ticks = append(effectTicks(f.effect), t.acrossTicks(f.covariate)...)
}

// placeRows spreads the rows over the plot; few rows stand together halfway down.
func (f *plot) placeRows(s sketch) {
	n := len(f.panel.Label)
	room := f.y1 - f.y0 - 2*rowInset
	heights := s.rowHeights()
	if s.form == asCrowd {
		heights = make([]float64, n)
	}
	used := 0.0
	for _, h := range heights {
		used += h
	}
	extra := max(min(spareRow, (room-used)/float64(n)), 0)
	f.pitch = extra
	y := (f.y1 - f.y0 - used - extra*float64(n)) / 2
	for _, h := range heights {
		f.row = append(f.row, y+(h+extra)/2)
		y += h + extra
	}
}

// rowLabels sets the names of levels on the left of their rows.
func (t *effectsSetter) rowLabels(s sketch, f plot) []label {
	var all []label
	for i, lines := range s.label {
		bottom := f.y0 + f.row[i] + nameHeight(lines)/2
		y := bottom - nameHeight(lines)
		for _, text := range lines {
			w := t.letters.width(text, tickStyle)
			x := f.x0 - nearby - w
			all = append(all, label{box{x, y, x + w, min(y+tickStyle.line(), bottom)}, text, tickStyle, ink})
			y += tickStyle.line()
		}
	}
	return all
}

// effectTicks are the ticks on the left of a curve.
func effectTicks(a axis) []tick {
	step := roundStep(a.hi-a.lo, a.pixels, max(panelTicksY, a.pixels/manyTicks))
	var all []tick
	at := multiples(a.lo, a.hi, step)
	text := tickTexts(at, step)
	for i, v := range at {
		all = append(all, tick{left, a.pixels - a.at(v), text[i]})
	}
	return all
}

// acrossTicks are the ticks below a panel, so far apart that their texts have room.
func (t *effectsSetter) acrossTicks(a axis) []tick {
	var all []tick
	for apart := max(panelTicksX, a.pixels/manyTicks); apart < a.pixels; apart *= 1.3 {
		step := roundStep(a.hi-a.lo, a.pixels, apart)
		at := multiples(a.lo, a.hi, step)
		text := tickTexts(at, step)
		all = all[:0]
		for i, v := range at {
			all = append(all, tick{bottom, a.at(v), text[i]})
		}
		if t.letters.widest(text, tickStyle)+2*nearby <= step/(a.hi-a.lo)*a.pixels {
			break
		}
	}
	return all
}

// tickTexts writes multiples of step in one manner: with the same number of decimals, or all as powers of ten.
func tickTexts(at []float64, step float64) []string {
	s := make([]string, len(at))
	powers := slices.ContainsFunc(at, needsPower)
	decimals := 0
	if !powers {
		decimals = decimalsOf(step)
	}
	for i, v := range at {
		switch {
		case v == 0:
			s[i] = "0"
		case powers:
			s[i] = power(v)
		default:
			s[i] = number(v, decimals)
		}
	}
	return s
}

// lowerPart is everything below the panels: keys, cautions, notes.
func (t *effectsSetter) lowerPart(p effectsPage) block {
	var b block
	b.under(t.keyRow(), 0)
	b.under(t.foot("", t.inner), gap/2)
	for i, s := range t.notes(p) {
		apart := 4.0
		if i == 0 {
			apart = nearby
		}
		b.under(t.lines(s, footStyle, softInk, t.inner), apart)
	}
	return b
}

// keyRow explains the signs that occur, one beside the other as far as they fit.
func (t *effectsSetter) keyRow() block {
	var along, level, base, rug, thinned bool
	for _, s := range t.sketches {
		along = along || s.form == asCurve
		level = level || s.form != asCurve
		base = base || s.panel.Base != ""
		rug = rug || len(s.panel.At) > 0
		thinned = thinned || len(s.panel.At) > rugCrowd
	}
	observations := "observations"
	if thinned {
		observations = "observations, thinned"
	}
	var b block
	x, y, h := 0.0, 0.0, 0.0
	for _, k := range []struct {
		kind keyKind
		text string
		use  bool
	}{
		{keyAlong, "estimate with interval", along},
		{keyLevel, "level with interval", level},
		{keyBase, "base level, at 0", base},
		{keyRug, observations, rug},
	} {
		if !k.use {
			continue
		}
		entry := t.keyEntry(k.kind, k.text, t.inner)
		if x > 0 && x+entry.w > t.inner {
			x, y, h = 0, y+h, 0
		}
		b.put(entry, x, y)
		x, h = x+entry.w+gap, max(h, entry.h)
	}
	return b
}

// notes are the sentences about the page itself. Whether intervals leave their panels is known for a page with plots;
// before that it is assumed, so that there is room for the sentence.
func (t *effectsSetter) notes(p effectsPage) []string {
	var first []string
	if len(t.sketches) > 1 && t.e.SharedScale {
		first = append(first, "All panels have the same scale for the effect.")
	} else if len(t.sketches) > 1 {
		first = append(first, "Each panel has its own scale for the effect.")
	}
	if p.plots == nil || slices.ContainsFunc(p.plots, plot.leaves) {
		first = append(first, "Intervals too wide for their panel end at its edge.")
	}
	if n := len(t.e.Panels) - mostPanels; n == 1 {
		first = append(first, "1 more effect is in effects.csv.")
	} else if n > 1 {
		first = append(first, fmt.Sprintf("%s more effects are in effects.csv.", group(fmt.Sprint(n))))
	}
	if t.shortNames {
		first = append(first, "Names of levels shortened with … are given in full in effects.csv.")
	}
	all := []string{strings.Join(first, " ")}
	for _, s := range t.inFull {
		all = append(all, "In full: "+s)
	}
	return all
}

// leaves is true when an interval goes on beyond the plot.
func (f plot) leaves() bool {
	for i, v := range f.panel.Estimate {
		if finite(v) && !math.IsNaN(f.panel.Lower[i]+f.panel.Upper[i]) && (f.panel.Lower[i] < f.effect.lo || f.panel.Upper[i] > f.effect.hi) {
			return true
		}
	}
	return false
}
