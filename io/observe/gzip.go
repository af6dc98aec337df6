package observe

import (
	"bufio"
	"compress/flate"
	"compress/gzip"
	"errors"
	"fmt"
	"io"
)

// Bounds for what a compressed file may hold. Text of numbers shrinks to about a quarter; 1000 to 1 is what endless
// repetition of one byte comes to (deflate has at most 1032 to 1, from memory of its format).
const (
	maxUnpacked  = 8 << 30 // bytes
	freeUnpacked = 1 << 20 // bytes that may come out of anything
	maxRatio     = 1000
)

// unpacker gives what a file compressed with gzip holds, all members one after the other.
type unpacker struct {
	packed   *counted
	unpacked *gzip.Reader
	source   string
	size     int64 // bytes given
	most     int64
}

// counted counts the bytes that are taken from a buffer.
type counted struct {
	*bufio.Reader
	size int64
}

func (c *counted) Read(p []byte) (int, error) {
	n, err := c.Reader.Read(p)
	c.size += int64(n)
	return n, err
}

func (c *counted) ReadByte() (byte, error) {
	b, err := c.Reader.ReadByte()
	if err == nil {
		c.size++
	}
	return b, err
}

// unpack reads the start of a compressed file.
func unpack(from *bufio.Reader, source string) (*unpacker, error) {
	u := &unpacker{packed: &counted{Reader: from}, source: source, most: maxUnpacked}
	var err error
	if u.unpacked, err = gzip.NewReader(u.packed); err != nil {
		return nil, u.failed(err)
	}
	return u, nil
}

// Read gives unpacked bytes until there are more than a table is likely to have.
func (u *unpacker) Read(p []byte) (int, error) {
	n, err := u.unpacked.Read(p)
	u.size += int64(n)
	switch {
	case u.size > u.most:
		return 0, u.tooLarge(fmt.Sprintf("more than %d bytes", u.most))
	case u.size-freeUnpacked > maxRatio*u.packed.size:
		return 0, u.tooLarge(fmt.Sprintf("more than %d times its own size", maxRatio))
	case err != nil && err != io.EOF:
		return n, u.failed(err)
	}
	return n, err
}

func (u *unpacker) tooLarge(than string) error {
	return &Error{File: u.source, What: "the compressed file unpacks to " + than + ", the most that is read",
		Advice: "check that this is the right file, and unpack it if it is"}
}

// failed says what is wrong with a compressed file.
func (u *unpacker) failed(err error) error {
	e := &Error{File: u.source, Cause: err, Advice: adviceWhole}
	var damaged flate.CorruptInputError
	switch {
	case errors.Is(err, io.ErrUnexpectedEOF), errors.Is(err, io.EOF):
		e.What = "the compressed file is cut short"
	case errors.As(err, &damaged), errors.Is(err, gzip.ErrChecksum), errors.Is(err, gzip.ErrHeader):
		e.What = "the compressed file is damaged"
	default:
		return readError(u.source, err)
	}
	return e
}
