package observe

import (
	"math"
	"runtime"
	"runtime/debug"
	"runtime/metrics"
	"slices"
	"strings"
	"testing"
	"time"
)

// mostHeld returns the most bytes on the heap while f runs, beyond those before. Garbage counts until it is collected,
// which is every few megabytes: the ballast keeps the collector from running all the time.
func mostHeld(f func()) float64 {
	defer debug.SetGCPercent(debug.SetGCPercent(10))
	ballast := make([]byte, 16<<20)
	defer runtime.KeepAlive(ballast)
	runtime.GC()
	before, done := heap(), make(chan struct{})
	most := make(chan float64)
	go func() {
		peak := before
		for {
			select {
			case <-done:
				most <- max(peak, heap())
				return
			default:
				peak = max(peak, heap())
				time.Sleep(50 * time.Microsecond)
			}
		}
	}()
	f()
	close(done)
	return <-most - before
}

// heap returns the bytes of objects on the heap that are in use or not yet collected.
func heap() float64 {
	sample := []metrics.Sample{{Name: "/memory/classes/heap/objects:bytes"}}
	metrics.Read(sample)
	return float64(sample[0].Value.Uint64())
}

// No file of a megabyte takes more than 64 times its size, however it is made up.
func TestAllocationIsBounded(t *testing.T) {
	const size = 1 << 20
	fill := func(start, with string) string { return start + strings.Repeat(with, (size-len(start))/len(with)) }
	table := func(start, with string) string { return fill(start, with)[:size/2] }
	var names strings.Builder
	for i := 0; names.Len() < size; i++ {
		names.WriteString("\u00e9" + string(rune('a'+i%26)) + string(rune('a'+i/26%26)) + string(rune('a'+i/676%26)) + string(rune('a'+i/17576)) + ",")
	}
	files := map[string]string{
		"commas": fill("", ","), "commas below a header": fill("x,y,z\n", ","), "quotes": fill("", `"`),
		"quotes below a header": fill("x,y,z\n1,2,", `"`), "quoted quotes": fill("x,y,z\n1,2,\"", `""`),
		"newlines": fill("", "\n"), "newlines below a header": fill("x,y,z\n1,2,3\n", "\n"), "returns": fill("", "\r"),
		"one line of digits": fill("", "7"), "one line of names": fill("", "name "), "names": names.String(),
		"one value": fill("x,y,z\n1,2,", "3"), "groups": fill("x;y;z\n1;2;1", ",000"), "groups of points": fill("x;y;z\n1;2;1", ".000"),
		"short rows":     table("x,y,z\n", "1,2,3\n"),
		"rows set aside": table("x,y,z\n", "1,2,\n"),
		"one column":     table("x\n", "1\n"),
		"levels":         table("x,y,z,k\n", "1,2,3,a\n1,2,3,b\n"), "decimal commas": table("x;y;z\n", "1;2;3,5\n"), "below a limit": table("x,y,z\n", "1,2,<3\n"),
		"windows letters": table("x,y,z\n", "1,2,\xe9\n"), "windows header": fill("", "\x80,"), "utf-16": fill("\xff\xfe", ",\x00"), "utf-16 units": fill("\xff\xfe", "\xff\xff"),
		"tabs": fill("x\ty\tz\n", "\t"), "zeros": fill("x,y,z\n", "\x00"),
	}
	limits := Format{DecimalComma: true, BelowLimit: HalfLimit, Missing: []string{"-9"}}
	formats := map[string]Format{"groups": limits, "groups of points": limits, "below a limit": {BelowLimit: AsideLimit}, "tabs": {Separator: '\t'}}
	for name, text := range files {
		want := Request{Response: "z", Kind: Measure, Format: formats[name]}
		for way, read := range map[string]func(){
			"Read": func() { _, _ = Read(strings.NewReader(text), "wells.csv", want) },
			"ReadPart": func() {
				if shared, err := WholeAs(strings.NewReader(text), "wells.csv", want.Format); err == nil {
					_, _ = ReadPart(shared.All(), want)
				}
			},
		} {
			checkHeld(t, name+", "+way, len(text), read)
		}
	}
}

// checkHeld demands that reading a text takes 64 times its size at most.
func checkHeld(t *testing.T, name string, size int, read func()) {
	t.Helper()
	times := math.Inf(1)
	for range 3 { // a machine under load is late to collect garbage
		if times > 64 {
			times = min(times, mostHeld(read)/float64(size))
		}
	}
	if t.Logf("%s: %.0f times the size of the text", name, times); times > 64 {
		t.Errorf("%s: %.0f times the size of the text", name, times)
	}
}

// A table of plain numbers takes twice the memory of what is kept of it at most, while it is read.
func TestReadingTakesTwiceTheNumbers(t *testing.T) {
	const rows = 300_000
	text := "x,y,z,d,e\n" + strings.Repeat("180012.25,330071.5,17.125,3.0625,1000.5\n", rows)
	want := Request{Response: "z", Kind: Measure, Linear: []string{"d", "e"}}
	const kept = rows * (3*8 + 2*4 + 2*16) // three columns, line and row, and a place behind an interface
	times := math.Inf(1)
	for range 3 { // a machine under load is late to collect garbage
		if times > 2 {
			times = min(times, mostHeld(func() {
				if table, err := read(text, want); err != nil || table.Len() != rows {
					t.Fatal(err)
				}
			})/kept)
		}
	}
	if t.Logf("%.2f times", times); times > 2 {
		t.Errorf("reading takes %.2f times the memory of what is kept", times)
	}
}

// A pile gives back what was put into it.
func TestPile(t *testing.T) {
	for _, n := range []int{0, 1, 16, 17, largestPiece, 3*largestPiece + 5} {
		var p pile[int]
		var want []int
		for i := range n {
			p.add(i)
			want = append(want, i)
		}
		if got := p.join(); !slices.Equal(got, want) || (got == nil) != (n == 0) || p.join() != nil {
			t.Errorf("%d values come back as %d", n, len(got))
		}
	}
}
