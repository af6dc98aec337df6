package geotiff_test

import (
	"bytes"
	"context"
	"io"
	"testing"

	"drumlin/io/geotiff"
)

func BenchmarkWrite(b *testing.B) {
	g := grid(4000, 4000, "estimate")
	v := surface(0, 4000, 4000)
	for _, workers := range []int{1, 2} {
		b.Run("cells=4000x4000/workers="+string(rune('0'+workers)), func(b *testing.B) {
			b.SetBytes(int64(4 * len(v)))
			b.ReportAllocs()
			for b.Loop() {
				err := geotiff.Write(context.Background(), io.Discard, g, func(_, y int, dst []float32) error {
					copy(dst, v[y*4000:])
					return nil
				}, workers)
				if err != nil {
					b.Fatal(err)
				}
			}
		})
	}
}

func BenchmarkRead(b *testing.B) {
	file, _ := encode(b, grid(4000, 4000, "estimate"), 0)
	b.Logf("%d bytes", len(file))
	dst := make([]float64, 4000*100)
	b.Run("cells=4000x4000", func(b *testing.B) {
		b.SetBytes(4 * 4000 * 4000)
		b.ReportAllocs()
		for b.Loop() {
			r, err := geotiff.Open(bytes.NewReader(file), int64(len(file)), "made.tif")
			if err != nil {
				b.Fatal(err)
			}
			for y := 0; y < 4000; y += 100 {
				if err := r.Window(dst, 0, 0, y, 4000, 100); err != nil {
					b.Fatal(err)
				}
			}
		}
	})
}
