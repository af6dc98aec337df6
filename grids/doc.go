// Package grids holds what a map is laid on: the lattice and its study area, zones, and the values on both. It knows
// geometry and no statistics; it reads and writes no files.
//
// Everything is in a plane in metres (package crs). NewLattice lays square cells over the study area, polygons that were
// given or the observations' convex hull, and marks the cells that belong to it. A cell belongs to a shape if its centre
// lies in it (CellsIn), so zones that share edges share no cells. Areas on the ground are true: what the plane stretches,
// AreaOf and Lattice.CellAreaAt take back.
//
// Coordinates that are NaN, infinite or beyond 1e150 name no place: as observations they are passed over, as vertices
// of a polygon they are an error or keep it empty. The zero Lattice has no cells; one without CRS has no areas.
package grids
