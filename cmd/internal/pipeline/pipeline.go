// Package pipeline runs one region, from settings to a finished folder: it opens the files, has the observations read,
// placed in a plane, fitted and mapped, and writes what was asked for. It is the only place where those steps meet.
package pipeline

import (
	"context"
	"errors"
	"fmt"

	"drumlin/grids"
	"drumlin/io/archive"
	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/spatial"
)

// Events is told how far the work is. Total 0 means not known.
type Events interface {
	Stage(name string, done, total int)
}

// Region is what a batch adds to a run: whose rows these are, and what is left for later.
type Region struct {
	Name        string
	Fingerprint string        // of input, settings and program; recorded
	Rows        *observe.Part // nil: all of the settings' table of observations
	SplitBy     string        // of Rows: the column that says which region a row is of
	// Beyond holds rows of neighbouring regions, which help the fit and are not reported.
	Beyond []observe.Part
	// Waiting, if not nil, is given what only waits for the disk, and carries it out: others can compute meanwhile.
	Waiting func(wait func() error) error
}

// run is one region on its way.
type run struct {
	settings plan.Settings
	region   *Region // nil for a map of its own
	events   Events
	version  string

	joins      *joins // nil where rows have all that they need
	obs        *observations
	area       *studyArea
	target     *target
	surface    *spatial.Surface
	knotPath   []spatial.KnotStep // on the way to enough knots
	asked      plan.Settings      // the settings as they came, before the data made choices
	comparison []spatial.Comparison
	tests      []summary.Test
	variation  *spatial.Variation // nil where there was nothing to choose
	reporting  reporting
	estimates  *estimates
	byPlace    *placeResults // nil where places are not told apart
	zones      *zoneResults
	sums       summary.Region // of a region of a batch
	document   summary.Document
}

// Run fits and maps one region. s must be resolved. The folder dir appears whole or not at all; what it holds is told
// by the document. Errors carry a hint where there is one to give; *spatial.Error is a fit that could not be had.
func Run(ctx context.Context, s plan.Settings, dir string, ev Events) (summary.Document, error) {
	return runInto(ctx, &run{settings: s, asked: s, events: ev, version: Version()}, dir)
}

// RunRegion is Run for a region of a batch. Instead of maps the folder gets DraftFile, which they are drawn from when
// every region is in; the document lists them all the same, and has the figures by which regions are compared.
func RunRegion(ctx context.Context, s plan.Settings, g Region, dir string, ev Events) (summary.Document, error) {
	return runInto(ctx, &run{settings: s, asked: s, region: &g, events: ev, version: Version()}, dir)
}

func runInto(ctx context.Context, r *run, dir string) (summary.Document, error) {
	ev := r.events
	// The folder is claimed first, so that one that cannot be had is told before the work and not after it.
	waiting := atOnce
	if r.region != nil && r.region.Waiting != nil {
		waiting = r.region.Waiting
	}
	err := folder(ctx, dir, *r.settings.Force, waiting, func(partial string) error {
		for _, step := range []struct {
			name string
			do   func(context.Context) error
		}{
			{"reading", r.read},
			{"laying the lattice", r.place},
			{"fitting", r.fit},
			{"testing", r.test},
			{"comparing", r.compare},
			{"predicting", r.predict},
			{"looking at places", r.assess},
			{"adding up zones", r.addUp},
			{"adding up the region", r.addUpRegion},
		} {
			ev.Stage(step.name, 0, 0)
			if err := step.do(ctx); err != nil {
				return err
			}
		}
		r.describe()
		return r.write(ctx, partial)
	})
	if err != nil {
		return summary.Document{}, err
	}
	return r.document, nil
}

// predict evaluates the surface on the target and states it in the reporting unit.
func (r *run) predict(ctx context.Context) error {
	var err error
	if r.reporting, err = r.report(); err != nil {
		return err
	}
	r.estimates, err = estimate(ctx, r.surface, r.reporting.Reporting, r.target.places, r.target.covariates)
	if err != nil {
		return err
	}
	r.estimates.outside = r.beyondData()
	all := r.obs.points() // neighbours' rows too: where they are, the surface rests on data
	r.estimates.nearest = grids.Nearest(all.X, all.Y, r.target.places.X, r.target.places.Y)
	return nil
}

// saved is the fitted surface as the archive keeps it.
func (r *run) saved() archive.Saved {
	x, y := distinctPlaces(r.obs.points())
	return archive.Saved{Surface: r.surface.State(), Program: r.version, Reporting: r.reporting.Reporting, PlaceX: x, PlaceY: y}
}

// refusal is a request or an input that is wrong, with what to do about it.
type refusal struct {
	error
	advice string
}

func (e *refusal) Hint() string  { return e.advice }
func (e *refusal) Unwrap() error { return e.error }

// refuse words a refusal as fmt.Errorf does; without advice of its own it passes on that of a wrapped error.
func refuse(advice, format string, args ...any) error {
	err := fmt.Errorf(format, args...)
	var hinted interface{ Hint() string }
	if advice == "" && errors.As(err, &hinted) {
		advice = hinted.Hint()
	}
	return &refusal{err, advice}
}
