package pipeline

import (
	"context"
	"errors"
	"io"
	"io/fs"
	"maps"
	"os"
	"path/filepath"
	"slices"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/archive"
	"drumlin/io/tables"
	"drumlin/spatial"
)

// ReuseRequest asks a saved surface for its estimates at new places.
type ReuseRequest struct {
	Saved, At, Out string // paths
	X, Y           string // columns of At with the coordinates; empty to find them by their names
	Force          bool   // replace Out
	Workers        int
}

// Reuse writes the columns of surface.csv for the places of a file, in its order. Out appears whole or not at all.
func Reuse(ctx context.Context, q ReuseRequest, ev Events) error {
	switch info, err := os.Lstat(q.Out); {
	case err == nil && info.IsDir():
		return refuse("name a file in it", "%s: that is a folder", q.Out)
	case err == nil && !q.Force:
		return refuse("name another file, or add --force to replace it", "%s exists already", q.Out)
	case err != nil && !errors.Is(err, fs.ErrNotExist):
		return Plainly(err, q.Out)
	}
	ev.Stage("reading", 0, 0)
	saved, surface, err := readSaved(ctx, q.Saved, q.Workers)
	if err != nil {
		return err
	}
	system, err := crs.Parse(saved.Reporting.CRS)
	if err != nil {
		return refuse("", "%s: %w", q.Saved, err)
	}
	at, z, err := readPlaces(ctx, q, saved, system)
	if err != nil {
		return err
	}
	ev.Stage("predicting", 0, 0)
	e, err := estimate(ctx, surface, saved.Reporting, at, z)
	if err != nil {
		return err
	}
	e.nearest = grids.Nearest(saved.PlaceX, saved.PlaceY, at.X, at.Y)
	ev.Stage("writing", 0, 0)
	return ReplaceFile(ctx, q.Out, func(w io.Writer) error {
		return tables.Write(w, at.Len(), surfaceTable(system, at, e))
	})
}

func readSaved(ctx context.Context, path string, workers int) (archive.Saved, *spatial.Surface, error) {
	f, err := openFile(path)
	if err != nil {
		return archive.Saved{}, nil, err
	}
	defer f.Close()
	if info, err := f.Stat(); err == nil && info.Size() > archive.Limit { // before it is read into memory
		return archive.Saved{}, nil, refuse("name the file saved.surface that drumlin map wrote",
			"%s: it is larger than %d MiB, which no saved surface is", path, archive.Limit>>20)
	}
	saved, err := archive.Read(&stoppable{ctx: ctx, from: f})
	if err != nil {
		return archive.Saved{}, nil, refuse("", "%s: %w", path, err)
	}
	surface, err := spatial.Restore(saved.Surface, workers)
	if err != nil {
		return archive.Saved{}, nil, refuse("write the surface again with drumlin map", "%s: its parts do not belong together: %w", path, err)
	}
	return saved, surface, nil
}

// readPlaces reads the places and the covariates that the surface needs.
func readPlaces(ctx context.Context, q ReuseRequest, saved archive.Saved, system crs.System) (spatial.Places, []spatial.Covariate, error) {
	want := placesRequest(saved.Reporting.Degrees)
	want.X, want.Y = q.X, q.Y
	levels := map[string][]string{} // of the categories
	if per := saved.Surface.Model.SurfacePer; per != "" {
		levels[per] = saved.Surface.Level
	}
	for _, e := range saved.Surface.Effect {
		switch e.Role {
		case spatial.Category:
			levels[e.Name] = e.Level
		case spatial.Group:
			want.Optional = append(want.Optional, e.Name)
		default:
			want.Linear = append(want.Linear, e.Name)
		}
	}
	want.Category = slices.Sorted(maps.Keys(levels))
	t, err := readPlaceTable(ctx, q.At, want, system)
	if err != nil {
		return spatial.Places{}, nil, err
	}
	x, y, err := planeOf(t, system)
	if err != nil {
		return spatial.Places{}, nil, err
	}
	var z []spatial.Covariate
	for _, name := range slices.Concat(want.Linear, want.Category, want.Optional) {
		c := t.Column(name)
		if c == nil {
			continue // a group that the table does not have: the average one
		}
		if known, ok := levels[name]; ok {
			if err := knownLevels(t, c, known); err != nil {
				return spatial.Places{}, nil, err
			}
		}
		z = append(z, spatial.Covariate{Name: name, Number: c.Number, Code: c.Code, Level: c.Level})
	}
	return spatial.Places{X: x, Y: y}, z, nil
}

// ReplaceFile writes a file beside path and renames it when it is whole. An error leaves nothing behind.
func ReplaceFile(ctx context.Context, path string, content func(w io.Writer) error) (err error) {
	folder, partial := filepath.Dir(path), path+".partial"
	made, err := makeParents(path)
	defer func() {
		if err != nil {
			unmake(made)
		}
	}()
	if err != nil {
		return err
	}
	release, err := lock(partial + ".lock")
	if err != nil {
		return err
	}
	defer release()
	if err := os.Remove(partial); err != nil && !errors.Is(err, fs.ErrNotExist) {
		return Plainly(err, partial)
	}
	if _, err = writeFileAs(ctx, partial, filepath.Base(path), content); err == nil {
		err = sync(partial)
	}
	if err == nil {
		err = os.Rename(partial, path)
	}
	if err != nil {
		os.Remove(partial)
		return Plainly(err, path)
	}
	return sync(folder)
}
