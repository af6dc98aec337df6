package pipeline

import (
	"context"
	"errors"
	"io"
	"os"
	"path/filepath"
	"strings"
	"syscall"
	"testing"

	"github.com/google/go-cmp/cmp"
)

// entries lists what stands in a folder.
func entries(t *testing.T, dir string) []string {
	t.Helper()
	list, err := os.ReadDir(dir)
	if err != nil {
		t.Fatal(err)
	}
	names := []string{}
	for _, e := range list {
		names = append(names, e.Name())
	}
	return names
}

// only demands that nothing but the named files stands in a folder.
func only(t *testing.T, dir string, names ...string) {
	t.Helper()
	if diff := cmp.Diff(append([]string{}, names...), entries(t, dir)); diff != "" {
		t.Errorf("in the folder: %s", diff)
	}
}

// filled is a fill that writes the mark of a finished folder.
func filled(text string) func(string) error {
	return func(partial string) error {
		return os.WriteFile(filepath.Join(partial, "summary.json"), []byte(text), 0o644)
	}
}

func hintOf(err error) string {
	var hinted interface{ Hint() string }
	if errors.As(err, &hinted) {
		return hinted.Hint()
	}
	return ""
}

func TestFolderAppearsWhole(t *testing.T) {
	base := t.TempDir()
	dir := filepath.Join(base, "deep", "er", "out")
	err := Folder(t.Context(), dir, false, func(partial string) error {
		if _, err := os.Stat(dir); err == nil {
			t.Error("the folder is there before it is whole")
		}
		return filled("new")(partial)
	})
	if err != nil {
		t.Fatal(err)
	}
	only(t, filepath.Dir(dir), "out")
	only(t, dir, "summary.json")
}

func TestFolderFails(t *testing.T) {
	broken := errors.New("the ink is dry")
	for name, fill := range map[string]func(string) error{
		"fill":  func(string) error { return broken },
		"later": func(partial string) error { return errors.Join(filled("half")(partial), broken) },
		"writer": func(partial string) error {
			_, err := writeFile(context.Background(), partial, "surface.csv", func(w io.Writer) error {
				if _, err := io.WriteString(w, "x,y\n"); err != nil {
					return err
				}
				return broken
			})
			return err
		},
	} {
		base := t.TempDir()
		if err := Folder(t.Context(), filepath.Join(base, "a", "b", "out"), false, fill); !errors.Is(err, broken) {
			t.Errorf("%s: %v", name, err)
		}
		only(t, base)
	}
}

func TestFolderKeepsParentsInUse(t *testing.T) {
	base := t.TempDir()
	err := Folder(t.Context(), filepath.Join(base, "a", "out"), false, func(string) error {
		return errors.Join(os.WriteFile(filepath.Join(base, "a", "mine.txt"), nil, 0o644), errors.New("no"))
	})
	if err == nil {
		t.Fatal("no error")
	}
	only(t, filepath.Join(base, "a"), "mine.txt")
}

func TestFolderThatIsThere(t *testing.T) {
	for _, c := range []struct {
		name    string
		prepare func(dir string) error
		force   bool
		says    string // "" means it is replaced
	}{
		{"ours", func(dir string) error { return errors.Join(os.Mkdir(dir, 0o755), filled("old")(dir)) }, false, "exists already"},
		{"ours, force", func(dir string) error { return errors.Join(os.Mkdir(dir, 0o755), filled("old")(dir)) }, true, ""},
		{"empty", func(dir string) error { return os.Mkdir(dir, 0o755) }, false, "exists already"},
		{"empty, force", func(dir string) error { return os.Mkdir(dir, 0o755) }, true, ""},
		{"another's, force", func(dir string) error {
			return errors.Join(os.Mkdir(dir, 0o755), os.WriteFile(filepath.Join(dir, "thesis.doc"), nil, 0o644))
		}, true, "holds files that drumlin did not write"},
		{"a folder called like the mark, force", func(dir string) error { return os.MkdirAll(filepath.Join(dir, "summary.json"), 0o755) }, true, "holds files that drumlin did not write"},
		{"a file, force", func(dir string) error { return os.WriteFile(dir, nil, 0o644) }, true, "is not a folder"},
		{"a link, force", func(dir string) error { return os.Symlink(os.TempDir(), dir) }, true, "is not a folder"},
	} {
		base := t.TempDir()
		dir := filepath.Join(base, "out")
		if err := c.prepare(dir); err != nil {
			t.Fatal(err)
		}
		before := ""
		if info, err := os.Lstat(dir); err == nil && info.IsDir() {
			before = strings.Join(entries(t, dir), " ")
		}
		err := Folder(t.Context(), dir, c.force, filled("new"))
		only(t, base, "out")
		if c.says == "" {
			if raw, readErr := os.ReadFile(filepath.Join(dir, "summary.json")); err != nil || readErr != nil || string(raw) != "new" {
				t.Errorf("%s: %v, %q", c.name, errors.Join(err, readErr), raw)
			}
			continue
		}
		if err == nil || !strings.Contains(err.Error(), c.says) || hintOf(err) == "" {
			t.Errorf("%s: %v, hint %q", c.name, err, hintOf(err))
		}
		if before != "" && strings.Join(entries(t, dir), " ") != before {
			t.Errorf("%s: what was there is not there any more", c.name)
		}
	}
}

