package main

import (
	"bytes"
	"context"
	"errors"
	"fmt"
	"io"
	"path/filepath"
	"time"

	"drumlin/cmd/internal/demo"
	"drumlin/io/plan"
)

func (p program) demoCommand() command {
	var s plan.Settings
	var out string
	var regions bool
	c := command{
		name:     "demo",
		synopsis: "--out DIR [flags]",
		summary:  "make invented data sets and their maps",
		about: "Writes two invented data sets, set in places that do not exist: plants counted on plots, with three zones, and " +
			"cases of an illness among the residents of villages. Runs map on both and writes the commands beside the data, " +
			"to be read, changed and run again. Takes some seconds.\n\n" +
			"With --batch it is a plan of 24 invented districts instead, with the troubles that districts have: it is checked, " +
			"run, run again, and gathered.",
		example: "  drumlin demo --out demo\n" +
			"  drumlin demo --batch --out demo-batch",
	}
	c.options = demoOptions(&s, &out, &regions)
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
		show := demonstration{demo.Write, demo.Commands()}
		if regions {
			show = demonstration{demo.WriteBatch, demo.BatchCommands()}
		}
		return p.demonstrate(ctx, show, s.Over(plan.Defaults()), out)
	}
	return c
}

// demonstration is data and what is done with them.
type demonstration struct {
	write    func(dir string) error
	commands []demo.Command
}

func demoOptions(s *plan.Settings, out *string, regions *bool) []option {
	const group = "Flags"
	options := []option{
		ofText("out", group, "DIR", "the folder to write; it appears whole or not at all", out),
		{name: "batch", group: group, help: "a batch of 24 districts instead of single maps",
			take: func(string) error { *regions = true; return nil }},
	}
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
func (p program) demonstrate(ctx context.Context, show demonstration, s plan.Settings, out string) error {
	line := newProgress(p.stderr, *s.Quiet)
	defer line.clear()
	var told bytes.Buffer
	inner := p
	inner.stdout = &told
	err := p.work.folder(ctx, out, *s.Force, func(partial string) error {
		if err := show.write(partial); err != nil {
			return err
		}
		for i, c := range show.commands {
			line.within(fmt.Sprintf("%s %d of %d", c.Args[0], i+1, len(show.commands)))
			fmt.Fprintf(&told, "%s:\n\n  %s\n\n", c.Aim, c.Line())
			carryOut := inner.mapWithin
			if c.Args[0] == "batch" {
				carryOut = inner.batchWithin
			}
			if err := carryOut(ctx, partial, c.Args, s, line); err != nil {
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

// batchWithin carries out a batch command as if it had been typed in the folder dir. Regions that fail are part of the
// demonstration.
func (p program) batchWithin(ctx context.Context, dir string, args []string, how plan.Settings, line *progress) error {
	r := &batchRequest{}
	c := r.command()
	c.run = func(ctx context.Context, rest []string) error {
		file, err := c.single(rest, "a plan")
		if err != nil {
			return err
		}
		s := r.settings.Over(plan.Defaults())
		s.Workers, s.Quiet = how.Workers, how.Quiet
		out := ""
		if r.out != "" {
			out = filepath.Join(dir, r.out)
		}
		err = p.runBatch(ctx, r, filepath.Join(dir, file), out, r.out, &batchLine{line: line, now: time.Now}, s)
		var some *incomplete
		if errors.As(err, &some) {
			fmt.Fprintf(p.stdout, "exit     %d: %v\n", exitRegions, err)
			return nil
		}
		return err
	}
	return p.carryOut(ctx, c, args[1:])
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
