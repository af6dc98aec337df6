package geotiff

import (
	"bytes"
	stdlzw "compress/lzw"
	"errors"
	"io"

	"github.com/klauspost/compress/zlib"
	"github.com/klauspost/compress/zstd"
	"golang.org/x/image/tiff/lzw"
)

var errShort = errors.New("it holds fewer cells than it should")

// unpack fills dst from the packed bytes of a block. Bytes left over are not an error: a writer may pad the last strip,
// which makes whole bytes then.
func unpack(dst, packed []byte, compression uint64, whole int) error {
	switch compression {
	case compressNone:
		if copy(dst, packed) < len(dst) {
			return errShort
		}
		return nil
	case compressLZW:
		return fillFrom(dst, lzwReader(packed))
	case compressDeflate, compressDeflate0:
		r, err := zlib.NewReader(bytes.NewReader(packed))
		if err != nil {
			return err
		}
		return fillFrom(dst, r)
	case compressPackBits:
		return unpackBits(dst, packed)
	case compressZstd:
		return unpackZstd(dst, packed, whole)
	}
	panic("geotiff: a layout with an unknown compression")
}

func fillFrom(dst []byte, r io.Reader) error {
	_, err := io.ReadFull(r, dst)
	if errors.Is(err, io.EOF) || errors.Is(err, io.ErrUnexpectedEOF) {
		return errShort
	}
	return err
}

// mostWindow is how far back the strongest level of Zstandard may refer; writers ask for it even in small blocks.
const mostWindow = 128 << 20

// unpackZstd unpacks in one go: reading as a stream would take memory for all that the window may hold.
func unpackZstd(dst, packed []byte, whole int) error {
	d, err := zstd.NewReader(nil, zstd.WithDecoderConcurrency(1), zstd.WithDecoderMaxWindow(mostWindow), zstd.WithDecodeAllCapLimit(true))
	if err != nil {
		return err
	}
	defer d.Close()
	b, err := d.DecodeAll(packed, make([]byte, 0, whole))
	if err != nil {
		return err
	}
	if copy(dst, b) < len(dst) {
		return errShort
	}
	return nil
}

// lzwReader chooses between the LZW of TIFF 6.0 and that of files older than it, whose codes start at the lowest bit and
// grow one code later. Both start with the code 256, which in the old order is a zero byte and then an odd one (common
// practice, no source).
func lzwReader(packed []byte) io.Reader {
	if len(packed) > 1 && packed[0] == 0 && packed[1]&1 == 1 {
		return stdlzw.NewReader(bytes.NewReader(packed), stdlzw.LSB, 8)
	}
	return lzw.NewReader(bytes.NewReader(packed), lzw.MSB, 8)
}

// unpackBits undoes the run lengths of TIFF 6.0, section 9: a byte n below 128 is followed by n+1 bytes as they are, one
// above 128 by a byte that stands for 257-n of them, and 128 by nothing.
func unpackBits(dst, packed []byte) error {
	for len(dst) > 0 {
		if len(packed) < 2 {
			return errShort
		}
		n := int(packed[0])
		packed = packed[1:]
		switch {
		case n < 128:
			n = min(n+1, len(dst))
			if len(packed) < n {
				return errShort
			}
			copy(dst[:n], packed)
			packed, dst = packed[n:], dst[n:]
		case n > 128:
			n = min(257-n, len(dst))
			for i := range n {
				dst[i] = packed[0]
			}
			packed, dst = packed[1:], dst[n:]
		}
	}
	return nil
}