// TestFolderClearsLeftovers: what a killed process leaves is no hindrance.
func TestFolderClearsLeftovers(t *testing.T) {
	base := t.TempDir()
	dir := filepath.Join(base, "out")
	if err := errors.Join(os.Mkdir(dir+".partial", 0o755), os.WriteFile(filepath.Join(dir+".partial", "surface.csv"), []byte("half"), 0o644)); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(dir+".partial.lock", nil, 0o644); err != nil {
		t.Fatal(err)
	}
	if err := Folder(t.Context(), dir, false, filled("new")); err != nil {
		t.Fatal(err)
	}
	only(t, base, "out")
	only(t, dir, "summary.json")
}

func TestFolderTakesOneAtATime(t *testing.T) {
	base := t.TempDir()
	dir := filepath.Join(base, "out")
	err := Folder(t.Context(), dir, false, func(partial string) error {
		second := Folder(t.Context(), dir, false, filled("second"))
		if second == nil || !strings.Contains(second.Error(), "another drumlin is writing "+dir) || hintOf(second) == "" {
			t.Errorf("the second one: %v", second)
		}
		return filled("first")(partial)
	})
	if err != nil {
		t.Fatal(err)
	}
	only(t, base, "out")
	if raw, _ := os.ReadFile(filepath.Join(dir, "summary.json")); string(raw) != "first" {
		t.Errorf("the folder is that of the %s", raw)
	}
}

// stopAt cancels when a stage is reached.
type stopAt struct {
	left   int
	cancel context.CancelFunc
	last   string
}

func (s *stopAt) Stage(name string, _, _ int) {
	s.last = name
	if s.left--; s.left == 0 {
		s.cancel()
	}
}

// TestInterruptedAtEveryStage: wherever a run is told to end, it leaves nothing.
func TestInterruptedAtEveryStage(t *testing.T) {
	obs := write(t, "obs.csv", plain.table(1))
	zones := write(t, "zones.geojson", rectangles([]string{"all"}, [4]float64{0, 0, 1000, 800}))
	s := settings(t, obs, "response=n", "area=plot_ha", "threshold=5", "zones="+zones, "cells-across=10")
	stages := 0
	for {
		base := t.TempDir()
		ctx, cancel := context.WithCancel(t.Context())
		ev := &stopAt{left: stages + 1, cancel: cancel}
		_, err := Run(ctx, s, filepath.Join(base, "a", "out"), ev)
		cancel()
		if err == nil && ev.left > 0 {
			break // it was over before
		}
		if !errors.Is(err, context.Canceled) {
			t.Errorf("stopped while %s: %v", ev.last, err)
		}
		only(t, base)
		stages++
	}
	if stages < 12 {
		t.Errorf("only %d stages were told", stages)
	}
}

// TestStoppableFile: a large file is given up in its middle.
func TestStoppableFile(t *testing.T) {
	ctx, cancel := context.WithCancel(t.Context())
	dir := t.TempDir()
	writes := 0
	_, err := writeFile(ctx, dir, "surface.csv", func(w io.Writer) error {
		for range 1000 {
			writes++
			if _, err := w.Write(make([]byte, 10)); err != nil {
				return err
			}
			if writes == 3 {
				cancel()
			}
		}
		return nil
	})
	if !errors.Is(err, context.Canceled) || writes != 4 {
		t.Errorf("%d writes, %v", writes, err)
	}
	if _, _, err := readTable(ctx, write(t, "obs.csv", plain.table(1)), placesRequest(false)); !errors.Is(err, context.Canceled) {
		t.Errorf("reading went on: %v", err)
	}
}

