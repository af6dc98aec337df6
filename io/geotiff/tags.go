package geotiff

// Tags of a directory: TIFF 6.0, its supplements, and those of OGC 19-008r4. The last two are common practice and carry
// names, scales and the value of cells without data.
const (
	tagSubfile         = 254
	tagWidth           = 256
	tagHeight          = 257
	tagBitsPerSample   = 258
	tagCompression     = 259
	tagPhotometric     = 262
	tagFillOrder       = 266
	tagStripOffsets    = 273
	tagSamplesPerPixel = 277
	tagRowsPerStrip    = 278
	tagStripByteCounts = 279
	tagPlanar          = 284
	tagPredictor       = 317
	tagTileWidth       = 322
	tagTileHeight      = 323
	tagTileOffsets     = 324
	tagTileByteCounts  = 325
	tagExtraSamples    = 338
	tagSampleFormat    = 339
	tagPixelScale      = 33550
	tagTiepoint        = 33922
	tagTransformation  = 34264
	tagGeoKeys         = 34735
	tagGeoDoubles      = 34736
	tagGeoASCII        = 34737
	tagMetadata        = 42112
	tagNoData          = 42113
)

// Kinds of value in a directory.
const (
	fieldASCII  = 2
	fieldShort  = 3
	fieldLong   = 4
	fieldFloat  = 11
	fieldDouble = 12
	fieldLong8  = 16
)

// fieldSize is the size in bytes of a value of each kind; 0 where there is no such kind.
func fieldSize(kind uint16) uint64 {
	switch kind {
	case 1, 2, 6, 7:
		return 1
	case 3, 8:
		return 2
	case 4, 9, 11, 13:
		return 4
	case 5, 10, 12, 16, 17, 18:
		return 8
	}
	return 0
}

// Keys of the coordinate system (OGC 19-008r4, section 7).
const (
	keyModelType       = 1024
	keyRasterType      = 1025
	keyCitation        = 1026
	keyGeodeticCRS     = 2048
	keyGeodeticCite    = 2049
	keyGeodeticDatum   = 2050
	keyAngularUnits    = 2054
	keyEllipsoid       = 2056
	keyProjectedCRS    = 3072
	keyProjectedCite   = 3073
	keyProjection      = 3074
	keyMethod          = 3075
	keyLinearUnits     = 3076
	keyFalseEasting    = 3082
	keyFalseNorthing   = 3083
	keyCentreLongitude = 3088
	keyCentreLatitude  = 3089
)

// Values of those keys.
const (
	modelProjected   = 1
	modelGeographic  = 2
	rasterArea       = 1
	rasterPoint      = 2
	userDefined      = 32767
	methodAzimuthal  = 10 // Lambert azimuthal equal-area
	unitMetre        = 9001
	unitDegree       = 9102
	geodeticWGS84    = 4326
	datumWGS84       = 6326
	ellipsoidWGS84   = 7030
	lastEPSG         = 32766 // above it lies the users' own range
	compressNone     = 1
	compressLZW      = 5
	compressDeflate  = 8
	compressDeflate0 = 32946 // the number Deflate had before it was given 8
	compressPackBits = 32773
	compressZstd     = 50000
	predictNone      = 1
	predictInteger   = 2
	predictFloat     = 3
)
