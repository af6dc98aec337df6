package geotiff

import (
	"encoding/binary"
	"errors"
	"fmt"
	"io"
	"math"
)

const (
	mostEntries     = 4096    // of one directory; real ones have some twenty
	mostDirectories = 1024    // overviews, masks and pages of one file
	mostText        = 4 << 20 // bytes of one text, such as the names of the bands
)

// file is a TIFF or BigTIFF file being read.
type file struct {
	r     io.ReaderAt
	size  int64
	name  string
	order binary.ByteOrder
	big   bool // BigTIFF
}

// directory is an image file directory: its entries by tag, values not yet fetched.
type directory map[uint16]entry

// entry is one entry of a directory. Where its values fit they stand in value, otherwise value holds their offset.
type entry struct {
	kind  uint16
	count uint64
	value []byte
}

// refuse makes the error for the whole file.
func (f *file) refuse(advice, format string, args ...any) error {
	return &Error{File: f.name, What: fmt.Sprintf(format, args...), Advice: advice}
}

// read fetches n bytes at an offset. It is an error if they are not all within the file; only then is memory taken.
func (f *file) read(offset, n uint64, what string) ([]byte, error) {
	if offset > uint64(f.size) || n > uint64(f.size)-offset {
		return nil, f.refuse(adviceDamaged, "%s would lie at bytes %d to %d, but the file has %d", what, offset, offset+n, f.size)
	}
	b := make([]byte, n)
	if got, err := f.r.ReadAt(b, int64(offset)); got < len(b) {
		if err == nil || errors.Is(err, io.EOF) {
			return nil, f.refuse(adviceDamaged, "ends before %s is complete", what)
		}
		return nil, &Error{File: f.name, What: "cannot read " + what, Cause: err}
	}
	return b, nil
}

// isTIFF reports whether head starts as a TIFF or BigTIFF file does.
func isTIFF(head []byte) bool {
	if len(head) < 4 {
		return false
	}
	switch string(head[:4]) {
	case "II*\x00", "MM\x00*", "II+\x00", "MM\x00+":
		return true
	}
	return false
}

// start reads the file's header and returns the offset of the first directory.
func (f *file) start() (uint64, error) {
	head, err := f.read(0, 8, "the header")
	if err != nil {
		return 0, err
	}
	f.order = binary.LittleEndian
	if head[0] == 'M' {
		f.order = binary.BigEndian
	}
	if f.big = f.order.Uint16(head[2:]) == 43; !f.big {
		return uint64(f.order.Uint32(head[4:])), nil
	}
	if head, err = f.read(0, 16, "the header"); err != nil {
		return 0, err
	}
	if width := f.order.Uint16(head[4:]); width != 8 {
		return 0, f.refuse(adviceDamaged, "is a BigTIFF whose offsets have %d bytes instead of 8", width)
	}
	return f.order.Uint64(head[8:]), nil
}

// directoryAt reads the directory at an offset and returns it with the offset of the next one, 0 after the last.
func (f *file) directoryAt(offset uint64) (directory, uint64, error) {
	countSize, entrySize, wordSize := uint64(2), uint64(12), uint64(4)
	if f.big {
		countSize, entrySize, wordSize = 8, 20, 8
	}
	b, err := f.read(offset, countSize, "a directory")
	if err != nil {
		return nil, 0, err
	}
	n := uint64(0)
	if f.big {
		n = f.order.Uint64(b)
	} else {
		n = uint64(f.order.Uint16(b))
	}
	if n > mostEntries {
		return nil, 0, f.refuse(adviceDamaged, "has a directory of %d entries, and at most %d are read", n, mostEntries)
	}
	b, err = f.read(offset+countSize, n*entrySize+wordSize, "a directory")
	if err != nil {
		return nil, 0, err
	}
	d := make(directory, n)
	for range n {
		e := entry{kind: f.order.Uint16(b[2:]), count: f.word(b[4:]), value: b[entrySize-wordSize : entrySize]}
		tag := f.order.Uint16(b)
		if _, twice := d[tag]; !twice {
			d[tag] = e
		}
		b = b[entrySize:]
	}
	return d, f.word(b), nil
}

// word reads a count or an offset: 4 bytes, or 8 in BigTIFF.
func (f *file) word(b []byte) uint64 {
	if f.big {
		return f.order.Uint64(b)
	}
	return uint64(f.order.Uint32(b))
}

// bytes fetches the values of an entry as they stand in the file, but not more than most of them.
func (f *file) bytes(tag uint16, e entry, most uint64) ([]byte, error) {
	each := fieldSize(e.kind)
	if each == 0 {
		return nil, f.refuse(adviceDamaged, "tag %d has values of the unknown kind %d", tag, e.kind)
	}
	n := min(e.count, most)
	if e.count <= uint64(len(e.value))/each { // they stand in the entry itself
		return e.value[:n*each], nil
	}
	return f.read(f.word(e.value), n*each, fmt.Sprintf("tag %d", tag))
}

