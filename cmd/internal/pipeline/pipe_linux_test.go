package pipeline

import (
	"os"
	"path/filepath"
	"syscall"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// piped is a pipe through which a text comes once.
func piped(t *testing.T, text string) string {
	path := filepath.Join(t.TempDir(), "pipe.csv")
	if err := syscall.Mkfifo(path, 0o600); err != nil {
		t.Skip("no pipes here: ", err)
	}
	go func() {
		if f, err := os.OpenFile(path, os.O_WRONLY, 0); err == nil {
			f.WriteString(text)
			f.Close()
		}
	}()
	return path
}

// TestPipesAreReadOnce: observations and places of one's own may come through a pipe, which has nothing left for a second look.
func TestPipesAreReadOnce(t *testing.T) {
	table, at := plain.table(3), "x,y\n100,200\n500,400\n"
	words := []string{"response=zinc", "write=csv", "max-knots=12"}
	want := readSheet(t, filepath.Join(mapped(t, write(t, "pipe.csv", table), append(words, "at="+write(t, "at.csv", at))...), "surface.csv"))
	got := readSheet(t, filepath.Join(mapped(t, piped(t, table), append(words, "at="+piped(t, at))...), "surface.csv"))
	if diff := cmp.Diff(want.rows, got.rows); diff != "" {
		t.Error(diff)
	}
}
