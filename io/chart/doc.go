// Package chart draws a map that can be handed over: the field, or places, in classes with round breaks, a legend, a scale bar,
// a north arrow, ticks on the frame, the study area, the observations, and whatever the reader has to be warned of.
//
// A Map says what to show; WritePNG decides how. The page is first laid out as data (boxes in pixels, see layout.go)
// and only then painted, so that "nothing is cut, nothing overlaps" can be tested without looking at a picture. The long
// side is about 1600 pixels, and the smallest letters are 22 pixels high, which is still readable at half size.
//
// Pixel coordinates have their origin in the upper left corner of the picture and y pointing down; plane coordinates
// are metres, x east and y north. One factor turns metres into pixels in both directions: a map is never stretched.
//
// The same Map gives the same bytes.
package chart
