package observe

import (
	"errors"
	"fmt"
	"io"
	"strings"
	"testing"
	"testing/iotest"
	"unsafe"

	"github.com/google/go-cmp/cmp"
)

// plainRead is what a table holds by the CSV reader alone, from the first byte to the last: the independent route
// that Whole and Split are checked against.
type plainRead struct {
	names  []string
	lines  []int
	fields [][]string
	err    error
}

func readPlainly(r io.Reader) (p plainRead) {
	decoded, from, err := openOrigin(r, "wells.csv", Format{})
	if err != nil {
		return plainRead{err: err}
	}
	in, err := openText(decoded, from)
	if err != nil {
		return plainRead{err: err}
	}
	h, err := readHeader(in, "wells.csv")
	if err != nil {
		return plainRead{err: err}
	}
	p.names = h.names
	for {
		record, err := in.Read()
		switch {
		case err == io.EOF && len(p.lines) == 0:
			return plainRead{err: h.noRows()}
		case err == io.EOF:
			return p
		case err != nil:
			return plainRead{err: readError("wells.csv", err)}
		}
		if all := strings.TrimSpace(strings.Join(record, " ")); all == "" || all == "\x1a" && len(record) == 1 {
			continue
		}
		line, _ := in.FieldPos(0)
		here := Error{File: "wells.csv", Line: line, Row: len(p.lines) + 1}
		if err := h.checkRecord(record, here); err != nil {
			return plainRead{err: err}
		}
		var trimmed []string
		for _, s := range record {
			trimmed = append(trimmed, strings.Clone(strings.TrimSpace(s)))
		}
		p.lines, p.fields = append(p.lines, line), append(p.fields, trimmed)
	}
}

func message(err error) string {
	if err == nil {
		return "none"
	}
	return err.Error() + "\nhint: " + hint(err)
}

// checkWhole holds Whole and what it found to the CSV reader.
func checkWhole(t *testing.T, text string) *Shared {
	t.Helper()
	shared, err := Whole(strings.NewReader(text), "wells.csv")
	checkAgainst(t, shared, err, readPlainly(strings.NewReader(text)))
	return shared
}

func checkAgainst(t *testing.T, shared *Shared, err error, want plainRead) {
	t.Helper()
	if diff := cmp.Diff(message(want.err), message(err)); diff != "" {
		t.Fatalf("error (-want +got):\n%s", diff)
	}
	if (shared == nil) != (err != nil) {
		t.Fatalf("table %v with error %v", shared, err)
	}
	if err != nil {
		return
	}
	var got plainRead
	got.names = shared.Columns()
	p := newParser(shared.header.origin.separator)
	for i := range shared.rows {
		text, line := shared.text.(*heldCSV).row(i)
		var fields []string
		for k := range got.names {
			field, err := p.field(text, k)
			if err != nil {
				t.Fatal(err)
			}
			fields = append(fields, string(field))
		}
		got.lines, got.fields = append(got.lines, line), append(got.fields, fields)
	}
	if diff := cmp.Diff(want, got, cmp.AllowUnexported(plainRead{})); diff != "" {
		t.Fatalf("rows (-want +got):\n%s", diff)
	}
}

// Files with every oddity that a record can have; the expected rows are those of the CSV reader.
func TestWholeFindsTheRows(t *testing.T) {
	tests := []struct{ name, text string }{
		{"plain", "x,y\n1,2\n3,4\n"},
		{"no final line end", "x,y\n1,2\n3,4"},
		{"carriage return at the end", "x,y\n1,2\n3,4\r"},
		{"nothing but a carriage return on the last line", "x,y\n1,2\n\r"},
		{"windows line ends", "x,y\r\n1,2\r\n\r\n3,4\r\n"},
		{"mixed line ends", "x,y\n1,2\r\n3,4\n5,6\r\n"},
		{"two carriage returns", "x,y\n1,2\r\r\n3,4\n"},
		{"two carriage returns in one column", "x\n1\n\r\r\n2\n"},
		{"mark", "\xef\xbb\xbfx,y\n1,2\n"},
		{"blank lines above, between and below", "\n\r\nx,y\n\n1,2\n\n\r\n3,4\n\n\n"},
		{"a line of blanks in one column", "x\n1\n  \n2\n"},
		{"empty rows", " , \nx,y\n,\n1,2\n\" \",\n,,,\n\u2003,\u0085\n3,\n\x1a\n"},
		{"a separator is told", "\nsep=;\nx;y\n1;2\n"},
		{"a line of blanks at the end", "x\n1\n  "},
		{"quotes", "x,y\n\"1\",2\n3,\"4\"\n\"5\", \"6\"\n"},
		{"quoted header", "\"x\n1\",\"y\"\n1,2\n3,4\n"},
		{"quoted commas", "x,y,z\n\"1,1\",\",\",2\n"},
		{"quoted quotes", "x,y\n\"a \"\"b\"\"\",2\n\"\"\"\",3\n\"\",4\n"},
		{"quoted line ends", "x,y\n\"a\nb\",2\n\"a\r\n\r\nb\",3\n4,\"\n\"\n5,6\n"},
		{"quoted line end last", "x,y\n1,2\n3,\"a\nb\""},
		{"a quoted field is all there is", "x\n\"\"\n\"\"\n"},
		{"spaces that are not blanks", "x,y\n\u00a0north\u2003,\u0085\n \t\"a\",\u3000\"b\"\n"},
		{"letters beyond ASCII", "höhe,città\n1,Übersee\n2,\"Łódź\"\n"},
		{"a long row", "x,y\n1,2\n3,\"" + strings.Repeat("a\n", 500_000) + "\"\n5,6\n"},
		{"a long header", "x," + strings.Repeat("y", 200_000) + "\n1,2\n"},
	}
	for _, test := range tests {
		t.Run(test.name, func(t *testing.T) { checkWhole(t, test.text) })
	}
}

