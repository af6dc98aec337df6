package main

import (
	"context"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"strconv"
	"strings"

	"drumlin/cmd/internal/batch"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
)

// batchRequest is what the batch command was asked for.
type batchRequest struct {
	settings plan.Settings // the words of how to run
	out      string
	part     string
	emit     string
	redo     []string
	gather   bool
	check    bool
}

func (p program) batchCommand() command {
	r := &batchRequest{}
	c := r.command()
	c.run = func(ctx context.Context, rest []string) error {
		file, err := c.single(rest, "a plan")
		if err != nil {
			return err
		}
		if err := r.checkFlags(c, file); err != nil {
			return err
		}
		s := r.settings.Over(plan.Defaults())
		return p.runBatch(ctx, r, file, r.out, r.out, newBatchLine(p.stderr, *s.Quiet), s)
	}
	return c
}

func (r *batchRequest) command() command {
	return command{
		name:     "batch",
		synopsis: "PLAN --out DIR [flags]",
		summary:  "run a plan of many regions, restartable and in parallel",
		about: "Reads PLAN, a TOML file that names the regions and how each is to be mapped, and makes the folder of each in DIR: " +
			"the same files as map makes. One region that fails stops no other; ledger.csv says what each came to, regions.csv " +
			"compares them, and mosaic.csv, mosaic.geojson and mosaic.png show them side by side. Maps share their colours.\n\n" +
			"Run again, it does only what is missing, failed or changed. Under [defaults] and [region.NAME] stand the words of " +
			"map, with underscores; under [regions] either files = \"data/*.csv\", or file = \"all.csv\" and split_by = \"district\".",
		example: "Check a plan, run it, and run it again after an interruption:\n\n" +
			"  drumlin batch plan.toml --check\n" +
			"  drumlin batch plan.toml --out maps\n" +
			"  drumlin batch plan.toml --out maps\n\n" +
			"A share of the regions on each of 16 machines that see the same disk, and then the rest:\n\n" +
			"  drumlin batch plan.toml --out maps --part 3/16\n" +
			"  drumlin batch plan.toml --out maps --gather\n\n" +
			"A job file for a Slurm cluster that does so:\n\n" +
			"  drumlin batch plan.toml --out maps --emit slurm --part auto/16",
		options: r.options(),
	}
}

func (r *batchRequest) options() []option {
	const group = "Flags"
	alone := func(name, help string, to *bool) option {
		return option{name: name, group: group, help: help, take: func(string) error { *to = true; return nil }}
	}
	return append([]option{
		ofText("out", group, "DIR", "the folder of the batch; one that an earlier run made is continued", &r.out),
		alone("check", "check all of the plan, print what would be run, and stop", &r.check),
		{name: "redo", group: group, arg: "NAME", repeat: true, help: "do this region again though nothing has changed",
			take: func(value string) error { r.redo = append(r.redo, value); return nil }},
		ofText("part", group, "I/N", "do one of N shares of the regions, and draw nothing that needs all of them; auto finds I and N in "+
			"the variables of Slurm and other engines that run arrays of tasks, auto/N the share alone", &r.part),
		alone("gather", "fit nothing: bring together what the parts have done, draw, and list what is missing", &r.gather),
		ofText("emit", group, "KIND", "write a job file for an engine, slurm or kubernetes, that runs the batch in parts, and stop; "+
			"--part auto/N says how many", &r.emit),
	}, ofNamed(&r.settings, group, "workers", "quiet")...)
}

// checkFlags refuses flags that exclude each other.
func (r *batchRequest) checkFlags(c command, file string) error {
	modes := []struct {
		name string
		on   bool
	}{{"check", r.check}, {"gather", r.gather}, {"emit", r.emit != ""}}
	for i, a := range modes {
		for _, b := range modes[i+1:] {
			if a.on && b.on {
				return misuse("keep one of the two", "--%s and --%s exclude each other", a.name, b.name)
			}
		}
	}
	switch {
	case r.gather && r.part != "":
		return misuse("leave out --part: gathering is for all parts together", "--gather and --part exclude each other")
	case r.gather && r.redo != nil:
		return misuse("redo the region first, then gather", "--gather fits nothing, so nothing can be done again")
	case r.emit != "" && r.redo != nil:
		return misuse("leave out --redo", "--redo has no meaning in a job file")
	}
	if r.check && r.out == "" {
		return nil
	}
	if err := c.needs("out", r.out); err != nil {
		return err
	}
	return keepApart(r.out, file)
}

