package geotiff

import (
	"errors"
	"fmt"
	"math"
	"strconv"
	"strings"

	"drumlin/grids"
)

// Grid is what a raster to be written looks like.
type Grid struct {
	Width, Height int
	X0, Y0        float64 // outer corner of the north-west cell
	CellX, CellY  float64 // sides of a cell, both positive
	EPSG          int     // code of the coordinate system; 0 for none
	Geographic    bool    // the code is that of longitudes and latitudes
	Azimuthal     *Azimuthal
	// Citation says in words what the coordinate system is. Without code and plane it is all there is to say, and stands
	// for coordinates in metres that are tied to nothing else; empty, it becomes "local metres".
	Citation string
	Bands    []string // their names, one or more, all different
}

// GridOf returns the grid of a lattice, with bands of those names. A plane that has neither an EPSG code nor a centre is
// written as coordinates in metres under its own code.
func GridOf(l grids.Lattice, bands []string) Grid {
	g := Grid{Width: l.NX, Height: l.NY, X0: l.X0, Y0: l.Y0 + float64(l.NY)*l.Cell, CellX: l.Cell, CellY: l.Cell, Bands: bands}
	code := l.CRS.Code()
	if number, ok := strings.CutPrefix(code, "EPSG:"); ok {
		if n, err := strconv.Atoi(number); err == nil {
			g.EPSG = n
			return g
		}
	}
	var a Azimuthal
	if _, err := fmt.Sscanf(code, "laea lon=%g lat=%g", &a.Lon, &a.Lat); err == nil && a.code() == code {
		g.Azimuthal = &a
		return g
	}
	if code != "local" {
		g.Citation = code
	}
	return g
}

// Validate returns an error if no file can be written for the grid.
func (g Grid) Validate() error {
	if g.Width < 1 || g.Height < 1 || g.Width > mostAcross || g.Height > mostAcross {
		return fmt.Errorf("a raster of %d columns and %d rows: both must be 1 to %d", g.Width, g.Height, mostAcross)
	}
	place := Raster{Width: g.Width, Height: g.Height, X0: g.X0, Y0: g.Y0, CellX: g.CellX, CellY: g.CellY}
	if err := place.checkPlace(""); err != nil {
		return fmt.Errorf("a raster %w", err)
	}
	if g.EPSG < 0 || g.EPSG > lastEPSG {
		return fmt.Errorf("EPSG code %d cannot be written to a GeoTIFF: codes go from 1 to %d", g.EPSG, lastEPSG)
	}
	if g.EPSG > 0 && g.Azimuthal != nil {
		return errors.New("a raster has one coordinate system, and here are an EPSG code and an azimuthal plane")
	}
	if a := g.Azimuthal; a != nil && !(math.Abs(a.Lon) <= 180 && math.Abs(a.Lat) <= 90) {
		return fmt.Errorf("centre of the plane: longitude %v, latitude %v is not a place on the globe", a.Lon, a.Lat)
	}
	if len(g.Bands) < 1 || len(g.Bands) > mostBands {
		return fmt.Errorf("a raster of %d bands: there must be 1 to %d", len(g.Bands), mostBands)
	}
	seen := map[string]bool{}
	for i, name := range g.Bands {
		if name == "" || name != clean(name) {
			return fmt.Errorf("band %d: the name %q is empty, too long or not plain text on one line", i+1, name)
		}
		if seen[name] {
			return fmt.Errorf("two bands are called %q", name)
		}
		seen[name] = true
	}
	return nil
}
