// Package geotiff reads rasters with a place on the earth, and writes them: GeoTIFF (OGC 19-008r4, in TIFF 6.0 or
// BigTIFF) and, for reading alone, the ASCII grid raster, a text of rows of numbers under a short header.
//
// What is read is a Raster: its size, its bands, the outer corner of its north-west cell, the sides of a cell and its
// coordinate system. Cells come as float64 by windows, from blocks that are decoded as they are needed, so that a large
// file costs no more memory than a few of its blocks. A cell without a value is NaN.
//
// What is written is float32 in tiles, with overviews, in the order of a Cloud Optimized GeoTIFF (OGC 21-026): all
// directories at the start, then the cells of the coarsest overview, of the finer ones, and of the raster itself. The
// same cells make the same bytes for any number of workers.
//
// Row 0 is the northernmost and column 0 the westernmost, everywhere in this package.
package geotiff
