package geotiff

import (
	"fmt"
	"math"
	"strconv"
)

// Raster is a raster that can be read. It is safe for concurrent use as long as the source it was opened on is, which
// must stay open.
type Raster struct {
	Width, Height int // columns and rows
	Bands         []Band
	X0, Y0        float64 // outer corner of the north-west cell, also where places in the file are those of centres
	CellX, CellY  float64 // sides of a cell, both positive, in the unit of the coordinate system
	PixelIsPoint  bool    // the file gives places of centres; values are those of points
	EPSG          int     // code of the coordinate system; 0 where the file names none
	Geographic    bool    // coordinates are longitude and latitude
	Azimuthal     *Azimuthal
	Citation      string // what the file says of its coordinate system in words
	Overviews     int    // coarser copies in the file; they are not read
	// BlockWidth and BlockHeight are the columns and rows that are fetched together, in blocks from the north-west corner
	// on. Windows of whole blocks are the fastest, of whole rows of blocks the best for reading all.
	BlockWidth, BlockHeight int

	cells cells
}

// Band is one band of a raster.
type Band struct {
	Name      string // its description in the file, or else "band1", "band2", ...
	Kind      Kind
	NoData    float64 // stored value of cells without data
	HasNoData bool
	// A value is Scale times the stored number plus Offset: 1 and 0 unless the file says otherwise.
	Scale, Offset float64
}

// Azimuthal is the plane of the Lambert azimuthal equal-area projection on WGS 84 around a centre, in metres, without
// false origin. Longitude and latitude are in degrees.
type Azimuthal struct{ Lon, Lat float64 }

// code spells the plane out as grids/crs does.
func (a Azimuthal) code() string {
	return "laea lon=" + strconv.FormatFloat(a.Lon, 'f', -1, 64) + " lat=" + strconv.FormatFloat(a.Lat, 'f', -1, 64)
}

// cells is where the values of a raster come from: fill writes stored numbers.
type cells interface {
	fill(dst []float64, band, x0, y0, nx, ny int) error
}

// CRS returns the code of the raster's coordinate system as grids/crs spells it: "EPSG:32633", "laea lon=8.5 lat=47.25",
// or "" where the file does not say or says it in a way that has no code.
func (r *Raster) CRS() string {
	switch {
	case r.EPSG > 0:
		return "EPSG:" + strconv.Itoa(r.EPSG)
	case r.Azimuthal != nil:
		return r.Azimuthal.code()
	}
	return ""
}

// Bounds returns the outer edges of the raster.
func (r *Raster) Bounds() (west, south, east, north float64) {
	return r.X0, r.Y0 - float64(r.Height)*r.CellY, r.X0 + float64(r.Width)*r.CellX, r.Y0
}

// Centre returns the centre of the cell in column x and row y.
func (r *Raster) Centre(x, y int) (float64, float64) {
	return r.X0 + (float64(x)+0.5)*r.CellX, r.Y0 - (float64(y)+0.5)*r.CellY
}

// Band returns the number of the band of that name, and false if there is none.
func (r *Raster) Band(name string) (int, bool) {
	for i, b := range r.Bands {
		if b.Name == name {
			return i, true
		}
	}
	return 0, false
}

// Window writes the values of a band in nx columns from column x0 and ny rows from row y0 to dst, row after row from
// the north, NaN for cells without data. An error is an *Error: part of the file cannot be read, and dst is then worth
// nothing. Window panics if the window is not within the raster or dst has another length than nx ny.
func (r *Raster) Window(dst []float64, band, x0, y0, nx, ny int) error {
	if band < 0 || band >= len(r.Bands) || x0 < 0 || y0 < 0 || nx < 0 || ny < 0 || nx > r.Width-x0 || ny > r.Height-y0 {
		panic(fmt.Sprintf("geotiff: window of %d columns from %d and %d rows from %d of band %d is not within the raster", nx, x0, ny, y0, band))
	}
	if len(dst) != nx*ny {
		panic("geotiff: length of the destination differs from the size of the window")
	}
	if len(dst) == 0 {
		return nil
	}
	if err := r.cells.fill(dst, band, x0, y0, nx, ny); err != nil {
		return err
	}
	r.Bands[band].values(dst)
	return nil
}

// values turns stored numbers into values.
func (b Band) values(v []float64) {
	if absent, ok := b.Kind.stored(b.NoData); b.HasNoData && ok {
		low, high := absent, absent
		if b.Kind.isFloat() && absent > beyond {
			low, high = beyond, math.Inf(1)
		} else if b.Kind.isFloat() && absent < -beyond {
			low, high = math.Inf(-1), -beyond
		}
		for i := range v {
			if v[i] >= low && v[i] <= high {
				v[i] = math.NaN()
			}
		}
	}
	if b.Scale != 1 || b.Offset != 0 {
		for i := range v {
			v[i] = b.Scale*v[i] + b.Offset
		}
	}
}

// beyond is where no measurement lies. The largest float32, 3.4028235e38, is a common mark for cells without data and
// stands in files with fewer digits than it takes, so a mark beyond is every number beyond on its side.
const beyond = 3.4e38
