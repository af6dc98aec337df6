// Package isolines draws the lines of equal value and the filled bands between them of one value a cell of a lattice.
// It reads and writes no files.
//
// Both are taken from one continuous surface over the cells that have a value: those of the mask whose value is finite.
//
//   - Four such cells around a corner of the lattice make a square between their centres. A line crosses the square's sides
//     where linear interpolation puts it and runs straight in between (marching squares: Lorensen & Cline 1987, Computer
//     Graphics 21:163-169, in two dimensions). Where two opposite centres are above a level and the other two below, the mean
//     of the four says whether the two above are joined.
//   - At the mask's edge the surface goes on for the half cell that is left, constant across the edge and linear along it,
//     so that it covers the cells exactly and lines run to their edges. At a corner where one of four cells is missing, the
//     surface has the mean of the two cells beside the gap. Cells that touch in a corner alone have nothing to do with
//     each other there.
//
// A value equal to a level counts as above it. Lines then run through the centre itself; what has no width, a single peak or a
// ridge of one cell that reach a level and no more, has neither line nor band. Differences of less than a part in 1e12
// of what neighbouring cells differ by (more, where coordinates have fewer digits to spare within a cell) move a line by
// nothing that can be seen, and it is put through the centre too.
//
// Lines never cross, neither themselves nor those of another level, for the surface is the same for all of them; they can
// touch in points, and where levels or the coordinates are too close to be told apart run together.
package isolines
