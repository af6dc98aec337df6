package main

import (
	"bytes"
	"context"
	"fmt"
	"io"
	"path/filepath"

	"drumlin/cmd/internal/demo"
	"drumlin/io/plan"
)

func (p program) demoCommand() command {
	var s plan.Settings
	var out string
	c := command{
		name:     "demo",
		synopsis: "--out DIR [flags]",
		summary:  "make two invented data sets and their maps",
		about: "Writes two invented data sets, set in places that do not exist: plants counted on plots, with three zones, and " +
			"cases of an illness among the residents of villages. Runs map on both and writes the commands beside the data, " +
			"to be read, changed and run again. Takes some seconds.",
		example: "  drumlin demo --out demo",
	}
	c.options = demoOptions(&s, &out)
	c.run = func(ctx context.Context, rest []string) error {
		if err := c.none(rest); err != nil {
			return err
		}
		if err := c.needs("out", out); err != nil {
			return err
		}
		if err := keepApart(out); err != nil {
			return err
		}
		return p.demonstrate(ctx, s.Over(plan.Defaults()), out)
	}
	return c
}

func demoOptions(s *plan.Settings, out *string) []option {
	const group = "Flags"
	options := []option{ofText("out", group, "DIR", "the folder to write; it appears whole or not at all", out)}
	return append(options, runOptions(s, group)...)
}

// runOptions are the words of plan that bear on how a command is carried out.
func runOptions(s *plan.Settings, group string) []option {
	var options []option
	for _, w := range plan.Words() {
		if w.RunOnly {
			o := ofWord(w, s)
			o.group = group
			options = append(options, o)
		}
	}
	return options
}

// demonstrate writes the data and carries out the commands in a folder of their own. What they have to say is printed
// once all of them are done.
func (p program) demonstrate(ctx context.Context, s plan.Settings, out string) error {
	line := newProgress(p.stderr, *s.Quiet)
	defer line.clear()
	var told bytes.Buffer
	inner := p
	inner.stdout = &told
	err := p.work.folder(ctx, out, *s.Force, func(partial string) error {
		if err := demo.Write(partial); err != nil {
			return err
		}
		commands := demo.Commands()
		for i, c := range commands {
			line.within(fmt.Sprintf("map %d of %d", i+1, len(commands)))
			fmt.Fprintf(&told, "%s:\n\n  %s\n\n", c.Aim, c.Line())
			if err := inner.mapWithin(ctx, partial, c.Args, s, line); err != nil {
				return err
			}
			told.WriteByte('\n')
		}
		return nil
	})
	line.clear()
	if err != nil || *s.Quiet {
		return err
	}
	fmt.Fprintf(&told, "Data, maps and commands are in %s; begin with %s\n", out, filepath.Join(out, "commands.txt"))
	return toStdout(p.stdout, func(w io.Writer) error {
		_, err := told.WriteTo(w)
		return err
	})
}

// mapWithin carries out a map command as if it had been typed in the folder dir.
func (p program) mapWithin(ctx context.Context, dir string, args []string, how plan.Settings, line *progress) error {
	r := &mapRequest{}
	c := r.command()
	c.run = func(ctx context.Context, rest []string) error {
		s, err := r.resolve(c, rest)
		if err != nil {
			return err
		}
		s.Workers, s.Quiet = how.Workers, how.Quiet
		return p.draw(ctx, s.RelativeTo(dir), filepath.Join(dir, r.out), r.out, line)
	}
	return p.carryOut(ctx, c, args[1:])
}