// The end of a block may fall on any byte of a record.
func TestWholeAtTheEndOfABlock(t *testing.T) {
	const start, tricky = "x,y\n1,", "\"a\r\nb\",\"c \"\"d\"\"\"\r\n\r\n 5,\"\n\n\"\n7,8\r\n"
	for before := range len(tricky) + 2 {
		blanks := strings.Repeat(" ", headSize-before-len(start)-len("2\n"))
		text := start + blanks + "2\n" + tricky + "9,10\n"
		if at := strings.Index(text, tricky); at != headSize-before {
			t.Fatalf("the record stands at %d, want %d", at, headSize-before)
		}
		shared := checkWhole(t, text)
		if len(shared.text.(*heldCSV).blocks) != 2 || shared.rows != 5 {
			t.Errorf("%d before the end: %d blocks, %d rows", before, len(shared.text.(*heldCSV).blocks), shared.rows)
		}
		for _, wrong := range []string{"\"", "1\n", "1,\x00", "1,\"2\" 3\n"} { // errors in the second block
			checkWhole(t, text+wrong)
		}
	}
}

// A reader that fails is reported as Read reports it, wherever it stops, and the rows do not depend on how the
// bytes arrive.
func TestWholeReader(t *testing.T) {
	const text = "\xef\xbb\xbf\"x\",y\r\n1,2\n\r\n\"a\nb\", \"c \"\"d\"\"\"\n5,6\r\n"
	broken := errors.New("the disk went away")
	for cut := range len(text) + 1 {
		failing := func() io.Reader { return io.MultiReader(strings.NewReader(text[:cut]), iotest.ErrReader(broken)) }
		shared, err := Whole(failing(), "wells.csv")
		if err == nil {
			t.Fatalf("cut at %d: no error", cut)
		}
		checkAgainst(t, shared, err, readPlainly(failing()))
		checkWhole(t, text[:cut])
	}
	want := readPlainly(strings.NewReader(text))
	for name, r := range map[string]io.Reader{
		"one byte": iotest.OneByteReader(strings.NewReader(text)), "half": iotest.HalfReader(strings.NewReader(text)),
		"error with the data": iotest.DataErrReader(strings.NewReader(text)),
	} {
		shared, err := Whole(r, "wells.csv")
		if err != nil {
			t.Fatalf("%s: %v", name, err)
		}
		checkAgainst(t, shared, err, want)
	}
}

// A row costs 12 bytes beside its text, and a block is no larger than it needs to be.
func TestSharedIsSmall(t *testing.T) {
	if size := unsafe.Sizeof(span{}); size != 12 {
		t.Errorf("a row takes %d bytes", size)
	}
	text := largeTable(200_000, "")
	shared, err := Whole(strings.NewReader(text), "all.csv")
	if err != nil {
		t.Fatal(err)
	}
	held, rows := 0, 0
	for i, b := range shared.text.(*heldCSV).blocks {
		held += cap(b.text)
		rows += len(b.spans)
		if cap(b.text) > largestBlock || cap(b.spans) > len(b.spans)+len(b.spans)/8+8 {
			t.Errorf("block %d takes %d bytes, and has room for %d rows where it holds %d", i, cap(b.text), cap(b.spans), len(b.spans))
		}
	}
	const page = 8192 // large allocations are rounded up to whole pages
	if rows != 200_000 || held > len(text)+page {
		t.Errorf("%d rows in %d bytes, the file has %d", rows, held, len(text))
	}
}

