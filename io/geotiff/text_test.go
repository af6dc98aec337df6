package geotiff_test

import (
	"strings"
	"testing"

	"drumlin/io/geotiff"
)

const textRaster = "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 200\ncellsize 10\nNODATA_value -9999\n1 2 3\n-9999 5.5 -6e1\n"

// TestText reads the same raster in every manner of writing it.
func TestText(t *testing.T) {
	tests := []struct{ name, text string }{
		{"as usual", textRaster},
		{"no line end", strings.TrimSpace(textRaster)},
		{"carriage returns", strings.ReplaceAll(textRaster, "\n", "\r\n")},
		{"mark of the byte order", "\uFEFF" + textRaster},
		{"capitals", strings.ToUpper(textRaster)},
		{"other order", "NODATA_value -9999\ncellsize 10\nyllcorner 200\nxllcorner 100\nnrows 2\nncols 3\n1 2 3\n-9999 5.5 -6e1"},
		{"centres", "ncols 3\nnrows 2\nxllcenter 105\nyllcenter 205\ncellsize 10\nnodata_value -9999\n1 2 3\n-9999 5.5 -60"},
		{"centre and corner", "ncols 3\nnrows 2\nxllcenter 105\nyllcorner 200\ncellsize 10\nnodata_value -9999\n1 2 3\n-9999 5.5 -60"},
		{"two sides", "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 200\ndx 10\ndy 10\nnodata_value -9999\n1 2 3\n-9999 5.5 -60"},
		{"nan", "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 200\ncellsize 10\n1 2 3\nNaN 5.5 -60"},
		{"rows broken", "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 200\ncellsize 10 nodata_value -9999\n\t1\n\n2 3 -9999\n5.5\t-60\n\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			r := openBytes(t, []byte(test.text))
			if r.Width != 3 || r.Height != 2 || r.X0 != 100 || r.Y0 != 220 || r.CellX != 10 || r.CellY != 10 || r.CRS() != "" {
				t.Errorf("%+v", r)
			}
			if r.PixelIsPoint != (test.name == "centres") || len(r.Bands) != 1 || r.Bands[0].Name != "band1" || r.Bands[0].Kind.String() != "text" {
				t.Errorf("point %v, bands %+v", r.PixelIsPoint, r.Bands)
			}
			wantCells(t, window(t, r, 0, 0, 0, 3, 2), []float64{1, 2, 3, nan, 5.5, -60})
			wantCells(t, window(t, r, 0, 1, 1, 2, 1), []float64{5.5, -60})
		})
	}
	r := openBytes(t, []byte("ncols 1\nnrows 3\nxllcorner 0\nyllcorner 0\ndx 2\ndy 0.5\nnan\n8\n9"))
	if r.CellX != 2 || r.CellY != 0.5 || r.Y0 != 1.5 {
		t.Errorf("%+v", r)
	}
	wantCells(t, window(t, r, 0, 0, 0, 1, 3), []float64{nan, 8, 9})
}

func TestTextRefusals(t *testing.T) {
	head := "ncols 3\nnrows 2\nxllcorner 100\nyllcorner 200\ncellsize 10\n"
	tests := []struct{ name, text, want string }{
		{"one cell short", head + "1 2 3\n4 5\n", "made.tif: line 8: ends after 5 of 6 cells, before row 2, column 3"},
		{"one cell more", head + "1 2 3\n4 5 6\n7", `made.tif: line 8: goes on with "7" after the last of 3 columns and 2 rows`},
		{"a word", head + "1 2 3\n4 x 6\n", `made.tif: line 7: row 2, column 2: "x" is not a number`},
		{"decimal comma", head + "1 2 3\n4 5,5 6\n", `"5,5" is not a number`},
		{"no columns", strings.Replace(head, "ncols 3\n", "", 1), "does not give ncols"},
		{"no columns at all", strings.Replace(head, "ncols 3", "ncols 0", 1), "ncols is 0; it must be a whole number from 1"},
		{"half a column", strings.Replace(head, "ncols 3", "ncols 2.5", 1), "ncols is 2.5"},
		{"too many", strings.Replace(head, "ncols 3", "ncols 999999999", 1), "1999999998 cells is too large"},
		{"no corner", strings.Replace(head, "xllcorner 100\n", "", 1), "neither xllcorner nor xllcenter"},
		{"two corners", head + "yllcenter 205\n1 2 3 4 5 6", "both yllcorner and yllcenter"},
		{"no sides", strings.Replace(head, "cellsize 10\n", "dx 10\n", 1), "neither cellsize nor both dx and dy"},
		{"sides twice", head + "dx 10\n1 2 3 4 5 6", "cellsize and also dx or dy"},
		{"word twice", head + "NCOLS 3\n", "line 6: ncols is given twice"},
		{"no number", strings.Replace(head, "cellsize 10", "cellsize ten", 1), `line 5: cellsize is "ten", which is not a number`},
		{"negative side", strings.Replace(head, "cellsize 10", "cellsize -10", 1) + "1 2 3 4 5 6", "not finite and positive"},
		{"infinite corner", strings.Replace(head, "xllcorner 100", "xllcorner inf", 1) + "1 2 3 4 5 6", "not finite and positive"},
		{"endless", head + strings.Repeat("1", 100), "too long for a number"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) {
			if e := refusal(t, []byte(test.text)); !strings.Contains(e.Error(), test.want) || e.Hint() == "" {
				t.Errorf("%v (%s), want %s", e, e.Hint(), test.want)
			}
		})
	}
	_, err := geotiff.OpenText(strings.NewReader("1 2 3"), "cells.asc")
	if err == nil || !strings.Contains(err.Error(), "cells.asc: line 1: the header does not give ncols") {
		t.Error(err)
	}
}
