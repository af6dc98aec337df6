package inspect

import (
	"encoding/json"
	"fmt"
	"io"
	"strconv"
	"strings"
)

// JSON writes the report as an object of JSON, indented.
func (r RasterReport) JSON(w io.Writer) error {
	text, err := json.MarshalIndent(r, "", "  ")
	if err != nil {
		return err
	}
	_, err = w.Write(append(text, '\n'))
	return err
}

// Words writes the report for a person to read.
func (r RasterReport) Words(w io.Writer) error {
	var b strings.Builder
	fmt.Fprintf(&b, "%s: %s x %s, %s, %s\n\n", r.File, countOf(r.Width, "column", "columns"), countOf(r.Height, "row", "rows"),
		countOf(len(r.Bands), "band", "bands"), r.Format)
	r.writeGround(&b)
	r.writeBands(&b)
	r.writeFindings(&b)
	r.writeProposal(&b)
	_, err := io.WriteString(w, harmless(b.String()))
	return err
}

// writeGround says where the raster lies and how it is stored.
func (r RasterReport) writeGround(b *strings.Builder) {
	unit := r.Unit
	if unit == "unknown" {
		unit = "units of that system"
	}
	of := "values of whole cells"
	if r.ValuesOf == "points" {
		of = "values of their centres"
	}
	stored := fmt.Sprintf("in blocks of %d x %d cells, no overviews", r.BlockWidth, r.BlockHeight)
	switch {
	case r.Format != geoTIFF:
		stored = "as text"
	case r.Overviews > 0:
		stored = fmt.Sprintf("in blocks of %d x %d cells, %s", r.BlockWidth, r.BlockHeight, countOf(r.Overviews, "overview", "overviews"))
	}
	for _, line := range [][2]string{
		{"coordinate system", r.System.words()},
		{"cells", fmt.Sprintf("%s x %s %s, %s", position(r.CellWidth), position(r.CellHeight), unit, of)},
		{"edges", fmt.Sprintf("west %s, south %s, east %s, north %s", position(r.West), position(r.South), position(r.East), position(r.North))},
		{"stored", stored},
	} {
		fmt.Fprintf(b, "  %-19s%s\n", line[0], line[1])
	}
	b.WriteByte('\n')
}

// words puts a coordinate system into a line.
func (s RasterSystem) words() string {
	var list []string
	switch {
	case s.Code != "" && s.Name != "":
		list = append(list, s.Code+", "+s.Name)
	case s.Code != "":
		list = append(list, s.Code+", which is not known here")
	case s.Citation == "" || s.Citation == localMetres:
		list = append(list, "none: metres of its own")
	default:
		list = append(list, "no code")
	}
	if s.Citation != "" && s.Citation != s.Name && s.Citation != localMetres {
		list = append(list, "the file says "+strconv.Quote(s.Citation))
	}
	if s.Said != "" {
		list = append(list, "taken as "+s.Said+", as said")
	}
	return strings.Join(list, "; ")
}

// position is a coordinate or a size to ten digits: centimetres on the ground.
func position(v float64) string { return strconv.FormatFloat(v, 'g', 10, 64) }

func (r RasterReport) writeBands(b *strings.Builder) {
	rows := [][]string{{"band", "kind", "missing", "least", "mean", "most"}}
	for i, band := range r.Bands {
		if i == mostColumns && len(r.Bands) > mostColumns+1 {
			break
		}
		row := []string{cut(band.Name, 20), band.Kind, fmt.Sprint(band.Missing)}
		if band.Least != nil {
			row = append(row, brief(band.Least), brief(band.Mean), brief(band.Most))
		}
		rows = append(rows, row)
	}
	writeTable(b, rows)
	if left := len(r.Bands) - len(rows) + 1; left > 0 {
		fmt.Fprintf(b, "  and %d more bands, which --json lists\n", left)
	}
}

func (r RasterReport) writeFindings(b *strings.Builder) {
	var list []string
	for _, f := range r.Findings {
		list = append(list, f.Sentence)
	}
	writeList(b, "To look at", list, mostLooks)
}

func (r RasterReport) writeProposal(b *strings.Builder) {
	if r.Proposal == nil {
		b.WriteString("\nNo map can be proposed: there is no band whose values differ\n")
		return
	}
	writeList(b, "What the raster does not tell", r.Proposal.Open, mostLooks)
	b.WriteString("\nTo try\n\n  " + r.Proposal.Command + "\n")
}
