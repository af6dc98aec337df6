package sealed_test

import (
	"bytes"
	"errors"
	"math"
	"slices"
	"strings"
	"testing"

	"drumlin/io/internal/sealed"
)

var kind = sealed.Kind{Magic: "of a test\n", Version: 3, Limit: 1 << 20, HeadLimit: 64, Name: "file of a test", Advice: "make it again"}

func TestRoundTrip(t *testing.T) {
	floats := [][]float64{{1.0 / 3, math.Inf(-1)}, nil, {math.Copysign(0, -1)}}
	ints := [][]int32{{-1, math.MaxInt32}, {7}}
	var b bytes.Buffer
	if err := kind.Write(&b, []byte(`{"a":1}`), floats, ints); err != nil {
		t.Fatal(err)
	}
	if size := kind.Size(7, 3, 3); size != int64(b.Len()) {
		t.Errorf("%d bytes were written, %d foretold", b.Len(), size)
	}
	head, arrays, err := kind.Read(bytes.NewReader(b.Bytes()))
	if err != nil || string(head) != `{"a":1}` {
		t.Fatalf("head %q, error %v", head, err)
	}
	if got := sealed.Floats(arrays[:24]); got[0] != 1.0/3 || !math.IsInf(got[1], -1) || !math.Signbit(got[2]) {
		t.Errorf("numbers %v", got)
	}
	if got := sealed.Ints(arrays[24:]); !slices.Equal(got, []int32{-1, math.MaxInt32, 7}) {
		t.Errorf("whole numbers %v", got)
	}
	if sealed.Floats(nil) != nil || sealed.Ints(nil) != nil {
		t.Error("none are not nil")
	}
}

// The frame alone: what lies within it is tested with the files themselves.
func TestRefusals(t *testing.T) {
	file := func(k sealed.Kind, head string) []byte {
		var b bytes.Buffer
		if err := k.Write(&b, []byte(head), nil, nil); err != nil {
			t.Fatal(err)
		}
		return b.Bytes()
	}
	other, zero, later, small := kind, kind, kind, kind
	other.Magic, zero.Version, later.Version, small.Limit = "of a rest\n", 0, 4, 20
	altered := file(kind, "{}")
	altered[20] ^= 1
	for _, c := range []struct {
		name, want string
		kind       sealed.Kind
		raw        []byte
	}{
		{"another kind", "it is not a file of a test", kind, file(other, "{}")},
		{"cut to the magic", "it is cut short", kind, []byte(kind.Magic)},
		{"layout 0", "it has layout 0, which there never was", kind, file(zero, "{}")},
		{"altered", "its checksum does not agree", kind, altered},
		{"a long head", "its head is longer than 0 MiB", kind, file(kind, strings.Repeat(" ", 65))},
		{"too large", "it is larger than 0 MiB, which no file of a test is", small, file(kind, "{}")},
	} {
		var damaged *sealed.DamagedError
		_, _, err := c.kind.Read(bytes.NewReader(c.raw))
		if !errors.As(err, &damaged) || !strings.Contains(err.Error(), c.want) || damaged.Hint() != "make it again" {
			t.Errorf("%s: %v, want %q", c.name, err, c.want)
		}
	}
	var newer *sealed.NewerError
	if _, _, err := kind.Read(bytes.NewReader(file(later, "{}"))); !errors.As(err, &newer) || newer.Error() != "it has layout 4, and this program knows layouts up to 3" {
		t.Errorf("a later layout: %v", err)
	}
}
