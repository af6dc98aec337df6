package geotiff

import "math"

// locate reads where the raster lies: the place of its north-west corner and the sides of a cell.
func (f *file) locate(d directory, k geoKeys, r *Raster) error {
	r.PixelIsPoint = k.number(keyRasterType) == rasterPoint
	scale, err := f.reals(d, tagPixelScale, 3)
	if err != nil {
		return err
	}
	tie, err := f.reals(d, tagTiepoint, 6*64)
	if err != nil {
		return err
	}
	matrix, err := f.reals(d, tagTransformation, 16)
	if err != nil {
		return err
	}
	switch {
	case len(scale) >= 2 && len(tie) >= 6:
		// a place of the raster, in cells from its north-west corner (or the centre there), and the same place on the earth
		r.CellX, r.CellY = scale[0], scale[1]
		r.X0, r.Y0 = tie[3]-tie[0]*scale[0], tie[4]+tie[1]*scale[1]
	case len(matrix) >= 16:
		if matrix[1] != 0 || matrix[4] != 0 {
			return f.refuse(adviceNorthUp, "is rotated or sheared against its coordinate system")
		}
		r.CellX, r.CellY = matrix[0], -matrix[5]
		r.X0, r.Y0 = matrix[3], matrix[7]
	case len(tie) > 6:
		return f.refuse(adviceNorthUp, "is tied to the earth by single places only, not by a grid")
	default:
		return f.refuse("give it the place of its corner, the size of its cells and its coordinate system, for example by exporting it again from the program it came from",
			"does not say where on the earth it lies")
	}
	if r.CellX < 0 || r.CellY < 0 {
		return f.refuse(adviceNorthUp, "has rows that run from the south or columns that run from the east")
	}
	if r.PixelIsPoint {
		r.X0, r.Y0 = r.X0-r.CellX/2, r.Y0+r.CellY/2
	}
	return r.checkPlace(f.name)
}

// checkPlace refuses corners and cells that are no numbers to count with.
func (r *Raster) checkPlace(name string) error {
	west, south, east, north := r.Bounds()
	if !(r.CellX > 0 && r.CellY > 0) || math.IsInf(west-east+south-north, 0) || math.IsNaN(west-east+south-north) {
		return &Error{File: name, What: "has cells or a corner whose coordinates are not finite and positive sizes", Advice: adviceDamaged}
	}
	if !(r.X0+r.CellX > r.X0 && r.Y0-r.CellY < r.Y0 && east-r.CellX < east && south+r.CellY > south) {
		return &Error{File: name, What: "has cells so small that their coordinates cannot be told apart", Advice: adviceDamaged}
	}
	return nil
}

// name reads which coordinate system the raster has.
func (k geoKeys) name(r *Raster) {
	model, projected, geodetic := k.number(keyModelType), k.number(keyProjectedCRS), k.number(keyGeodeticCRS)
	r.Geographic = model == modelGeographic || model == 0 && projected == 0 && isCode(geodetic)
	switch {
	case isCode(projected) && !r.Geographic:
		r.EPSG = projected
	case isCode(geodetic) && r.Geographic:
		r.EPSG = geodetic
	case k.isAzimuthal():
		r.Azimuthal = &Azimuthal{Lon: k.real(keyCentreLongitude), Lat: k.real(keyCentreLatitude)}
	}
	for _, key := range []int{keyProjectedCite, keyCitation, keyGeodeticCite} {
		if r.Citation == "" {
			r.Citation = k.text(key)
		}
	}
}

func isCode(v int) bool { return v > 0 && v <= lastEPSG }

// isAzimuthal reports whether the keys spell out an azimuthal equal-area plane on WGS 84 in metres around its centre.
func (k geoKeys) isAzimuthal() bool {
	units := k.number(keyLinearUnits)
	wgs84 := k.number(keyGeodeticCRS) == geodeticWGS84 || k.number(keyGeodeticDatum) == datumWGS84 || k.number(keyEllipsoid) == ellipsoidWGS84
	degree := k.number(keyAngularUnits)
	lon, lat := k.real(keyCentreLongitude), k.real(keyCentreLatitude)
	return k.number(keyModelType) == modelProjected && k.number(keyMethod) == methodAzimuthal && wgs84 &&
		(units == 0 || units == unitMetre) && (degree == 0 || degree == unitDegree) &&
		k.zero(keyFalseEasting) && k.zero(keyFalseNorthing) && math.Abs(lon) <= 180 && math.Abs(lat) <= 90
}