// FuzzWhole holds Whole and Split to the CSV reader, and ReadPart of everything to Read.
func FuzzWhole(f *testing.F) {
	f.Add("x,y,n,soil\n1,2,3,clay\n5,6,NA,loam\n9,9,1,\n", uint8(3))
	f.Add("\xef\xbb\xbfLon,Lat,n,soil\r\n1,2,3,\"a \"\"b\"\"\"\r\n\r\n4,97,6,\" a\r\n\"", uint8(3))
	f.Add("x,y\n1,\"2\n3,4\n", uint8(0))
	f.Add("x\n\r\r\n\" \"\r", uint8(0))
	f.Add("x,y\n1,2\"\n", uint8(1))
	f.Add("x;y\n1;2\n", uint8(1))
	f.Fuzz(func(t *testing.T, text string, column uint8) {
		skipFeatures(t, text)
		shared := checkWhole(t, text)
		if shared == nil {
			return
		}
		checkSplit(t, shared, int(column)%len(shared.header.names), readPlainly(strings.NewReader(text)))
		want := Request{Response: "n", Kind: Count, Category: []string{"soil"}, Keep: []string{"x"}}
		for _, want := range []Request{want, {}} {
			table, err := Read(strings.NewReader(text), "wells.csv", want)
			part, partErr := ReadPart(shared.All(), want)
			if diff := cmp.Diff(message(err), message(partErr)); diff != "" {
				t.Fatalf("error (-Read +ReadPart):\n%s", diff)
			}
			if diff := cmp.Diff(table, part); diff != "" {
				t.Fatalf("table (-Read +ReadPart):\n%s", diff)
			}
		}
	})
}

// checkSplit compares a split by one column with a literal one.
func checkSplit(t *testing.T, shared *Shared, column int, plain plainRead) {
	t.Helper()
	name := plain.names[column]
	parts, unnamed, err := shared.Split(name)
	if name == "" {
		if err == nil {
			t.Fatal("split by a column without a name")
		}
		return
	}
	if err != nil {
		t.Fatal(err)
	}
	var names []string
	rows := map[string][]int32{}
	var first Unnamed
	for i, fields := range plain.fields {
		value := fields[column]
		if missing(value) {
			if first.Rows++; first.Rows == 1 {
				first = Unnamed{Rows: 1, Line: int32(plain.lines[i]), Row: int32(i + 1), Value: value}
			}
			continue
		}
		if rows[value] == nil {
			names = append(names, value)
		}
		rows[value] = append(rows[value], int32(i))
	}
	if diff := cmp.Diff(first, unnamed); diff != "" {
		t.Fatalf("without a name (-want +got):\n%s", diff)
	}
	if len(parts) != len(names) {
		t.Fatalf("%d parts, want %q", len(parts), names)
	}
	bytes := 0
	for i, p := range parts {
		if p.Name != names[i] || p.Rows != len(p.rows) {
			t.Fatalf("part %d is %q of %d rows, want %q", i, p.Name, p.Rows, names[i])
		}
		if diff := cmp.Diff(rows[p.Name], p.rows); diff != "" {
			t.Fatalf("rows of %q (-want +got):\n%s", p.Name, diff)
		}
		bytes += p.Bytes
	}
	if all := shared.All(); bytes > all.Bytes || unnamed.Rows == 0 && bytes != all.Bytes {
		t.Fatalf("parts of %d bytes in all, the whole has %d", bytes, all.Bytes)
	}
}

func ExampleShared_Split() {
	plots := "district,x,y,stems\nNorth,120,40,31\nSouth,180,40,12\nNorth,150,90,\nNorth,160,95,17\n"
	shared, err := Whole(strings.NewReader(plots), "plots.csv")
	if err != nil {
		fmt.Println(err)
		return
	}
	districts, _, err := shared.Split("district")
	if err != nil {
		fmt.Println(err)
		return
	}
	for _, district := range districts {
		table, err := ReadPart(district, Request{Response: "stems", Kind: Count})
		if err != nil {
			fmt.Println(err)
			return
		}
		fmt.Println(district.Name, table.Column("stems").Number, "on lines", table.Line)
		for _, a := range table.Aside {
			fmt.Printf("line %d: %s\n", a.Line, a.Reason)
		}
	}
	// Output:
	// North [31 17] on lines [2 5]
	// line 4: response is missing
	// South [12] on lines [3]
}
