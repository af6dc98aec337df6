package main

import (
	"context"
	"io"
	"path/filepath"

	"drumlin/cmd/internal/inspect"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/observe"
	"drumlin/io/plan"
)

// inspectRequest is what the inspect command was asked for.
type inspectRequest struct {
	settings plan.Settings // what is said of the table
	json     bool
	plan     bool
}

func (p program) inspectCommand() command {
	r := &inspectRequest{}
	c := command{
		name:     "inspect",
		synopsis: "OBS [--json | --plan] [flags]",
		summary:  "say what a table holds, what looks wrong, and what map to ask for",
		about: "Reads OBS, a CSV table or GeoJSON, and says what is in its columns, where its places are, and what looks wrong: " +
			"swapped axes, rows at 0,0, repeated rows, geometries that cannot be read, numbers that are written as text, marks " +
			"for missing values. Places are coordinate columns or geometries: points, lines or areas. It lists the " +
			"columns that could be the response with what each is likely out of, and ends with a command line to paste and " +
			"what map would choose for it.\n\n" +
			"What it says of meanings is likely, not certain: it goes by names and numbers alone. Nothing is written, and " +
			"whatever is found, the exit code is 0 if the table can be read.",
		example: "A table that nobody has seen before:\n\n" +
			"  drumlin inspect plots.csv\n\n" +
			"The beginning of a plan for a batch, with every word and what it means:\n\n" +
			"  drumlin inspect plots.csv --plan > plan.toml",
	}
	c.options = r.options()
	c.run = func(ctx context.Context, rest []string) error {
		report, err := r.examine(ctx, c, rest)
		if err != nil {
			return err
		}
		switch {
		case r.json:
			return toStdout(p.stdout, report.JSON)
		case r.plan:
			return toStdout(p.stdout, func(w io.Writer) error { return plan.WriteStarter(w, report.Starter()) })
		}
		return toStdout(p.stdout, report.Words)
	}
	return c
}

func (r *inspectRequest) options() []option {
	const group = "Flags"
	return append([]option{
		{name: "json", group: group, help: "write all that was found as JSON", take: func(string) error { r.json = true; return nil }},
		{name: "plan", group: group, help: "write a plan to start a batch from, in which every word is explained",
			take: func(string) error { r.plan = true; return nil }},
	}, ofNamed(&r.settings, group, "x", "y", "geometry", "crs", "separator", "decimal-comma", "missing")...)
}

// examine reads the table and looks at it.
func (r *inspectRequest) examine(ctx context.Context, c command, rest []string) (inspect.Report, error) {
	obs, err := c.single(rest, "a file of observations")
	if err != nil {
		return inspect.Report{}, err
	}
	switch s := r.settings; {
	case r.json && r.plan:
		return inspect.Report{}, misuse("make two runs", "--json and --plan each fill standard output")
	case s.Geometry != nil && (s.X != nil || s.Y != nil):
		return inspect.Report{}, misuse("name either --geometry or --x and --y", "--geometry is named beside coordinate columns; a row has one place")
	case (s.X == nil) != (s.Y == nil):
		return inspect.Report{}, misuse("name both --x and --y, or neither", "one coordinate column is named without the other")
	}
	r.settings.Observations = &obs
	want, err := inspect.Request(r.settings)
	if err != nil {
		return inspect.Report{}, err
	}
	f, err := pipeline.Open(ctx, obs)
	if err != nil {
		return inspect.Report{}, err
	}
	defer f.Close()
	survey, err := observe.ReadSurvey(f, filepath.Base(obs), want)
	if err != nil {
		return inspect.Report{}, err
	}
	return inspect.Examine(survey, r.settings), nil
}
