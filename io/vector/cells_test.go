package vector

import (
	"bytes"
	"math"
	"strings"
	"testing"

	"drumlin/grids"

	"github.com/google/go-cmp/cmp"
)

// Two lattices in one collection are their own collections, end to end. The expected text is put together from
// WriteCells, whose text is pinned in TestWriteCellsText.
func TestCellWriterTwoLattices(t *testing.T) {
	first := grids.Lattice{CRS: plate{10}, Cell: perDegree, NX: 2, NY: 1}
	second := grids.Lattice{CRS: plate{-170}, X0: 3 * perDegree, Cell: perDegree / 2, NX: 2, NY: 2}
	a := []Column{{Name: "region", Text: []string{"a", "a"}}, {Name: "estimate", Value: []float64{1, 2}}}
	b := []Column{{Name: "region", Text: []string{"b \"2\""}}, {Name: "estimate", Value: []float64{math.NaN()}}}
	alone := func(l grids.Lattice, index []int, columns []Column) string {
		var text bytes.Buffer
		if err := WriteCells(&text, l, index, columns); err != nil {
			t.Fatal(err)
		}
		return text.String()
	}
	want := strings.TrimSuffix(alone(first, []int{0, 1}, a), "\n]}\n") + ",\n" +
		strings.TrimPrefix(alone(second, []int{3}, b), "{\"type\":\"FeatureCollection\",\"features\":[\n")

	var text bytes.Buffer
	w := NewCellWriter(&text)
	if err := w.Append(first, []int{0, 1}, a); err != nil {
		t.Fatal(err)
	}
	if err := w.Append(first, []int{}, []Column{{Name: "region", Text: []string{}}, {Name: "estimate", Value: []float64{}}}); err != nil {
		t.Fatal(err)
	}
	if err := w.Append(second, []int{3}, b); err != nil {
		t.Fatal(err)
	}
	if err := w.Close(); err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(want, text.String()); diff != "" {
		t.Error(diff)
	}
	if got := readBack(t, text.Bytes()); len(got) != 3 || got[2].Properties["region"] != `b "2"` {
		t.Errorf("read back as %v", got)
	}
}

func TestCellWriterRefuses(t *testing.T) {
	globe, local := grids.Lattice{CRS: plate{10}, Cell: 1, NX: 1, NY: 1}, grids.Lattice{CRS: flat{}, Cell: 1, NX: 1, NY: 1}
	column := []Column{{Name: "v", Value: []float64{1}}}
	w := NewCellWriter(&bytes.Buffer{})
	if err := w.Append(globe, []int{0}, column); err != nil {
		t.Fatal(err)
	}
	if err := w.Append(local, []int{0}, column); err != errTwoGlobes {
		t.Errorf("a local plane after the globe: %v", err)
	}
	if err := w.Append(globe, []int{0}, append(column, column...)); err == nil || err.Error() != `two columns are called "v"` {
		t.Errorf("a name twice: %v", err)
	}
	if err := NewCellWriter(&bytes.Buffer{}).Close(); err == nil {
		t.Error("a collection without a lattice is no error")
	}
}