// runBatch carries out the request; shown is what the reader knows the folder out as.
func (p program) runBatch(ctx context.Context, r *batchRequest, file, out, shown string, line *batchLine, s plan.Settings) error {
	defer line.clear()
	line.Stage("reading the plan", 0, 0)
	b, err := batch.Load(ctx, file)
	if err != nil {
		return err
	}
	if r.emit != "" {
		return p.emitJob(b, r, file, s)
	}
	o := batch.Options{Workers: *s.Workers, Gather: r.gather, Redo: r.redo}
	if r.part != "" {
		if o.Part, err = batch.ParsePart(r.part, os.Getenv); err != nil {
			return err
		}
	}
	if r.check {
		prospects, err := b.Check(ctx, out, o)
		line.clear()
		if err != nil || *s.Quiet {
			return err
		}
		return toStdout(p.stdout, func(w io.Writer) error { return b.WriteProspects(w, prospects) })
	}
	report, err := p.work.batch(ctx, b, out, o, line)
	line.clear()
	if err != nil {
		return err
	}
	if !*s.Quiet {
		if err := toStdout(p.stdout, func(w io.Writer) error { return report.WriteWords(w, shown) }); err != nil {
			return err
		}
	}
	if report.Incomplete() {
		return &incomplete{report, o.Part.String()}
	}
	return nil
}

// incomplete ends a batch that is done, but for regions that failed, are missing or carry a stop.
type incomplete struct {
	report batch.Report
	part   string // empty for the whole batch
}

func (e *incomplete) Error() string {
	t := e.report.Tally
	var parts []string
	for _, c := range []struct {
		n    int
		what string
	}{{t.Failed, "failed"}, {t.Stops, "with a stop"}, {len(e.report.Missing), "missing"}} {
		if c.n > 0 {
			parts = append(parts, fmt.Sprintf("%d %s", c.n, c.what))
		}
	}
	return fmt.Sprintf("of %s, %s", batch.Counted(t.Regions, "region"), strings.Join(parts, ", "))
}

// Hint says where to look. A part writes no tables; its ledger is for programs, but a person can read it.
func (e *incomplete) Hint() string {
	switch t := e.report.Tally; {
	case t.Failed+t.Stops == 0:
		return "run the parts that have the missing regions again, and then gather"
	case e.part != "":
		return "the lines of part " + e.part + " in the folder's ledger say why; so does ledger.csv once all parts are gathered"
	}
	return "ledger.csv says why, region by region"
}

// emitJob writes a job file for an engine.
func (p program) emitJob(b *batch.Batch, r *batchRequest, file string, s plan.Settings) error {
	parts := min(16, b.Len())
	if r.part != "" {
		text, found := strings.CutPrefix(r.part, "auto/")
		n, err := strconv.Atoi(text)
		if !found || err != nil || n < 1 {
			return misuse("write --part auto/N, with N the number of parts", "--part %s: a job file is for all parts", r.part)
		}
		parts = n
	}
	self, err := os.Executable()
	if err != nil {
		return err
	}
	job := batch.Job{Parts: parts, Workers: *s.Workers, Pooled: b.Pooled(), Program: self}
	if job.Plan, err = filepath.Abs(file); err != nil {
		return err
	}
	if job.Out, err = filepath.Abs(r.out); err != nil {
		return err
	}
	job.Name = strings.TrimSuffix(filepath.Base(file), filepath.Ext(file))
	text, err := batch.Emit(r.emit, job)
	if err != nil {
		return err
	}
	if err := batch.MakeFolder(r.out); err != nil {
		return err
	}
	if err := pipeline.MakeFolder(filepath.Join(r.out, "logs")); err != nil {
		return err
	}
	path := filepath.Join(r.out, batch.EmitFile(r.emit))
	if err := pipeline.ReplaceFile(context.Background(), path, func(w io.Writer) error {
		_, err := w.Write(text)
		return err
	}); err != nil || *s.Quiet {
		return err
	}
	return toStdout(p.stdout, func(w io.Writer) error {
		_, err := fmt.Fprintf(w, "written  %s: %d parts; its first lines say how to submit it\n", path, parts)
		return err
	})
}
