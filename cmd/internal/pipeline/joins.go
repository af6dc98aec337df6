package pipeline

import (
	"context"
	"path/filepath"
	"slices"
	"strconv"
	"strings"

	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// source is where rows are read from: a file, or a part of a table that several regions share.
type source struct {
	name    string
	columns func(context.Context) ([]string, error)
	read    func(context.Context, observe.Request) (*observe.Table, error)
}

// fileSource is a file of observations or of what belongs to them. The checksum is told to sum, if it is not nil.
func fileSource(path string, format observe.Format, sum *string) source {
	return source{
		name:    filepath.Base(path),
		columns: func(ctx context.Context) ([]string, error) { return columnsOf(ctx, path, format) },
		read: func(ctx context.Context, want observe.Request) (*observe.Table, error) {
			t, checksum, err := readTable(ctx, path, want)
			if sum != nil {
				*sum = checksum
			}
			return t, err
		},
	}
}

// partSource is a part of a table.
func partSource(p observe.Part) source {
	return source{
		name:    p.Source(),
		columns: func(context.Context) ([]string, error) { return p.Columns(), nil },
		read: func(_ context.Context, want observe.Request) (*observe.Table, error) {
			return observe.ReadPart(p, want)
		},
	}
}

// columnsOf reads the names of a file's columns.
func columnsOf(ctx context.Context, path string, format observe.Format) ([]string, error) {
	raster, err := isRaster(path)
	if err != nil {
		return nil, err
	}
	if raster {
		r, file, err := openRaster(path)
		if err != nil {
			return nil, err
		}
		defer file.Close()
		return rasterColumns(r), nil
	}
	f, err := openFile(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return observe.Columns(&stoppable{ctx: ctx, from: f}, filepath.Base(path), format)
}

// joins are the files that rows take places and columns from, by the key that they have in common.
type joins struct {
	sides  []side // the joined tables in the order they were named, then the places
	absent observe.Absent
	// others says that the file of places has those of other regions too, and nothing tells them apart: that one has no
	// row then means nothing.
	others bool
}

// side is one of the files.
type side struct {
	source
	key     string // the column that holds its keys
	columns []string
	places  bool
	sha256  string
	want    observe.Request
	split   string         // of places: the column that says which region they are of; empty where all are the region's
	region  string         // the value there
	table   *observe.Table // once it is read
	lost    observe.Lost   // its rows that cannot be used
}

// openJoins finds out which columns the joined files have. It returns nil where none are named.
func openJoins(ctx context.Context, s plan.Settings) (*joins, error) {
	if s.Places == nil && len(s.Join) == 0 {
		return nil, nil
	}
	j := &joins{}
	if s.Absent != nil {
		j.absent = map[string]observe.Absent{plan.AbsentZero: observe.AbsentZero, plan.AbsentMissing: observe.AbsentMissing}[*s.Absent]
	}
	paths := slices.Clone(s.Join)
	if s.Places != nil {
		paths = append(paths, *s.Places)
	}
	j.sides = make([]side, len(paths))
	for k, path := range paths {
		d := &j.sides[k]
		d.source, d.places = fileSource(path, Format(s), &d.sha256), s.Places != nil && k == len(s.Join)
		var err error
		if d.columns, err = d.source.columns(ctx); err != nil {
			return nil, err
		}
	}
	return j, nil
}

// forRegion has the places be those of one region of a table that several share, which a property of the same name as
// the column that the table is split by can tell.
func (j *joins) forRegion(g *Region) error {
	side := j.placesSide()
	if side == nil || g == nil || g.Rows == nil {
		return nil
	}
	if slices.Contains(side.columns, g.SplitBy) {
		side.split, side.region = g.SplitBy, g.Rows.Name
		return nil
	}
	if j.absent == observe.AbsentZero {
		return refuse("give the places a property "+strconv.Quote(g.SplitBy)+", or say --absent missing",
			"%s: nothing says which places are of region %q, so it is not known which of them have no row", side.name, g.Rows.Name)
	}
	j.absent, j.others = observe.AbsentMissing, true
	return nil
}

// columns are those of all the files.
func (j *joins) columns() (list []string) {
	if j != nil {
		for _, d := range j.sides {
			list = append(list, d.columns...)
		}
	}
	return list
}

// placesSide is the file of places; nil where there is none.
func (j *joins) placesSide() *side {
	if j == nil || !j.sides[len(j.sides)-1].places {
		return nil
	}
	return &j.sides[len(j.sides)-1]
}

// findKey settles the column of the keys: what the property is called, or a column that is called as that of the
// observations.
func (d *side) findKey(k plan.Key) error {
	for _, name := range []string{k.Property, k.Column} {
		if slices.Contains(d.columns, name) {
			d.key = name
			return nil
		}
	}
	advice := "say with --key " + quoted(k.Column+"=PROPERTY") + " what the key is called in this file"
	if near, ok := plan.Nearest(k.Property, d.columns); ok {
		advice = "did you mean " + quoted(k.Column+"="+near) + "?"
	}
	return refuse(advice, "%s: there is no column %q to join by; the columns are %s", d.name, k.Property, strings.Join(firstFew(d.columns), ", "))
}

// shareOut says which file gives which column: the observations what they have, then the joined tables in their order,
// then the file of places. What is left of the request is for the observations.
func (j *joins) shareOut(want observe.Request, own source, have []string, key plan.Key) (observe.Request, error) {
	for k := range j.sides {
		d := &j.sides[k]
		if err := d.findKey(key); err != nil {
			return want, err
		}
		d.want = observe.Request{Format: want.Format, Strict: want.Strict, Keep: []string{d.key}, NoPlaces: !d.places, Called: map[string]string{d.key: "key"}}
		if d.places {
			d.want.X, d.want.Y, d.want.Geometry, d.want.Axes = want.X, want.Y, want.Geometry, want.Axes
			want.X, want.Y, want.Geometry, want.NoPlaces = "", "", "", true
		}
	}
	s := sharing{joins: j, own: own.name, have: have}
	s.one(&want.Trials, "number of trials")
	s.one(&want.Denominator, "denominator")
	s.one(&want.Weight, "weight")
	s.list(&want.Factor, func(name string) string { return want.Called[name] }, func(d *side, name string) { d.askFactor(name, want.Called[name]) })
	s.list(&want.Linear, func(string) string { return "covariate" }, func(d *side, name string) { d.want.Linear = append(d.want.Linear, name) })
	s.list(&want.Category, func(string) string { return "category" }, func(d *side, name string) { d.want.Category = append(d.want.Category, name) })
	if want.Kind == observe.Positives && want.Trials == "" {
		want.Kind = observe.Count // the join holds it against the trials
	}
	return want, s.err
}

// askFactor has a side give a column of numbers above 0.
func (d *side) askFactor(name, called string) {
	d.want.Factor = append(d.want.Factor, name)
	d.want.Called[name] = called
}

// sharing deals columns out to the files that have them. The first that no file has is its error.
type sharing struct {
	*joins
	own  string   // name of the observations
	have []string // their columns
	err  error
}

// one leaves a column to the observations or has a side give it, and clears its name then.
func (s *sharing) one(name *string, called string) {
	if *name == "" || s.err != nil {
		return
	}
	if d := s.sideOf(*name, called); d != nil {
		d.askFactor(*name, called)
		*name = ""
	}
}

// list does so for several columns, each of which is called something in messages.
func (s *sharing) list(names *[]string, called func(name string) string, ask func(d *side, name string)) {
	var own []string
	for _, name := range *names {
		if s.err != nil {
			return
		}
		if d := s.sideOf(name, called(name)); d != nil {
			ask(d, name)
		} else {
			own = append(own, name)
		}
	}
	*names = own
}

// sideOf finds who has a column: nil for the observations.
func (s *sharing) sideOf(name, called string) *side {
	if slices.Contains(s.have, name) {
		return nil
	}
	files, all := []string{s.own}, slices.Clone(s.have)
	for k := range s.sides {
		d := &s.sides[k]
		if slices.Contains(d.columns, name) {
			return d
		}
		files, all = append(files, d.name), append(all, d.columns...)
	}
	s.err = absentColumn(strings.Join(files, ", "), name, "the "+called, all)
	return nil
}

// absentColumn refuses a column that no file has.
func absentColumn(files, name, part string, among []string) error {
	advice := "the columns are " + strings.Join(firstFew(distinct(among)), ", ")
	if near, ok := plan.Nearest(name, among); ok {
		advice = "did you mean " + quoted(near) + "?"
	}
	return refuse(advice, "%s: there is no column %q for %s", files, name, part)
}

// distinct leaves out names that several files have.
func distinct(names []string) (list []string) {
	for _, name := range names {
		list = add(list, name)
	}
	return list
}

// join gives the rows of a table what they take from the other files, which are read once.
func (j *joins) join(ctx context.Context, t *observe.Table, from source, want observe.Request, key string) (observe.JoinReport, error) {
	spec := observe.Join{Key: key, Absent: j.absent, Response: want.Response, Trials: want.Trials, Keep: want.Keep, Strict: want.Strict}
	var err error
	if spec.Lost, err = lostKeys(ctx, t, from, key, want.Format); err != nil {
		return observe.JoinReport{}, err
	}
	for k := range j.sides {
		d := &j.sides[k]
		if err := d.readOnce(ctx); err != nil {
			return observe.JoinReport{}, err
		}
		spec.Sides = append(spec.Sides, observe.Side{Table: d.table, Key: d.key, Places: d.places, Lost: d.lost,
			Take: slices.Concat(d.want.Factor, d.want.Linear, d.want.Category)})
	}
	return t.Join(spec)
}

// readOnce reads the file. Several tables of a run may be joined to it.
func (d *side) readOnce(ctx context.Context) (err error) {
	if d.table != nil {
		return nil
	}
	if d.split != "" {
		d.want.Keep = add(d.want.Keep, d.split)
	}
	if d.table, err = d.source.read(ctx, d.want); err != nil {
		return err
	}
	if d.split != "" {
		d.table.Only(d.split, d.region)
	}
	d.lost, err = lostKeys(ctx, d.table, d.source, d.key, d.want.Format)
	return err
}

// unseen are the keys of the places that are without a row because nobody looked there.
func (j *joins) unseen(report observe.JoinReport) []string {
	if j.others || j.absent != observe.AbsentMissing {
		return nil
	}
	return report.Absent
}

// describeJoins says what became of the keys in each of the files.
func (r *run) describeJoins() []summary.Joined {
	if r.joins == nil {
		return nil
	}
	var list []summary.Joined
	for k, d := range r.joins.sides {
		report := r.obs.joined.Sides[k]
		j := summary.Joined{Name: d.name, SHA256: d.sha256, Key: d.key, Places: d.places,
			Rows: report.Matched, Unmatched: len(report.WithoutMatch), Unused: len(report.Unused), WithoutKey: report.WithoutKey}
		if d.places {
			j.Added = r.obs.joined.Added
		}
		list = append(list, j)
	}
	return list
}
