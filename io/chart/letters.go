package chart

import (
	"math"
	"strings"
	"sync"

	"codeberg.org/go-fonts/liberation/liberationsansbold"
	"codeberg.org/go-fonts/liberation/liberationsansregular"
	"golang.org/x/image/font"
	"golang.org/x/image/font/sfnt"
	"golang.org/x/image/math/fixed"
	"gonum.org/v1/plot/vg"
)

// A style is how a run of text is set; size is the em in pixels.
type style struct {
	size float64
	bold bool
}

// Height of a line and place of its baseline below the top, in ems. The bundled face reaches 0.905 above and 0.212 below
// the baseline, so lines of this height never touch.
const (
	lineHeight = 1.3
	baseline   = 0.98
)

func (s style) line() float64 { return lineHeight * s.size }

var faces = sync.OnceValue(func() [2]*sfnt.Font {
	var f [2]*sfnt.Font
	for i, ttf := range [][]byte{liberationsansregular.TTF, liberationsansbold.TTF} {
		font, err := sfnt.Parse(ttf)
		if err != nil {
			panic("chart: bundled font: " + err.Error()) // the fonts are compiled in: this is not about input
		}
		f[i] = font
	}
	return f
})

// letters measures and outlines text. It keeps what it has measured; not for concurrent use.
type letters struct {
	buf     sfnt.Buffer
	advance map[glyphKey]float64
}

type glyphKey struct {
	r    rune
	bold bool
}

func newLetters() *letters { return &letters{advance: map[glyphKey]float64{}} }

func (l *letters) face(bold bool) *sfnt.Font {
	if bold {
		return faces()[1]
	}
	return faces()[0]
}

// raised maps superscripts to plain glyphs, since the face lacks some of them; they are drawn smaller and higher.
var raised = map[rune]rune{'⁰': '0', '¹': '1', '²': '2', '³': '3', '⁴': '4', '⁵': '5', '⁶': '6', '⁷': '7', '⁸': '8', '⁹': '9', '⁻': '−'}

const (
	raisedSize = 0.62 // of the em
	raisedBy   = 0.34 // ems above the baseline
)

// unit is the em at which glyphs are measured: one pixel a font unit, so nothing is rounded.
const unit = 2048

// ems is the advance of one rune in ems.
func (l *letters) ems(r rune, bold bool) float64 {
	key := glyphKey{r, bold}
	if a, ok := l.advance[key]; ok {
		return a
	}
	plain, small := r, 1.0
	if p, ok := raised[r]; ok {
		plain, small = p, raisedSize
	}
	f := l.face(bold)
	g, err := f.GlyphIndex(&l.buf, plain)
	var a fixed.Int26_6
	if err == nil {
		a, err = f.GlyphAdvance(&l.buf, g, fixed.I(unit), font.HintingNone)
	}
	ems := small * float64(a) / 64 / unit
	if err != nil {
		ems = 0.5
	}
	l.advance[key] = ems
	return ems
}

// width of s in pixels.
func (l *letters) width(s string, st style) float64 {
	w := 0.0
	for _, r := range s {
		w += l.ems(r, st.bold)
	}
	return w * st.size
}

// outline calls draw with the outlines of s, baseline starting at the origin, pixels, y down. Consecutive segments
// follow the sfnt operations; a missing glyph is the face's empty box.
func (l *letters) outline(s string, st style, draw func(op sfnt.SegmentOp, p [3][2]float64)) {
	x := 0.0
	f := l.face(st.bold)
	for _, r := range s {
		plain, scale, lift := r, st.size/unit, 0.0
		if p, ok := raised[r]; ok {
			plain, scale, lift = p, scale*raisedSize, raisedBy*st.size
		}
		g, err := f.GlyphIndex(&l.buf, plain)
		if err == nil {
			segments, err := f.LoadGlyph(&l.buf, g, fixed.I(unit), nil)
			if err == nil {
				for _, seg := range segments {
					var p [3][2]float64
					for i, a := range seg.Args {
						p[i] = [2]float64{x + float64(a.X)/64*scale, float64(a.Y)/64*scale - lift}
					}
					draw(seg.Op, p)
				}
			}
		}
		x += l.ems(r, st.bold) * st.size
	}
}

// path is the outline of s placed by to, which maps pixels relative to the start of the baseline to the canvas.
func (l *letters) path(s string, st style, to func(x, y float64) vg.Point) vg.Path {
	var path vg.Path
	at := func(p [2]float64) vg.Point { return to(p[0], p[1]) }
	open := false
	l.outline(s, st, func(op sfnt.SegmentOp, p [3][2]float64) {
		switch op {
		case sfnt.SegmentOpMoveTo:
			if open {
				path.Close()
			}
			path.Move(at(p[0]))
			open = true
		case sfnt.SegmentOpLineTo:
			path.Line(at(p[0]))
		case sfnt.SegmentOpQuadTo:
			path.QuadTo(at(p[0]), at(p[1]))
		case sfnt.SegmentOpCubeTo:
			path.CubeTo(at(p[0]), at(p[1]), at(p[2]))
		}
	})
	if open {
		path.Close()
	}
	return path
}

// wrap breaks s into lines no wider than limit: at spaces, and within a word only where the word alone is too wide.
// White space of any kind counts as one space; empty text has no lines.
func (l *letters) wrap(s string, st style, limit float64) []string {
	var lines []string
	line, used := "", 0.0
	space := l.ems(' ', st.bold) * st.size
	for _, word := range strings.Fields(s) {
		w := l.width(word, st)
		if line != "" && used+space+w <= limit {
			line, used = line+" "+word, used+space+w
			continue
		}
		if line != "" {
			lines = append(lines, line)
		}
		for w > limit {
			head := l.head(word, st, limit)
			lines = append(lines, word[:head])
			word = word[head:]
			w = l.width(word, st)
		}
		line, used = word, w
	}
	if line != "" {
		lines = append(lines, line)
	}
	return lines
}

// head is the length in bytes of the longest start of word that fits limit, at least one rune.
func (l *letters) head(word string, st style, limit float64) int {
	used := 0.0
	for i, r := range word {
		used += l.ems(r, st.bold) * st.size
		if used > limit && i > 0 {
			return i
		}
	}
	return len(word)
}

// balance breaks s into at most n lines of widths as equal as possible.
func (l *letters) balance(s string, st style, n int) []string {
	low, high := 0.0, l.width(s, st)+1
	for high-low > max(1, high/200) {
		if mid := (low + high) / 2; len(l.wrap(s, st, mid)) <= n {
			high = mid
		} else {
			low = mid
		}
	}
	return l.wrap(s, st, high)
}

// widest is the width of the widest of the lines.
func (l *letters) widest(lines []string, st style) float64 {
	w := 0.0
	for _, s := range lines {
		w = math.Max(w, l.width(s, st))
	}
	return w
}
