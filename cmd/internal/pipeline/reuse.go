package pipeline

import (
	"context"
	"io"
	"os"
	"path/filepath"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/archive"
	"drumlin/io/observe"
	"drumlin/io/tables"
	"drumlin/spatial"
)

// ReuseRequest asks a saved surface for its estimates at new places.
type ReuseRequest struct {
	Saved, At, Out string // paths
	Force          bool   // replace Out
	Workers        int
}

// Reuse writes the columns of surface.csv for the places of a file, in its order. Out appears whole or not at all.
func Reuse(ctx context.Context, q ReuseRequest, ev Events) error {
	if _, err := os.Lstat(q.Out); err == nil && !q.Force {
		return refuse("name another file, or add --force to replace it", "%s exists already", q.Out)
	}
	ev.Stage("reading", 0, 0)
	saved, surface, err := readSaved(q.Saved, q.Workers)
	if err != nil {
		return err
	}
	system, err := crs.Parse(saved.Reporting.CRS)
	if err != nil {
		return refuse("", "%s: %w", q.Saved, err)
	}
	at, z, err := readPlaces(q.At, saved, system)
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
	return replaceFile(q.Out, func(w io.Writer) error {
		return tables.Write(w, at.Len(), surfaceTable(system, at, e))
	})
}

func readSaved(path string, workers int) (archive.Saved, *spatial.Surface, error) {
	f, err := openFile(path)
	if err != nil {
		return archive.Saved{}, nil, err
	}
	defer f.Close()
	saved, err := archive.Read(f)
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
func readPlaces(path string, saved archive.Saved, system crs.System) (spatial.Places, []spatial.Covariate, error) {
	want := observe.Request{Strict: true, Axes: observe.AxesPlane}
	if saved.Reporting.Degrees {
		want.Axes = observe.AxesDegrees
	}
	for _, e := range saved.Surface.Effect {
		if e.Role == spatial.Category {
			want.Category = append(want.Category, e.Name)
		} else {
			want.Linear = append(want.Linear, e.Name)
		}
	}
	t, _, err := readTable(path, want)
	if err != nil {
		return spatial.Places{}, nil, err
	}
	x, y, err := planeOf(t, system)
	if err != nil {
		return spatial.Places{}, nil, err
	}
	var z []spatial.Covariate
	for _, e := range saved.Surface.Effect {
		c := t.Column(e.Name)
		if e.Role == spatial.Category {
			if err := knownLevels(t, c, e.Level); err != nil {
				return spatial.Places{}, nil, err
			}
		}
		z = append(z, spatial.Covariate{Name: e.Name, Number: c.Number, Code: c.Code, Level: c.Level})
	}
	return spatial.Places{X: x, Y: y}, z, nil
}

// replaceFile writes a file beside path and renames it when it is whole.
func replaceFile(path string, content func(w io.Writer) error) error {
	folder, name := filepath.Dir(path), filepath.Base(path)+".partial"
	if err := os.MkdirAll(folder, 0o755); err != nil {
		return plainly(err, folder)
	}
	partial := filepath.Join(folder, name)
	if err := os.RemoveAll(partial); err != nil {
		return plainly(err, folder)
	}
	if _, err := writeFile(folder, name, content); err != nil {
		os.Remove(partial)
		return plainly(err, folder)
	}
	if err := os.Rename(partial, path); err != nil {
		os.Remove(partial)
		return plainly(err, folder)
	}
	return syncFolder(folder)
}
