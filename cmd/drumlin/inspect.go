package main

import (
	"bufio"
	"context"
	"encoding/json"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"unicode/utf8"

	"drumlin/cmd/internal/inspect"
	"drumlin/cmd/internal/pipeline"
	"drumlin/grids/crs"
	"drumlin/io/geotiff"
	"drumlin/io/observe"
	"drumlin/io/plan"
)

// inspectRequest is what the inspect command was asked for.
type inspectRequest struct {
	settings plan.Settings // what is said of the table
	json     bool
	plan     bool
	systems  bool
}

// inspection is what was found, of a table or of a raster.
type inspection interface {
	JSON(w io.Writer) error
	Words(w io.Writer) error
}

func (p program) inspectCommand() command {
	r := &inspectRequest{}
	c := command{
		name:     "inspect",
		synopsis: "OBS [--json | --plan] [flags]",
		summary:  "say what a file holds, what looks wrong, and what map to ask for",
		about: "Reads OBS, a CSV table or GeoJSON, and says what is in its columns, where its places are, and what looks wrong: " +
			"swapped axes, rows at 0,0, repeated rows, geometries that cannot be read, numbers that are written as text, marks " +
			"for missing values. Places are coordinate columns or geometries: points, lines or areas. It lists the " +
			"columns that could be the response with what each is likely out of, and ends with a command line to paste and " +
			"what map would choose for it.\n\n" +
			"OBS may also be a raster, GeoTIFF or ASCII grid raster: of that it says the coordinate system, the cells and edges, and " +
			"what every band holds.\n\n" +
			"With --crs-list and no OBS it lists the coordinate systems that --crs takes: code, name and where it is used.\n\n" +
			"What it says of meanings is likely, not certain: it goes by names and numbers alone. Nothing is written, and " +
			"whatever is found, the exit code is 0 if the file can be read.",
		example: "A table that nobody has seen before:\n\n" +
			"  drumlin inspect plots.csv\n\n" +
			"The beginning of a plan for a batch, with every word and what it means:\n\n" +
			"  drumlin inspect plots.csv --plan > plan.toml",
	}
	c.options = r.options()
	c.run = func(ctx context.Context, rest []string) error {
		if r.systems {
			return r.listSystems(p.stdout, rest)
		}
		found, err := r.examine(ctx, c, rest)
		if err != nil {
			return err
		}
		if r.json {
			return toStdout(p.stdout, found.JSON)
		}
		if report, ok := found.(inspect.Report); ok && r.plan {
			return toStdout(p.stdout, func(w io.Writer) error { return plan.WriteStarter(w, report.Starter()) })
		}
		return toStdout(p.stdout, found.Words)
	}
	return c
}

func (r *inspectRequest) options() []option {
	const group = "Flags"
	return append([]option{
		{name: "json", group: group, help: "write all that was found as JSON", take: func(string) error { r.json = true; return nil }},
		{name: "plan", group: group, help: "write a plan to start a batch from, in which every word is explained",
			take: func(string) error { r.plan = true; return nil }},
		{name: "crs-list", group: group, help: "list the coordinate systems that --crs takes; needs no OBS, and --json makes a list in JSON of it",
			take: func(string) error { r.systems = true; return nil }},
	}, ofNamed(&r.settings, group, "x", "y", "geometry", "crs", "separator", "decimal-comma", "missing")...)
}

// examine reads the table or the raster and looks at it.
func (r *inspectRequest) examine(ctx context.Context, c command, rest []string) (inspection, error) {
	obs, err := c.single(rest, "a file of observations")
	if err != nil {
		return nil, err
	}
	switch s := r.settings; {
	case r.json && r.plan:
		return nil, misuse("make two runs", "--json and --plan each fill standard output")
	case s.Geometry != nil && (s.X != nil || s.Y != nil):
		return nil, misuse("name either --geometry or --x and --y", "--geometry is named beside coordinate columns; a row has one place")
	case (s.X == nil) != (s.Y == nil):
		return nil, misuse("name both --x and --y, or neither", "one coordinate column is named without the other")
	}
	r.settings.Observations = &obs
	want, err := inspect.Request(r.settings)
	if err != nil {
		return nil, err
	}
	f, err := pipeline.Open(ctx, obs)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	text := bufio.NewReader(f)
	if head, _ := text.Peek(64); geotiff.Recognise(head) { // what ended it early ends the reading of a table too
		return r.examineRaster(ctx, obs)
	}
	survey, err := observe.ReadSurvey(text, filepath.Base(obs), want)
	if err != nil {
		return nil, err
	}
	return inspect.Examine(survey, r.settings), nil
}

// examineRaster looks at a raster, which is read here and there and not from its beginning to its end.
func (r *inspectRequest) examineRaster(ctx context.Context, path string) (inspection, error) {
	name := filepath.Base(path)
	switch s := r.settings; {
	case r.plan:
		return nil, misuse("inspect it without --plan", "%s: --plan makes a plan of a table, and this is a raster", name)
	case s.X != nil || s.Geometry != nil:
		return nil, misuse("leave out --x, --y and --geometry", "%s: the cells of a raster have places of their own", name)
	case s.Separator != nil || s.DecimalComma != nil || len(s.Missing) > 0:
		return nil, misuse("leave out --separator, --decimal-comma and --missing", "%s: this is a raster, and says itself how it is written", name)
	}
	f, err := os.Open(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	info, err := f.Stat()
	if err != nil {
		return nil, err
	}
	if !info.Mode().IsRegular() {
		return nil, misuse("write it to a file first", "%s: a raster is read from a file, and this is none", name)
	}
	raster, err := geotiff.Open(f, info.Size(), name)
	if err != nil {
		return nil, err
	}
	return inspect.ExamineRaster(ctx, raster, r.settings)
}

// listedSystem is a coordinate system as it is listed.
type listedSystem struct {
	Code string `json:"code"`
	Name string `json:"name"`
	Area string `json:"area"`
}

// systems are longitude and latitude, and then the planes that --crs takes by their code.
func systems() []listedSystem {
	list := []listedSystem{{"EPSG:4326", "longitude and latitude, WGS 84", "world; codes of datums close to it, such as EPSG:4258 and EPSG:4269, are taken for it"}}
	for _, c := range crs.Codes() {
		list = append(list, listedSystem{"EPSG:" + strconv.Itoa(c.EPSG), c.Name, c.Area})
	}
	return list
}

// listSystems writes the coordinate systems, one a line or as JSON.
func (r *inspectRequest) listSystems(stdout io.Writer, rest []string) error {
	switch {
	case len(rest) > 0:
		return misuse("make two runs", "--crs-list lists coordinate systems and reads no file, but %q is named", rest[0])
	case r.plan || len(r.settings.Effective()) > 0:
		return misuse("leave the other flags out", "--crs-list goes with --json alone")
	}
	list := systems()
	return toStdout(stdout, func(w io.Writer) error {
		if r.json {
			text, err := json.MarshalIndent(list, "", "  ")
			if err == nil {
				_, err = w.Write(append(text, '\n'))
			}
			return err
		}
		code, name := 0, 0
		for _, s := range list {
			code, name = max(code, utf8.RuneCountInString(s.Code)), max(name, utf8.RuneCountInString(s.Name))
		}
		for _, s := range list {
			if _, err := fmt.Fprintf(w, "%-*s  %-*s  %s\n", code, s.Code, name, s.Name, s.Area); err != nil {
				return err
			}
		}
		return nil
	})
}
