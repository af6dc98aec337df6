package plan

import (
	"fmt"
	"io"
	"strconv"
	"strings"
	"unicode"
)

// Starter is what a plan begins with, for a person to go on from.
type Starter struct {
	Settings Settings // the words that are said under [defaults]; Observations is not among them
	File     string   // the table that regions come from
	SplitBy  string   // the column that names the region of a row; empty where the table is one region
	Notes    []string // what the person has to decide, a sentence each without a stop
}

// starterExamples are values of words that have no default and whose Arg is no value itself.
var starterExamples = map[string]string{
	"separator": Semicolon, "below-limit": HalfLimit, "area-unit": Hectares, "distribution": Poisson, "link": Log, "shape": "1.5", "surface-smoothness": OwnSmoothness,
	"also": "surface=none", "layer": "height=height.tif", "isolines-at": "10,20,50", "key": "district", "absent": AbsentMissing, "length-unit": Metres, "width": "50", "detection": "0.8", "exposure-cv": "0.15", "cell-size": "100", "threshold": "100", "reference": Overall,
}

// WriteStarter writes a plan in TOML that has every word as a key, with its help and its default. The words that are said
// stand as they are, the others as comments with a value that only shows the form. ReadBatch reads it.
func WriteStarter(w io.Writer, s Starter) error {
	var b strings.Builder
	b.WriteString("# A plan of maps of many regions, for: drumlin batch PLAN --out DIR\n" +
		"# drumlin batch PLAN --check says what would be done, and does nothing.\n#\n")
	comment(&b, "A line that begins with # is a comment. Take the # away to say what stands behind it, and put in a value of "+
		"your own. Paths are taken from the folder of this file.")
	if len(s.Notes) > 0 {
		b.WriteString("#\n# To decide first:\n")
		for _, note := range s.Notes {
			comment(&b, "- "+note)
		}
	}
	s.writeRegions(&b)
	s.writeDefaults(&b)
	b.WriteString("\n[pictures]\n" +
		"# Whether the maps of all regions have the same colours for the same values: shared or own. Default: shared.\n" +
		"# scale = \"shared\"\n" +
		"# Where colours change, from 2 to 11 rising numbers in the unit of the map, or the path of a file that has them.\n" +
		"# breaks = [0, 5, 10, 20]\n" +
		"\n# What is said of one region by its name counts before [defaults]. With observations it is a region of its own.\n" +
		"# [region.NAME]\n# observations = \"FILE\"\n# title = \"TEXT\"\n")
	_, err := io.WriteString(w, b.String())
	return err
}

func (s Starter) writeRegions(b *strings.Builder) {
	split, alone := "", "# "
	column := "COLUMN"
	if s.SplitBy != "" {
		column = s.SplitBy
	} else {
		split, alone = "# ", ""
	}
	b.WriteString("\n[regions]\n# Files that are a region each. * stands for any letters, and a list of several is in brackets.\n")
	fmt.Fprintf(b, "%sfiles = %s\n", alone, tomlText(escapePattern(s.File)))
	b.WriteString("# Or, in place of files, one table with the rows of all regions, and the column that names the region of a row.\n")
	fmt.Fprintf(b, "%sfile = %s\n%ssplit_by = %s\n", split, tomlText(s.File), split, tomlText(column))
	b.WriteString("# How far beyond its own rows a region is fitted with those of its neighbours.\n# margin = \"10 km\"\n")
}

// escapePattern takes the meaning of a pattern from a path.
func escapePattern(path string) string {
	return strings.NewReplacer(`\`, `\\`, `*`, `\*`, `?`, `\?`, `[`, `\[`).Replace(path)
}

func (s Starter) writeDefaults(b *strings.Builder) {
	b.WriteString("\n[defaults]\n")
	group := ""
	for _, w := range words {
		if w.RunOnly || w.Name == "observations" {
			continue
		}
		if w.Group != group {
			group = w.Group
			fmt.Fprintf(b, "\n# == %s ==\n", group)
		}
		b.WriteByte('\n')
		help := InPlan(w.Help) + "."
		if d := w.Default(); d != "" {
			help += " Default: " + d + "."
		}
		comment(b, strings.ToUpper(help[:1])+help[1:])
		if s.Settings.Said(w.Name) {
			fmt.Fprintf(b, "%s = %s\n", w.Key(), w.inTOML(w.value(&s.Settings)))
		} else {
			fmt.Fprintf(b, "# %s = %s\n", w.Key(), w.inTOML(w.example()))
		}
	}
}

// example is a value of a word that shows the form: its default, or one of starterExamples, or its Arg.
func (w Word) example() any {
	d := Defaults()
	if w.filled(&d) && !w.Flag() {
		return w.value(&d)
	}
	value := w.Arg
	if e, ok := starterExamples[w.Name]; ok {
		value = e
	}
	var s Settings
	if err := w.Set(&s, value); err != nil {
		return value // a test demands that there is none such
	}
	return w.value(&s)
}

// inTOML is a value of a word as a plan takes it.
func (w Word) inTOML(v any) string {
	switch v := v.(type) {
	case []string:
		list := make([]string, len(v))
		for i, one := range v {
			list[i] = tomlText(one)
		}
		return "[" + strings.Join(list, ", ") + "]"
	case bool, int, uint64:
		return fmt.Sprint(v)
	case float64:
		return strconv.FormatFloat(v, 'f', -1, 64)
	}
	return tomlText(fmt.Sprint(v))
}

// tomlText is text as a string of TOML.
func tomlText(s string) string {
	var b strings.Builder
	b.WriteByte('"')
	for _, c := range s {
		switch {
		case c == '"' || c == '\\':
			b.WriteByte('\\')
			b.WriteRune(c)
		case c < ' ' || c == 0x7f:
			fmt.Fprintf(&b, `\u%04X`, c)
		default:
			b.WriteRune(c)
		}
	}
	b.WriteByte('"')
	return b.String()
}

// comment writes a text as lines of comment, which cannot hold control characters.
func comment(b *strings.Builder, text string) {
	const width = 110
	text = strings.Map(func(c rune) rune {
		if unicode.IsControl(c) && !unicode.IsSpace(c) {
			return '?'
		}
		return c
	}, text)
	line := "#"
	for _, word := range strings.Fields(text) {
		if len(line)+1+len(word) > width {
			b.WriteString(line + "\n")
			line = "#"
		}
		line += " " + word
	}
	b.WriteString(line + "\n")
}
