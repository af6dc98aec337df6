package observe

import (
	"fmt"
	"math"
	"strings"
	"testing"
)

// largeTable writes n rows of about 50 bytes in 500 districts. Rows of a district are scattered over the whole table.
func largeTable(n int, quote string) string {
	var text strings.Builder
	text.WriteString("district,x,y,z,d\n")
	for i := range n {
		fmt.Fprintf(&text, "%sdistrict %03d%s,%.2f,%.2f,%.4f,%.3f\n", quote, i%500, quote,
			180000+float64(i%1000)/7, 330000+float64(i/1000)/7, math.Sqrt(float64(i)), float64(i)/3)
	}
	return text.String()
}

// BenchmarkSplit reads a table of a million rows into memory and splits it, with and without quotes in every row.
func BenchmarkSplit(b *testing.B) {
	for _, quote := range []string{"", `"`} {
		for _, n := range []int{10_000, 1_000_000} {
			b.Run(fmt.Sprintf("quoted=%v/n=%d", quote != "", n), func(b *testing.B) {
				text := largeTable(n, quote)
				b.SetBytes(int64(len(text)))
				b.ReportAllocs()
				for b.Loop() {
					shared, err := Whole(strings.NewReader(text), "all.csv")
					if err != nil {
						b.Fatal(err)
					}
					if parts, _, err := shared.Split("district"); err != nil || len(parts) != 500 {
						b.Fatal(len(parts), err)
					}
				}
			})
		}
	}
}

// BenchmarkReadPart reads one district of 500 out of tables of different sizes: the time is that of its own rows.
func BenchmarkReadPart(b *testing.B) {
	want := Request{Response: "z", Kind: Measure, Linear: []string{"d"}}
	for _, n := range []int{10_000, 1_000_000} {
		b.Run(fmt.Sprintf("rows=%d/n=%d", n/500, n), func(b *testing.B) {
			shared, err := Whole(strings.NewReader(largeTable(n, "")), "all.csv")
			if err != nil {
				b.Fatal(err)
			}
			parts, _, err := shared.Split("district")
			if err != nil {
				b.Fatal(err)
			}
			b.SetBytes(int64(parts[7].Bytes))
			b.ReportAllocs()
			for b.Loop() {
				if _, err := ReadPart(parts[7], want); err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}
