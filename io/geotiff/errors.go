package geotiff

import "fmt"

// Error is a refusal of a raster: which one, what is wrong with it and what to do. Fields that do not apply are empty.
type Error struct {
	File   string // name of the source
	Line   int    // line of a text raster, from 1
	What   string // what is wrong, in words
	Advice string // what to do about it
	Cause  error  // the error of the reader or of the codec underneath
}

// Error gives the place and then what is wrong, in one line.
func (e *Error) Error() string {
	text := e.What
	if e.Cause != nil {
		text += ": " + e.Cause.Error()
	}
	if e.Line > 0 {
		text = fmt.Sprintf("line %d: %s", e.Line, text)
	}
	if e.File != "" {
		text = e.File + ": " + text
	}
	return text
}

// Hint says what to do; it is empty where there is nothing to add.
func (e *Error) Hint() string { return e.Advice }

// Unwrap returns the error of the reader or of the codec underneath, if that was the cause.
func (e *Error) Unwrap() error { return e.Cause }

const (
	adviceDamaged = "the file looks damaged or cut short: fetch or make it again"
	adviceRewrite = "write the raster again as a plain GeoTIFF: tiles or short strips, Deflate compression"
	adviceNorthUp = "resample the raster onto a grid whose rows run from west to east and whose first row is the northernmost"
)
