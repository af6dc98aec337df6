// Package observe reads a table of observations and hands on what can be used of it.
//
// A row is one observation at one place. A file that is not what it should be (an absent column, a row with a field
// too many, a latitude of 97) is refused with an Error that says where and what to do. A row that cannot be used (no
// response, a denominator of 0) is set aside with its reason, and the rest goes on, unless the request is strict or
// more than half of the rows would be lost.
//
// Files are CSV tables, whose places are columns of coordinates or of geometries, or GeoJSON, whose features are rows
// with geometries of their own. Which of the two it is shows from the text.
//
// How a table is written (its compression, its encoding, the separator of its columns) is found out and told; Format
// says what cannot be found out, such as what stands for a missing value.
//
// A table that holds many regions is read once: Whole keeps it in memory as it stands, Split deals its rows to parts,
// and ReadPart reads each part as Read reads a file, with the lines and rows of the whole file in its messages.
//
// The package opens no files: it is given a reader and the name to call the source by in messages.
package observe
