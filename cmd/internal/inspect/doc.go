// Package inspect says what a table of observations that nobody has asked anything of yet seems to hold, what seems to be
// wrong with it, and how a map of it could be asked for. It looks at an observe.Survey and opens no file. Of a raster it
// says what its bands hold and where they lie, reading block by block.
//
// What it says of meanings goes by names, ranges and comparisons of columns. It is put as what is likely, never as what is
// so, and where the table does not tell, the report says that instead.
package inspect
