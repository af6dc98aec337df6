// Package archive stores a fitted surface in a file of its own kind, saved.surface, and reads it back. Numbers keep
// every bit, so that a surface read back predicts what the fitted one did.
//
// # The file
//
// Integers and numbers are little-endian; nothing is padded.
//
//	bytes       what
//	16          "drumlin-surface\n": the kind of file
//	4           version of the layout, unsigned
//	4           length h of the head in bytes, unsigned
//	h           the head: JSON, UTF-8
//	8 each      the arrays: IEEE 754 double-precision numbers, one array after the other
//	32          SHA-256 of everything before it
//
// The head holds what is not a number computed by the fit: the version of the program, how estimates are stated
// (Reporting), the model, the fit's counts and names (Report) and the effects with their levels, both with 0 for the
// numbers that stand among the arrays, and the arrays' names and lengths. The arrays are, in this order,
//
//	scalars             centre and scale of the basis, the dispersion, the report's numbers, those of the effects
//	knot_x, knot_y      knots in metres; K of them, or none without a surface
//	whiten              K x (K-3), row by row: radial functions to penalised columns (basis2d.ThinPlate)
//	mix, r              transform of the covariates' q columns, null x q and q x q (spatial.State)
//	beta                p coefficients
//	factor              p x p, row by row, upper triangular: R with R'R = X'WX + S
//	spread              what the smoothness' uncertainty adds, rows of p values; or none
//	place_x, place_y    distinct places of the observations in metres
//
// A file is taken whole or refused. A change of the layout, of a field of the head, or of what a number means is a new
// version, and the file under testdata is read for as long as its version is.
package archive