// whole fetches up to most values of a tag that holds whole numbers of no sign; nil if the tag is absent.
func (f *file) whole(d directory, tag uint16, most uint64) ([]uint64, error) {
	e, ok := d[tag]
	if !ok {
		return nil, nil
	}
	b, err := f.bytes(tag, e, most)
	if err != nil {
		return nil, err
	}
	v := make([]uint64, len(b)/int(fieldSize(e.kind)))
	for i := range v {
		switch e.kind {
		case 1:
			v[i] = uint64(b[i])
		case 3:
			v[i] = uint64(f.order.Uint16(b[2*i:]))
		case 4, 13:
			v[i] = uint64(f.order.Uint32(b[4*i:]))
		case 16, 18:
			v[i] = f.order.Uint64(b[8*i:])
		default:
			return nil, f.refuse(adviceDamaged, "tag %d should hold whole numbers and has values of kind %d", tag, e.kind)
		}
	}
	return v, nil
}

// one fetches the first value of a tag that holds whole numbers, or returns what it is when absent.
func (f *file) one(d directory, tag uint16, absent uint64) (uint64, error) {
	v, err := f.whole(d, tag, 1)
	if err != nil {
		return 0, err
	}
	if len(v) == 0 {
		return absent, nil
	}
	return v[0], nil
}

// same fetches a tag that has a value for each band where these must all be the same.
func (f *file) same(d directory, tag uint16, bands int, absent uint64, what string) (uint64, error) {
	v, err := f.whole(d, tag, uint64(bands))
	if err != nil || len(v) == 0 {
		return absent, err
	}
	for i := range v {
		if v[i] != v[0] {
			return 0, f.refuse(adviceOneFile, "band 1 has %s %d and band %d has %d", what, v[0], i+1, v[i])
		}
	}
	return v[0], nil
}

// reals fetches up to most values of a tag that holds doubles (floats are taken too); nil if the tag is absent.
func (f *file) reals(d directory, tag uint16, most uint64) ([]float64, error) {
	e, ok := d[tag]
	if !ok {
		return nil, nil
	}
	if e.kind != fieldDouble && e.kind != fieldFloat {
		return nil, f.refuse(adviceDamaged, "tag %d should hold numbers with decimals and has values of kind %d", tag, e.kind)
	}
	b, err := f.bytes(tag, e, most)
	if err != nil {
		return nil, err
	}
	v := make([]float64, len(b)/int(fieldSize(e.kind)))
	for i := range v {
		if e.kind == fieldDouble {
			v[i] = math.Float64frombits(f.order.Uint64(b[8*i:]))
		} else {
			v[i] = float64(math.Float32frombits(f.order.Uint32(b[4*i:])))
		}
	}
	return v, nil
}

// text fetches a tag that holds text, without the zero byte at its end; "" if the tag is absent.
func (f *file) text(d directory, tag uint16) (string, error) {
	e, ok := d[tag]
	if !ok {
		return "", nil
	}
	if fieldSize(e.kind) != 1 {
		return "", f.refuse(adviceDamaged, "tag %d should hold text and has values of kind %d", tag, e.kind)
	}
	if e.count > mostText {
		return "", f.refuse(adviceRewrite, "tag %d holds a text of %d bytes, and at most %d are read", tag, e.count, mostText)
	}
	b, err := f.bytes(tag, e, mostText)
	if err != nil {
		return "", err
	}
	for len(b) > 0 && b[len(b)-1] == 0 {
		b = b[:len(b)-1]
	}
	return string(b), nil
}

// pictures walks the chain of directories and returns the first that is neither an overview nor a mask, and the number
// of overviews. A chain that comes back on itself is an error.
func (f *file) pictures() (first directory, overviews int, err error) {
	const overview, mask = 1, 4
	next, err := f.start()
	if err != nil {
		return nil, 0, err
	}
	seen := map[uint64]bool{}
	for next != 0 {
		if seen[next] {
			return nil, 0, f.refuse(adviceDamaged, "has directories that go round in a circle: byte %d comes twice", next)
		}
		if len(seen) == mostDirectories {
			return nil, 0, f.refuse(adviceDamaged, "has more than %d directories", mostDirectories)
		}
		seen[next] = true
		var d directory
		if d, next, err = f.directoryAt(next); err != nil {
			return nil, 0, err
		}
		subfile, err := f.one(d, tagSubfile, 0)
		if err != nil {
			return nil, 0, err
		}
		switch {
		case subfile&(overview|mask) == overview:
			overviews++
		case subfile&(overview|mask) == 0 && first == nil:
			first = d
		}
	}
	if first == nil {
		return nil, 0, f.refuse(adviceDamaged, "has no directory of a raster at full resolution")
	}
	return first, overviews, nil
}
