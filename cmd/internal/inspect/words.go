package inspect

import (
	"encoding/json"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
	"unicode"
	"unicode/utf8"
)

// What is shown of a long report in words; the JSON has all of it.
const (
	mostColumns    = 16
	mostLooks      = 12
	mostClears     = 8
	mostCandidates = 4
	lineWidth      = 100
)

// JSON writes the report as an object of JSON, indented.
func (r Report) JSON(w io.Writer) error {
	text, err := json.MarshalIndent(r, "", "  ")
	if err != nil {
		return err
	}
	_, err = w.Write(append(text, '\n'))
	return err
}

// Words writes the report for a person to read, in one screen unless there is much to look at.
func (r Report) Words(w io.Writer) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s\n\n", r.File, r.size())
	r.writeColumns(&b)
	r.writeFindings(&b, "To look at", Look, mostLooks)
	r.writeFindings(&b, "In order", Clear, mostClears)
	r.writeCandidates(&b)
	r.writeProposal(&b)
	_, err := io.WriteString(w, harmless(b.String()))
	return err
}

// size says how much there is, and how it is written.
func (r Report) size() string {
	how := ""
	if r.Encoding != "UTF-8" {
		how = ", " + r.Encoding
	}
	if r.Features {
		if r.Geometry.CRS != "" {
			how += ", reference system " + r.Geometry.CRS
		}
		return fmt.Sprintf("%s, %s, GeoJSON%s", countOf(r.Rows, "feature", "features"), countOf(len(r.Columns), "property", "properties"), how)
	}
	if r.Separator != "comma" {
		how = ", separated by " + r.Separator + how
	}
	return fmt.Sprintf("%s, %s%s", countOf(r.Rows, "row", "rows"), countOf(len(r.Columns), "column", "columns"), how)
}

// harmless takes out control characters, by which a name in a table could steer a terminal.
func harmless(text string) string {
	return strings.Map(func(c rune) rune {
		if unicode.IsControl(c) && c != '\n' {
			return '?'
		}
		return c
	}, text)
}

func (r Report) writeColumns(b *strings.Builder) {
	rows := [][]string{{"column", "kind", "missing", "distinct", "least", "median", "mean", "most"}}
	for i, c := range r.Columns {
		if i == mostColumns && len(r.Columns) > mostColumns+1 {
			break
		}
		name := c.Name
		if name == "" {
			name = fmt.Sprintf("(column %d)", i+1)
		}
		distinct := fmt.Sprint(c.Distinct)
		if c.More {
			distinct = ">" + distinct
		}
		kind := c.Kind
		if c.Least != nil && c.NotNumbers > 0 && c.NotNumbers*2 <= c.Values {
			kind = "mostly numbers"
		}
		row := []string{cut(name, 20), kind, fmt.Sprint(c.Missing), distinct}
		if c.Least != nil && c.NotNumbers*2 <= c.Values {
			for _, v := range []*float64{c.Least, c.Median, c.Mean, c.Most} {
				row = append(row, brief(v))
			}
		} else if len(c.Examples) > 0 {
			row = append(row, "such as "+cut(strings.Join(c.Examples, ", "), 36))
		}
		rows = append(rows, row)
	}
	writeTable(b, rows)
	if left := len(r.Columns) - len(rows) + 1; left > 0 {
		fmt.Fprintf(b, "  and %d more columns, which --json lists\n", left)
	}
}

// writeTable sets rows in columns: the first two to the left, numbers to the right, and a last cell that is no number as it
// is.
func writeTable(b *strings.Builder, rows [][]string) {
	const numbers, examples = 2, 5 // the first column of numbers; the cells of a row that ends in examples
	widths := make([]int, len(rows[0]))
	for _, row := range rows {
		for i, cell := range row {
			if len(row) != examples || i != examples-1 {
				widths[i] = max(widths[i], utf8.RuneCountInString(cell))
			}
		}
	}
	for _, row := range rows {
		line := ""
		for i, cell := range row {
			blanks := strings.Repeat(" ", max(0, widths[i]-utf8.RuneCountInString(cell)))
			if len(row) == examples && i == examples-1 {
				blanks = ""
			}
			if i < numbers {
				line += "  " + cell + blanks
			} else {
				line += "  " + blanks + cell
			}
		}
		b.WriteString(strings.TrimRight(line, " ") + "\n")
	}
}

// brief is a number of five digits, and of all those before the point.
func brief(v *float64) string {
	if v == nil {
		return ""
	}
	if size := math.Abs(*v); size < 1e12 && (size >= 1e4 || *v == math.Trunc(*v)) {
		return strconv.FormatFloat(*v, 'f', 0, 64)
	}
	return strconv.FormatFloat(*v, 'g', 5, 64)
}

// cut shortens a text to so many letters.
func cut(text string, most int) string {
	letters := []rune(strings.ReplaceAll(text, "\n", " "))
	if len(letters) <= most {
		return string(letters)
	}
	return string(letters[:most-3]) + "..."
}

func (r Report) writeFindings(b *strings.Builder, heading string, level Level, most int) {
	var list []string
	for _, f := range r.Findings {
		if f.Level == level {
			list = append(list, f.Sentence)
		}
	}
	writeList(b, heading, list, most)
}

// writeList writes sentences under a heading, and says how many more there are.
func writeList(b *strings.Builder, heading string, list []string, most int) {
	if len(list) == 0 {
		return
	}
	b.WriteString("\n" + heading + "\n")
	for i, sentence := range list {
		if i == most && len(list) > most+1 {
			fmt.Fprintf(b, "  and %d more, which --json lists\n", len(list)-i)
			return
		}
		item(b, sentence)
	}
}

// item writes a sentence on lines of lineWidth, the first marked.
func item(b *strings.Builder, sentence string) {
	column := 0
	for _, word := range strings.Fields(sentence) {
		length := utf8.RuneCountInString(word)
		switch {
		case column == 0:
			b.WriteString("  - ")
			column = 4
		case column+1+length > lineWidth:
			b.WriteString("\n    ")
			column = 4
		default:
			b.WriteByte(' ')
			column++
		}
		b.WriteString(word)
		column += length
	}
	b.WriteByte('\n')
}

func (r Report) writeCandidates(b *strings.Builder) {
	var list []string
	for _, c := range r.Candidates {
		what := c.Response + ", " + map[string]string{"positives": "a number positive", "count": "a count", "measurement": "a measurement"}[c.Kind]
		if c.Column != "" {
			what += " out of " + c.Column
		}
		list = append(list, what+": "+strings.Join(c.Reasons, "; "))
	}
	writeList(b, "What could be mapped, the likeliest first", list, mostCandidates)
}

func (r Report) writeProposal(b *strings.Builder) {
	undecided := r.Undecided
	if r.Proposal != nil {
		b.WriteString("\nTo try\n\n  " + r.Proposal.Command + "\n")
		writeList(b, "What map would choose for it", r.Proposal.Choices, mostLooks)
		undecided = append(undecided[:len(undecided):len(undecided)], r.Proposal.Open...)
	} else {
		b.WriteString("\nNo map can be proposed: ")
		if r.Coordinates == nil {
			b.WriteString("there are no coordinates\n")
		} else {
			b.WriteString("there is no column to map\n")
		}
	}
	writeList(b, "What the table does not tell", undecided, mostLooks)
}
