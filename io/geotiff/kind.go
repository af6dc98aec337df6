package geotiff

import (
	"encoding/binary"
	"fmt"
	"math"
)

// Kind is the kind of number that the cells of a raster are stored as.
type Kind uint8

// Kinds of number. Whole numbers of 64 bits are rounded to the nearest float64 beyond 2^53. Text is that of an ASCII
// grid raster.
const (
	Uint8 Kind = iota + 1
	Uint16
	Uint32
	Uint64
	Int8
	Int16
	Int32
	Int64
	Float32
	Float64
	Text
)

var kindNames = [...]string{
	Uint8: "uint8", Uint16: "uint16", Uint32: "uint32", Uint64: "uint64", Int8: "int8", Int16: "int16", Int32: "int32", Int64: "int64",
	Float32: "float32", Float64: "float64", Text: "text",
}

// String returns the name of the kind, such as "uint8" or "float32".
func (k Kind) String() string {
	if int(k) < len(kindNames) && kindNames[k] != "" {
		return kindNames[k]
	}
	return fmt.Sprintf("kind %d", uint8(k))
}

// size is the number of bytes of a cell in a block.
func (k Kind) size() int {
	switch k {
	case Uint8, Int8:
		return 1
	case Uint16, Int16:
		return 2
	case Uint32, Int32, Float32:
		return 4
	}
	return 8
}

// isFloat reports whether cells of this kind can have decimals.
func (k Kind) isFloat() bool { return k == Float32 || k == Float64 || k == Text }

// stored returns what a number becomes when it is stored as this kind, and false where it cannot be: such a number is
// in no cell.
func (k Kind) stored(v float64) (float64, bool) {
	switch k {
	case Float32:
		return float64(float32(v)), true
	case Float64, Text:
		return v, true
	}
	bits := float64(8 * k.size())
	low, high := 0.0, math.Exp2(bits)
	if k >= Int8 {
		low, high = -math.Exp2(bits-1), math.Exp2(bits-1)
	}
	return v, v == math.Trunc(v) && v >= low && v < high
}

// kindOf returns the kind that a sample format and a number of bits name (TIFF 6.0, section 19), and false if it is none
// that is read.
func kindOf(format, bits uint64) (Kind, bool) {
	const unsigned, signed, float, undefined = 1, 2, 3, 4
	kinds := map[[2]uint64]Kind{
		{unsigned, 8}: Uint8, {unsigned, 16}: Uint16, {unsigned, 32}: Uint32, {unsigned, 64}: Uint64,
		{signed, 8}: Int8, {signed, 16}: Int16, {signed, 32}: Int32, {signed, 64}: Int64,
		{float, 32}: Float32, {float, 64}: Float64,
	}
	if format == undefined {
		format = unsigned
	}
	k, ok := kinds[[2]uint64{format, bits}]
	return k, ok
}

// cellsTo turns len(dst) cells of a block, little-endian and step bytes apart, into numbers.
func cellsTo(dst []float64, b []byte, k Kind, step int) {
	switch k {
	case Uint8:
		for i := range dst {
			dst[i] = float64(b[i*step])
		}
	case Int8:
		for i := range dst {
			dst[i] = float64(int8(b[i*step]))
		}
	case Uint16:
		for i := range dst {
			dst[i] = float64(binary.LittleEndian.Uint16(b[i*step:]))
		}
	case Int16:
		for i := range dst {
			dst[i] = float64(int16(binary.LittleEndian.Uint16(b[i*step:])))
		}
	case Uint32:
		for i := range dst {
			dst[i] = float64(binary.LittleEndian.Uint32(b[i*step:]))
		}
	case Int32:
		for i := range dst {
			dst[i] = float64(int32(binary.LittleEndian.Uint32(b[i*step:])))
		}
	case Float32:
		for i := range dst {
			dst[i] = float64(math.Float32frombits(binary.LittleEndian.Uint32(b[i*step:])))
		}
	case Uint64:
		for i := range dst {
			dst[i] = float64(binary.LittleEndian.Uint64(b[i*step:]))
		}
	case Int64:
		for i := range dst {
			dst[i] = float64(int64(binary.LittleEndian.Uint64(b[i*step:])))
		}
	case Float64:
		for i := range dst {
			dst[i] = math.Float64frombits(binary.LittleEndian.Uint64(b[i*step:]))
		}
	}
}
