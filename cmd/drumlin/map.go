package main

import (
	"context"

	"drumlin/io/plan"
)

// mapRequest is what the map command was asked for.
type mapRequest struct {
	settings plan.Settings
	out      string
}

func (p program) mapCommand() command {
	r := &mapRequest{}
	c := r.command()
	c.run = func(ctx context.Context, rest []string) error {
		s, err := r.resolve(c, rest)
		if err != nil {
			return err
		}
		if err := keepApart(r.out, s.Files()...); err != nil {
			return err
		}
		return p.draw(ctx, s, r.out, r.out, newProgress(p.stderr, *s.Quiet))
	}
	return c
}

// command describes the map command; its flags write to r.
func (r *mapRequest) command() command {
	// The observations are the one argument that is not a flag.
	options := ofWords(&r.settings, "observations")
	out := ofText("out", options[len(options)-1].group, "DIR", "the folder to write; it appears whole or not at all", &r.out)
	return command{
		name:     "map",
		synopsis: "OBS --response COLUMN --out DIR [flags]",
		summary:  "fit a smooth surface to observations and map it",
		about: "Reads the observations in OBS, a CSV table with a row for each place, fits a smooth surface whose smoothness " +
			"the data decide, and writes maps and tables with standard errors to a new folder. What the response is, follows " +
			"from what is named beside it: nothing for a measurement, --people, --area, --effort or --expected for a count, " +
			"--trials for a number positive among examined.\n\n" +
			"Rows that cannot be used are set aside with their reason. Every choice that the program makes is stated. " +
			"Flags may stand before or after OBS.",
		example: "Stems counted on plots, their number per hectare, and how many there are in each zone:\n\n" +
			"  drumlin map plots.csv --response stems --area plot_ha --zones zones.geojson --out stems\n\n" +
			"Cases among the people of each village, per 1000, and where they are surely more than 5:\n\n" +
			"  drumlin map villages.csv --response cases --people residents --per 1000 --threshold 5 \\\n" +
			"    --out cases",
		options: append(options, out),
	}
}

// resolve checks the request as far as that can be done without opening a file.
func (r *mapRequest) resolve(c command, rest []string) (plan.Settings, error) {
	obs, err := c.single(rest, "a file of observations")
	if err != nil {
		return plan.Settings{}, err
	}
	r.settings.Observations = &obs
	if err := c.needs("out", r.out); err != nil {
		return plan.Settings{}, err
	}
	return r.settings.Resolve()
}

// draw has one region fitted and drawn into the folder out, and tells what came of it; shown is what the reader knows
// that folder as.
func (p program) draw(ctx context.Context, s plan.Settings, out, shown string, line *progress) error {
	document, err := p.work.run(ctx, s, out, line)
	document.Folder = shown
	line.clear()
	if err != nil || *s.Quiet {
		return err
	}
	return toStdout(p.stdout, document.Words)
}
