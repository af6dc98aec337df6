// Package sealed is the frame around the files of the program's own kinds: a name and a version in front, a head in JSON,
// arrays of numbers, and a checksum at the end, so that a file is taken whole or refused.
//
// Integers and numbers are little-endian; nothing is padded.
//
//	bytes       what
//	m           the kind of file, a line
//	4           version of the layout, unsigned
//	4           length h of the head in bytes, unsigned
//	h           the head: JSON, UTF-8
//	8 each      IEEE 754 double-precision numbers, one array after the other
//	4 each      signed whole numbers, one array after the other
//	32          SHA-256 of everything before it
//
// The frame does not know where arrays end: their lengths are for the head to say.
package sealed

import (
	"bytes"
	"crypto/sha256"
	"encoding/binary"
	"fmt"
	"io"
	"math"
)

// Kind is a kind of file.
type Kind struct {
	Magic     string // first bytes of the file, a line
	Version   uint32 // of the layout that is written, and the newest that is read
	Limit     int64  // size in bytes of the largest file
	HeadLimit int    // size in bytes of the longest head
	Name      string // in words, such as "saved surface"
	Advice    string // what to do about a damaged file
}

// Size is the number of bytes of a file with that head, floats and whole numbers.
func (k Kind) Size(head, floats, ints int) int64 {
	return int64(k.fixed()) + int64(head) + 8*int64(floats) + 4*int64(ints) + sha256.Size
}

// fixed is the number of bytes before the head.
func (k Kind) fixed() int { return len(k.Magic) + 8 }

// Write writes a file. Equal parts give equal bytes. Limits are for the caller to hold.
func (k Kind) Write(w io.Writer, head []byte, floats [][]float64, ints [][]int32) error {
	sum := sha256.New()
	out := io.MultiWriter(w, sum)
	var b bytes.Buffer
	b.WriteString(k.Magic)
	b.Write(binary.LittleEndian.AppendUint32(nil, k.Version))
	b.Write(binary.LittleEndian.AppendUint32(nil, uint32(len(head))))
	b.Write(head)
	for _, a := range floats {
		for _, v := range a {
			b.Write(binary.LittleEndian.AppendUint64(b.AvailableBuffer(), math.Float64bits(v)))
		}
		if _, err := b.WriteTo(out); err != nil {
			return err
		}
	}
	for _, a := range ints {
		for _, v := range a {
			b.Write(binary.LittleEndian.AppendUint32(b.AvailableBuffer(), uint32(v)))
		}
		if _, err := b.WriteTo(out); err != nil {
			return err
		}
	}
	if _, err := b.WriteTo(out); err != nil {
		return err
	}
	_, err := w.Write(sum.Sum(nil))
	return err
}

// Read reads a file and returns its head and the bytes of its arrays. Errors are *DamagedError for a file that is not of
// that kind, is cut short, altered or too large, *NewerError for one of a later version, and those of r.
func (k Kind) Read(r io.Reader) (head, arrays []byte, err error) {
	raw, err := io.ReadAll(io.LimitReader(r, k.Limit+1))
	if err != nil {
		return nil, nil, err
	}
	if int64(len(raw)) > k.Limit {
		return nil, nil, k.Damaged("it is larger than %d MiB, which no %s is", k.Limit>>20, k.Name)
	}
	return k.open(raw)
}

func (k Kind) open(raw []byte) (head, arrays []byte, err error) {
	if !bytes.HasPrefix(raw, []byte(k.Magic)) {
		return nil, nil, k.Damaged("it is not a %s", k.Name)
	}
	if len(raw) < k.fixed()+sha256.Size {
		return nil, nil, k.Damaged("it is cut short")
	}
	if v := binary.LittleEndian.Uint32(raw[len(k.Magic):]); v > k.Version {
		return nil, nil, &NewerError{Version: v, Known: k.Version}
	} else if v == 0 {
		return nil, nil, k.Damaged("it has layout 0, which there never was")
	}
	body := raw[:len(raw)-sha256.Size]
	if sum := sha256.Sum256(body); !bytes.Equal(sum[:], raw[len(body):]) {
		return nil, nil, k.Damaged("it is cut short or altered: its checksum does not agree")
	}
	n := int64(binary.LittleEndian.Uint32(raw[len(k.Magic)+4:]))
	if n > int64(len(body)-k.fixed()) {
		return nil, nil, k.Damaged("its head is longer than the file")
	}
	if n > int64(k.HeadLimit) {
		return nil, nil, k.Damaged("its head is longer than %d MiB, which no head is", k.HeadLimit>>20)
	}
	body = body[k.fixed():]
	return body[:n], body[n:], nil
}

// Damaged words a *DamagedError as fmt.Sprintf does; its subject is the file.
func (k Kind) Damaged(format string, args ...any) error {
	return &DamagedError{What: fmt.Sprintf(format, args...), Advice: k.Advice}
}

// DamagedError says that a file is not a whole one of its kind. What says why; its subject is the file.
type DamagedError struct{ What, Advice string }

// Error returns What.
func (e *DamagedError) Error() string { return e.What }

// Hint says what to do about it.
func (e *DamagedError) Hint() string { return e.Advice }

// NewerError says that a file was written by a later version of the program.
type NewerError struct {
	Version uint32 // of the layout
	Known   uint32 // the newest that is read
}

// Error says which layout the file has and which are known.
func (e *NewerError) Error() string {
	return fmt.Sprintf("it has layout %d, and this program knows layouts up to %d", e.Version, e.Known)
}

// Hint says what to do about it.
func (e *NewerError) Hint() string {
	return "use the version of drumlin that wrote it, or a later one"
}

// Floats returns the numbers that data consists of; nil for none.
func Floats(data []byte) []float64 {
	if len(data) == 0 {
		return nil
	}
	v := make([]float64, len(data)/8)
	for i := range v {
		v[i] = math.Float64frombits(binary.LittleEndian.Uint64(data[8*i:]))
	}
	return v
}

// Ints returns the whole numbers that data consists of; nil for none.
func Ints(data []byte) []int32 {
	if len(data) == 0 {
		return nil
	}
	v := make([]int32, len(data)/4)
	for i := range v {
		v[i] = int32(binary.LittleEndian.Uint32(data[4*i:]))
	}
	return v
}
