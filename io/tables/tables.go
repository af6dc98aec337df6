// Package tables writes results as CSV: comma, dot, one header row, line feed, UTF-8 (RFC 4180 but for the line end).
package tables

import (
	"bufio"
	"fmt"
	"io"
	"math"
	"strconv"
	"strings"
)

// Digits is the number of significant digits that numbers are written with.
const Digits = 12

// Column is a named column of numbers, whole numbers, or text; exactly one of the slices is set, or none for a column
// that stays empty.
type Column struct {
	Name   string
	Number []float64 // NaN and infinities leave the cell empty
	Whole  []int64
	Text   []string
}

// Write writes n rows under a header. It returns an error if a column has another number of rows.
func Write(w io.Writer, n int, columns []Column) error {
	for _, c := range columns {
		if m := max(len(c.Number), len(c.Whole), len(c.Text)); m != 0 && m != n {
			return fmt.Errorf("column %q has %d rows, not %d", c.Name, m, n)
		}
	}
	out := bufio.NewWriterSize(w, 1<<16)
	var row []byte
	for j, c := range columns {
		row = separate(row, j)
		row = appendText(row, c.Name)
	}
	row = append(row, '\n')
	for i := 0; i < n; i++ {
		if _, err := out.Write(row); err != nil {
			return err
		}
		row = row[:0]
		for j, c := range columns {
			row = separate(row, j)
			switch {
			case c.Number != nil:
				row = AppendNumber(row, c.Number[i])
			case c.Whole != nil:
				row = strconv.AppendInt(row, c.Whole[i], 10)
			case c.Text != nil:
				row = appendText(row, c.Text[i])
			}
		}
		row = append(row, '\n')
	}
	if _, err := out.Write(row); err != nil {
		return err
	}
	return out.Flush()
}

// AppendNumber appends v with Digits significant digits, or nothing where v is not finite.
func AppendNumber(dst []byte, v float64) []byte {
	if math.IsNaN(v) || math.IsInf(v, 0) {
		return dst
	}
	if v == 0 {
		return append(dst, '0') // never -0
	}
	return strconv.AppendFloat(dst, v, 'g', Digits, 64)
}

func separate(row []byte, j int) []byte {
	if j > 0 {
		return append(row, ',')
	}
	return row
}

func appendText(row []byte, s string) []byte {
	if !strings.ContainsAny(s, ",\"\r\n") {
		return append(row, s...)
	}
	row = append(row, '"')
	row = append(row, strings.ReplaceAll(s, `"`, `""`)...)
	return append(row, '"')
}
