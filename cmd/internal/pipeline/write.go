package pipeline

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"hash"
	"io"
	"os"
	"path/filepath"

	"drumlin/io/archive"
	"drumlin/io/draft"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/io/tables"
	"drumlin/io/vector"
)

// geojsonCells is the number of cells up to which surface.geojson is written unless it was asked for by name.
const geojsonCells = 1_000_000

// artefact is one file of the folder.
type artefact struct {
	file    string
	data    bool                    // its checksum goes into the summary
	content func(w io.Writer) error // nil for a file that is written later
}

// write fills the folder; summary.json, which lists the others, comes last.
func (r *run) write(ctx context.Context, folder string) error {
	list := r.artefacts(ctx)
	for k, a := range list {
		if err := ctx.Err(); err != nil {
			return err
		}
		r.events.Stage("writing "+a.file, k, len(list))
		o := summary.Output{File: a.file}
		if a.content != nil {
			sum, err := writeFile(ctx, folder, a.file, a.content)
			if err != nil {
				return err
			}
			if a.data {
				o.SHA256 = sum
			}
		}
		r.document.Outputs = append(r.document.Outputs, o)
	}
	_, err := writeFile(ctx, folder, "summary.json", r.document.WriteJSON)
	return err
}

// artefacts lists what was asked for.
func (r *run) artefacts(ctx context.Context) []artefact {
	var list []artefact
	if r.wants(plan.CSV) {
		list = append(list,
			artefact{"surface.csv", true, r.writeSurface},
			artefact{"residuals.csv", true, r.writeResiduals})
		if len(r.obs.table.Aside) > 0 {
			list = append(list, artefact{"set-aside.csv", true, r.writeAside})
		}
		if r.byPlace != nil {
			list = append(list, artefact{"places.csv", true, r.writePlaces})
		}
		if r.zones != nil {
			list = append(list, artefact{"zones.csv", true, r.writeZones})
		}
	}
	if r.wants(plan.CSV) && len(r.surface.Effects()) > 0 {
		list = append(list, artefact{"effects.csv", true, r.writeEffects})
	}
	if r.wants(plan.CSV) && len(r.comparison) > 0 {
		list = append(list, artefact{"candidates.csv", true, r.writeCandidates})
	}
	if r.wants(plan.GeoJSON) && (len(r.target.cells) <= geojsonCells || r.settings.Said("write")) {
		list = append(list, artefact{"surface.geojson", true, r.writeGeoJSON})
		if r.byPlace != nil {
			list = append(list, artefact{"places.geojson", true, r.writePlaceShapes})
		}
		if r.zones != nil {
			list = append(list, artefact{"zones.geojson", true, r.writeZoneShapes})
		}
	}
	if r.wants(plan.GeoJSON) && !r.target.own() && len(r.target.cells) <= geojsonCells && len(r.levels()) > 0 {
		list = append(list, artefact{"isolines.geojson", true, r.writeIsolines})
	}
	if r.wants(plan.TIF) && !r.target.own() {
		list = append(list, artefact{"surface.tif", true, func(w io.Writer) error { return r.writeRaster(ctx, w) }})
	}
	if r.wants(plan.Saved) {
		list = append(list, artefact{"saved.surface", true, func(w io.Writer) error { return archive.Write(w, r.saved()) }})
	}
	if r.region != nil && (r.wants(plan.Pictures) || r.wants(plan.CSV) || r.wants(plan.GeoJSON)) {
		d := r.draft()
		list = append(list, artefact{DraftFile, true, func(w io.Writer) error { return draft.Write(w, d) }})
	}
	if r.wants(plan.Pictures) {
		for _, p := range r.draft().Pictures() {
			draw := p.WritePNG
			if r.region != nil {
				draw = nil // with the colours of all regions, when they are in
			}
			list = append(list, artefact{p.File, false, draw})
		}
		if len(r.surface.Effects()) > 0 {
			list = append(list, artefact{"effects.png", false, r.effectsPicture().WritePNG})
		}
	}
	return list
}

func (r *run) writeSurface(w io.Writer) error {
	return tables.Write(w, r.target.places.Len(), surfaceTable(r.obs.system, r.target.places, r.estimates))
}

// shapeColumns turns the filled columns of a table into properties.
func shapeColumns(columns []tables.Column) []vector.Column {
	var list []vector.Column
	for _, c := range columns {
		switch {
		case c.Number != nil:
			list = append(list, vector.Column{Name: c.Name, Value: c.Number})
		case c.Whole != nil:
			v := make([]float64, len(c.Whole))
			for i, n := range c.Whole {
				v[i] = float64(n)
			}
			list = append(list, vector.Column{Name: c.Name, Value: v})
		}
	}
	return list
}

