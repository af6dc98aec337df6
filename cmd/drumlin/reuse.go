package main

import (
	"context"
	"fmt"
	"io"

	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
)

func (p program) reuseCommand() command {
	var s plan.Settings
	var out string
	c := command{
		name:     "reuse",
		synopsis: "SAVED --at FILE --out FILE [flags]",
		summary:  "predict from a saved surface at new places",
		about: "Reads SAVED, the file saved.surface that map wrote, and predicts at the places of a table, in the table's " +
			"order: the same numbers that map would have given there. The table has the coordinate columns and the " +
			"covariates that the surface was fitted with, and may have others.",
		example: "The density of stems where new plots are planned:\n\n" +
			"  drumlin reuse stems/saved.surface --at planned.csv --out planned-stems.csv",
	}
	c.options = reuseOptions(&s, &out)
	c.run = func(ctx context.Context, rest []string) error {
		s := s.Over(plan.Defaults())
		r, err := reuseRequest(c, rest, s, out)
		if err != nil {
			return err
		}
		line := newProgress(p.stderr, *s.Quiet)
		err = p.work.reuse(ctx, r, line)
		line.clear()
		if err != nil || *s.Quiet {
			return err
		}
		return toStdout(p.stdout, func(w io.Writer) error {
			_, err := fmt.Fprintf(w, "Predicted at the places of %s; the table is %s\n", r.At, r.Out)
			return err
		})
	}
	return c
}

func reuseOptions(s *plan.Settings, out *string) []option {
	const group = "Flags"
	options := ofNamed(s, group, "at", "x", "y")
	options[0].help = "the table of places to predict at"
	options = append(options, ofText("out", group, "FILE", "the table to write; it appears whole or not at all", out))
	return append(options, runOptions(s, group)...)
}

func reuseRequest(c command, rest []string, s plan.Settings, out string) (pipeline.ReuseRequest, error) {
	saved, err := c.single(rest, "a saved surface")
	if err != nil {
		return pipeline.ReuseRequest{}, err
	}
	at := ""
	if s.At != nil {
		at = *s.At
	}
	if err := c.needs("at", at); err != nil {
		return pipeline.ReuseRequest{}, err
	}
	if err := c.needs("out", out); err != nil {
		return pipeline.ReuseRequest{}, err
	}
	r := pipeline.ReuseRequest{Saved: saved, At: at, Out: out, Force: *s.Force, Workers: *s.Workers}
	switch {
	case s.X != nil && s.Y != nil:
		r.X, r.Y = *s.X, *s.Y
	case s.X != nil || s.Y != nil:
		return r, misuse("name both --x and --y, or neither", "one coordinate column is named without the other")
	}
	return r, keepApart(out, saved, at)
}
