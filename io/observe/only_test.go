package observe

import (
	"strings"
	"testing"

	"github.com/google/go-cmp/cmp"
)

func fourRows(t *testing.T) *Table {
	t.Helper()
	table, err := Read(strings.NewReader("x,y,n,place\n1,5,3,a\n2,6,4,b\n3,7,5,a\n4,8,-1,b\n5,9,7,a\n"), "t.csv", Request{Response: "n", Kind: Count, Keep: []string{"place"}})
	if err != nil {
		t.Fatal(err)
	}
	return table
}

// TestTableOnly: rows of another value are gone as if they had never been, those set aside before stay.
func TestTableOnly(t *testing.T) {
	table := fourRows(t)
	table.Only("place", "a")
	x, _ := table.XY()
	if diff := cmp.Diff([]float64{1, 3, 5}, x); diff != "" || table.Column("n").Number[2] != 7 || len(table.Column("place").Level) != 1 || len(table.Aside) != 1 {
		t.Errorf("%s %+v", diff, table)
	}
	table.Only("place", "nowhere")
	if table.Len() != 0 || len(table.Geometry) != 0 {
		t.Errorf("%d rows are left", table.Len())
	}
}

// TestSetAside: rows go among those that were set aside, in the order of the file.
func TestSetAside(t *testing.T) {
	table := fourRows(t)
	table.SetAside([]int{3, 1}, "height", "missing-layer", "the layer has no value there")
	x, _ := table.XY()
	var rows []int32
	for _, a := range table.Aside {
		rows = append(rows, a.Row)
	}
	if diff := cmp.Diff([]float64{1, 3}, x) + cmp.Diff([]int32{2, 4, 5}, rows); diff != "" || table.Aside[0].Reason != "the layer has no value there" {
		t.Errorf("%s %+v", diff, table.Aside)
	}
}
