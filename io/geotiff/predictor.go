package geotiff

import "encoding/binary"

// Cells are kept little-endian from here on, whatever the file has.

// swap turns the bytes of every number round.
func swap(b []byte, size int) {
	for ; len(b) >= size; b = b[size:] {
		for i, j := 0, size-1; i < j; i, j = i+1, j-1 {
			b[i], b[j] = b[j], b[i]
		}
	}
}

// addUp undoes horizontal differencing (TIFF 6.0, section 14) in one row of numbers of size bytes: each is the
// difference from the number side places before it, which is the same band of the cell to the west.
func addUp(row []byte, size, side int) {
	step := size * side
	switch size {
	case 1:
		for i := step; i < len(row); i++ {
			row[i] += row[i-step]
		}
	case 2:
		for i := step; i+2 <= len(row); i += 2 {
			binary.LittleEndian.PutUint16(row[i:], binary.LittleEndian.Uint16(row[i:])+binary.LittleEndian.Uint16(row[i-step:]))
		}
	case 4:
		for i := step; i+4 <= len(row); i += 4 {
			binary.LittleEndian.PutUint32(row[i:], binary.LittleEndian.Uint32(row[i:])+binary.LittleEndian.Uint32(row[i-step:]))
		}
	case 8:
		for i := step; i+8 <= len(row); i += 8 {
			binary.LittleEndian.PutUint64(row[i:], binary.LittleEndian.Uint64(row[i:])+binary.LittleEndian.Uint64(row[i-step:]))
		}
	}
}

// gather undoes the floating-point predictor (Adobe Photoshop TIFF Technical Note 3, 2005) in one row: bytes are
// differences, and all the highest bytes of the row's numbers stand first, then all the second ones, and so on, in a
// file of either byte order. scratch has the length of row.
func gather(row, scratch []byte, size, side int) {
	addUp(row, 1, side)
	n := len(row) / size
	copy(scratch, row)
	for b := range size {
		plane := scratch[b*n : (b+1)*n]
		for i, v := range plane {
			row[i*size+size-1-b] = v
		}
	}
}

// scatter is the inverse of gather for a row of single numbers: it fills dst from numbers of 4 bytes.
func scatter(dst []byte, row []uint32) {
	n := len(row)
	for i, v := range row {
		dst[i], dst[n+i], dst[2*n+i], dst[3*n+i] = byte(v>>24), byte(v>>16), byte(v>>8), byte(v)
	}
	for i := len(dst) - 1; i > 0; i-- {
		dst[i] -= dst[i-1]
	}
}