func (r *run) writeGeoJSON(w io.Writer) error {
	columns := shapeColumns(surfaceTable(r.obs.system, r.target.places, r.estimates))
	if r.target.own() {
		return vector.WritePoints(w, r.obs.system, r.target.places.X, r.target.places.Y, columns)
	}
	return vector.WriteCells(w, r.target.lattice, r.target.cells, columns)
}

func (r *run) writeZones(w io.Writer) error {
	columns := append([]tables.Column{{Name: "zone", Text: r.zones.names()}}, r.zones.columns()...)
	return tables.Write(w, len(r.zones.zones), columns)
}

func (r *run) writeZoneShapes(w io.Writer) error {
	var zones []vector.Zone
	for _, z := range r.zones.zones {
		zones = append(zones, vector.Zone{Name: z.Name, Shape: z.Shape})
	}
	return vector.WriteZones(w, r.obs.system, zones, shapeColumns(r.zones.columns()))
}

func (r *run) writeResiduals(w io.Writer) error {
	rows, t := r.surface.Rows(), r.obs.table
	n := r.obs.own
	row := make([]int64, n)
	x, y := t.XY()
	for i := range row {
		row[i] = int64(t.Row[i])
	}
	columns := []tables.Column{{Name: "row", Whole: row}}
	if r.obs.places != nil {
		place := make([]string, n)
		for i := range place {
			place[i] = r.obs.places[r.obs.placeOf[i]].name
		}
		columns = append(columns, tables.Column{Name: "place", Text: place})
	}
	return tables.Write(w, n, append(columns,
		tables.Column{Name: "x", Number: x[:n], Exact: true}, tables.Column{Name: "y", Number: y[:n], Exact: true},
		tables.Column{Name: "response", Number: r.obs.data.Response[:n]}, tables.Column{Name: "fitted", Number: rows.Fitted[:n]},
		tables.Column{Name: "deviance_residual", Number: rows.Deviance[:n]}, tables.Column{Name: "quantile_residual", Number: rows.Quantile[:n]},
		tables.Column{Name: "leverage", Number: rows.Leverage[:n]}))
}

func (r *run) writeAside(w io.Writer) error {
	t := r.obs.table
	n := len(t.Aside)
	file, column, value, reason := make([]string, n), make([]string, n), make([]string, n), make([]string, n)
	row, line := make([]int64, n), make([]int64, n)
	for i, a := range t.Aside {
		file[i], row[i], line[i], column[i], value[i], reason[i] = t.Source, int64(a.Row), int64(a.Line), a.Column, a.Value, a.Reason
	}
	return tables.Write(w, n, []tables.Column{
		{Name: "file", Text: file}, {Name: "row", Whole: row}, {Name: "line", Whole: line},
		{Name: "column", Text: column}, {Name: "value", Text: value}, {Name: "reason", Text: reason},
	})
}

// writeFile writes one file and returns its checksum. Whoever asked for it brings it to the disk: for many files at once
// that takes little longer than for one.
func writeFile(ctx context.Context, folder, name string, content func(w io.Writer) error) (string, error) {
	return writeFileAs(ctx, filepath.Join(folder, name), name, content)
}

// writeFileAs writes a file at path that messages know by the name it is going to have.
func writeFileAs(ctx context.Context, path, name string, content func(w io.Writer) error) (string, error) {
	f, err := os.OpenFile(path, os.O_CREATE|os.O_EXCL|os.O_WRONLY, 0o644)
	if err != nil {
		return "", Plainly(err, name)
	}
	sum := sha256.New()
	if err := fill(ctx, f, sum, content); err != nil {
		f.Close()
		return "", Plainly(fmt.Errorf("%s: %w", name, err), name)
	}
	return hex.EncodeToString(sum.Sum(nil)), nil
}

func fill(ctx context.Context, f *os.File, sum hash.Hash, content func(w io.Writer) error) error {
	if err := content(&stoppable{ctx: ctx, to: io.MultiWriter(f, sum)}); err != nil {
		return err
	}
	return f.Close()
}

// stoppable is a file that can be neither read nor written any more once its ctx is cancelled: a large one takes long.
type stoppable struct {
	ctx  context.Context
	from io.Reader
	to   io.Writer
}

func (s *stoppable) Read(p []byte) (int, error) {
	if err := s.ctx.Err(); err != nil {
		return 0, err
	}
	return s.from.Read(p)
}

func (s *stoppable) Write(p []byte) (int, error) {
	if err := s.ctx.Err(); err != nil {
		return 0, err
	}
	return s.to.Write(p)
}