func TestPlainWords(t *testing.T) {
	for cause, want := range map[error]string{
		syscall.ENOSPC:  "there is no room left",
		syscall.EDQUOT:  "there is no room left",
		syscall.EFBIG:   "there is no room left",
		syscall.EROFS:   "can only be read",
		syscall.EACCES:  "no right to write",
		syscall.ENOENT:  "no such folder",
		syscall.ENOTDIR: "is a file, not a folder",
	} {
		err := Plainly(&os.PathError{Op: "write", Path: "/secret/out.partial/map.png", Err: cause}, "map.png")
		if !strings.HasPrefix(err.Error(), "map.png: ") || !strings.Contains(err.Error(), want) || strings.Contains(err.Error(), "partial") || hintOf(err) == "" {
			t.Errorf("%v: %v, hint %q", cause, err, hintOf(err))
		}
	}
}

// TestReuseLeavesNothing: the table is written whole or not at all.
func TestReuseLeavesNothing(t *testing.T) {
	base := t.TempDir()
	for name, content := range map[string]func(io.Writer) error{
		"error": func(w io.Writer) error { _, _ = io.WriteString(w, "half"); return errors.New("no") },
		"full":  func(w io.Writer) error { _, _ = io.WriteString(w, "half"); return syscall.ENOSPC },
	} {
		if err := ReplaceFile(t.Context(), filepath.Join(base, "a", "out.csv"), content); err == nil {
			t.Errorf("%s: no error", name)
		}
		only(t, base)
	}
	path := filepath.Join(base, "out.csv")
	if err := os.WriteFile(path, []byte("old"), 0o644); err != nil {
		t.Fatal(err)
	}
	if err := os.WriteFile(path+".partial", []byte("left over"), 0o644); err != nil {
		t.Fatal(err)
	}
	err := ReplaceFile(t.Context(), path, func(w io.Writer) error {
		if again := ReplaceFile(t.Context(), path, func(io.Writer) error { return nil }); again == nil {
			t.Error("two at a time")
		}
		_, err := io.WriteString(w, "new")
		return err
	})
	if raw, _ := os.ReadFile(path); err != nil || string(raw) != "new" {
		t.Errorf("%v, %q", err, raw)
	}
	only(t, base, "out.csv")
}

// TestFolderUndoesAReplacementCutShort: a kill between the two renames of a replacement leaves the old folder beside its
// place; the next run finds it there again, refuses without force, and replaces it with force.
func TestFolderUndoesAReplacementCutShort(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	write := func(text string) func(string) error {
		return func(partial string) error {
			return os.WriteFile(filepath.Join(partial, "summary.json"), []byte(text), 0o644)
		}
	}
	if err := Folder(context.Background(), dir, false, write("old")); err != nil {
		t.Fatal(err)
	}
	if err := os.Rename(dir, dir+replacedSuffix); err != nil {
		t.Fatal(err)
	}
	if err := Folder(context.Background(), dir, false, write("new")); err == nil {
		t.Error("the old folder was replaced without force")
	}
	if got, err := os.ReadFile(filepath.Join(dir, "summary.json")); err != nil || string(got) != "old" {
		t.Errorf("the old folder holds %q, %v", got, err)
	}
	if err := os.Rename(dir, dir+replacedSuffix); err != nil {
		t.Fatal(err)
	}
	if err := Folder(context.Background(), dir, true, write("new")); err != nil {
		t.Fatal(err)
	}
	if got, err := os.ReadFile(filepath.Join(dir, "summary.json")); err != nil || string(got) != "new" {
		t.Errorf("the new folder holds %q, %v", got, err)
	}
	if _, err := os.Stat(dir + replacedSuffix); !os.IsNotExist(err) {
		t.Errorf("the old folder is still beside the new one: %v", err)
	}
}

// TestClearUp: what a killed run left beside its finished folder goes, and the folder stays.
func TestClearUp(t *testing.T) {
	dir := filepath.Join(t.TempDir(), "out")
	for _, name := range []string{dir, dir + ".partial", dir + ".replaced"} {
		if err := os.Mkdir(name, 0o755); err != nil {
			t.Fatal(err)
		}
		if err := os.WriteFile(filepath.Join(name, "summary.json"), nil, 0o644); err != nil {
			t.Fatal(err)
		}
	}
	if err := os.WriteFile(dir+".partial.lock", nil, 0o644); err != nil {
		t.Fatal(err)
	}
	for range 2 { // the second time there is nothing to do
		if err := ClearUp(dir); err != nil {
			t.Fatal(err)
		}
	}
	left, _ := filepath.Glob(dir + "*")
	if len(left) != 1 || left[0] != dir {
		t.Errorf("left are %v", left)
	}
	release, err := lock(dir + ".partial.lock")
	if err != nil {
		t.Fatal(err)
	}
	defer release()
	if err := ClearUp(dir); err == nil {
		t.Error("it was cleared up while another run writes it")
	}
}
