package pipeline

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"io"
	"math"
	"os"
	"path/filepath"
	"slices"
	"sort"
	"strconv"

	"drumlin/grids"
	"drumlin/grids/crs"
	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/spatial"
)

// observations are the rows that can be used, in the plane.
type observations struct {
	table   *observe.Table
	own     int // the first rows, which are reported; those after them are of neighbouring regions
	sha256  string
	system  crs.System
	said    string // how the coordinates were taken, in words
	data    spatial.Data
	joined  observe.JoinReport
	summed  int      // rows that were added up into others
	thinned thinning // of a raster

	x, y    []float64 // a place for each row, in the plane: of a line or an area, its middle
	places  []place   // the places of the rows; nil where every row is a point and none has a key
	placeOf []int32   // of each row
	apart   float64   // metres between the points that stand for an area or a line, at most; 0 where rows are points

	placeX, placeY []float64 // distinct places of its own rows, sorted by x, then y
	spacing        float64   // median distance from one to the nearest other
}

// read reads the table of observations and puts it into the plane.
func (r *run) read(ctx context.Context) error {
	want, err := r.request()
	if err != nil {
		return err
	}
	o := &observations{}
	if r.joins, err = openJoins(ctx, r.settings); err != nil {
		return err
	}
	if err := r.joins.forRegion(r.region); err != nil {
		return err
	}
	if err := r.readRows(ctx, o, want); err != nil {
		return err
	}
	if err := r.readBeyond(ctx, o, want); err != nil {
		return err
	}
	for again := true; again; { // without the rows that a layer lacks a value for
		if err := o.project(r.settings); err != nil {
			return err
		}
		if again, err = r.sampleRows(ctx, o); err != nil {
			return err
		}
	}
	if err := o.addUnseen(r.joins); err != nil {
		return err
	}
	o.placeX, o.placeY = distinctPlaces(o.ownPlaces())
	o.spacing = grids.MedianSpacing(o.placeX, o.placeY)
	o.data.Response = o.table.Column(*r.settings.Response).Number
	if o.data.Exposure, err = exposure(o.table, r.settings); err != nil {
		return err
	}
	if o.data.Factor, err = sharedFactor(o.table, r.settings); err != nil {
		return err
	}
	if c := r.settings.Trials; c != nil {
		o.data.Trials = o.table.Column(*c).Number
		for i, m := range o.data.Trials { // of a joined table they are read as what they are held against, not as counts
			if m != math.Trunc(m) {
				return faultIn(o.table, i, *c, m, "is not a whole number, as a number examined is", "correct the value")
			}
		}
	}
	if c := r.settings.Weight; c != nil {
		o.data.Weight = o.table.Column(*c).Number
	}
	o.data.Covariates = covariates(o.table, r.settings)
	r.obs = o
	return nil
}

// readRows reads the region's own rows.
func (r *run) readRows(ctx context.Context, o *observations, want observe.Request) error {
	from, err := r.source(o, want.Format)
	if err != nil {
		return err
	}
	got, err := r.rowsOf(ctx, from, want)
	if err != nil {
		return err
	}
	o.table, o.own, o.joined, o.summed = got.table, got.table.Len(), got.joined, got.summed
	return nil
}

// source is where the region's own rows are read from. Its checksum is told when they are, and how a raster was thinned.
func (r *run) source(o *observations, format observe.Format) (source, error) {
	if r.region != nil && r.region.Rows != nil {
		o.sha256 = r.region.Rows.SHA256()
		return partSource(*r.region.Rows), nil
	}
	path := *r.settings.Observations
	raster, err := isRaster(path)
	if raster {
		return rasterSource(path, &o.sha256, &o.thinned), nil
	}
	return fileSource(path, format, &o.sha256), err
}

// readBeyond adds the rows of neighbouring regions. What is wrong with them is told where they are reported.
func (r *run) readBeyond(ctx context.Context, o *observations, want observe.Request) error {
	if r.region == nil || len(r.region.Beyond) == 0 {
		return nil
	}
	want.Strict = false
	neighbours := &run{settings: r.settings}
	var err error
	if neighbours.joins, err = openJoins(ctx, r.settings); err != nil {
		return err
	}
	if j := neighbours.joins; j != nil {
		j.absent = observe.AbsentMissing // where the neighbours have no row is theirs to say
	}
	for _, p := range r.region.Beyond {
		got, err := neighbours.rowsOf(ctx, partSource(p), want)
		var unusable *observe.Error
		if errors.As(err, &unusable) {
			continue
		}
		if err == nil {
			err = o.table.Append(got.table)
		}
		if err != nil {
			return err
		}
	}
	return nil
}

// rowsRead are rows with all that other files give them.
type rowsRead struct {
	table  *observe.Table
	joined observe.JoinReport
	summed int
}

// rowsOf reads rows, adds up those that are to be one, and joins them to the other files.
func (r *run) rowsOf(ctx context.Context, from source, want observe.Request) (got rowsRead, err error) {
	own := want
	if r.joins != nil || len(r.keys()) > 0 || len(r.settings.Layer) > 0 {
		have, err := from.columns(ctx)
		if err != nil {
			return got, err
		}
		own = withoutLayers(r.settings, own, slices.Concat(have, r.joins.columns()))
		if by := r.settings.SumBy; by != nil && !slices.Contains(have, *by) {
			return got, absentColumn(from.name, *by, "--sum-by", have)
		}
		if key := r.settings.Key; key != nil && !slices.Contains(have, key.Column) {
			return got, absentColumn(from.name, key.Column, "the key", have)
		}
		if r.joins != nil {
			if own, err = r.joins.shareOut(own, from, have, *r.settings.Key); err != nil {
				return got, err
			}
		}
	}
	if got.table, err = from.read(ctx, own); err != nil {
		return got, err
	}
	if got.summed, err = r.sumRows(ctx, got.table, from, own); err != nil {
		return got, err
	}
	if r.joins != nil {
		if got.joined, err = r.joins.join(ctx, got.table, from, want, r.settings.Key.Column); err != nil {
			return got, err
		}
	}
	return got, withinReach(got.table, *r.settings.Response, *r.settings.Distribution)
}

// sumRows makes one row of those that belong together, and returns how many went into others. Where what the sum is held
// against comes from elsewhere, or is not there, no row of it may be missing.
func (r *run) sumRows(ctx context.Context, t *observe.Table, from source, q observe.Request) (int, error) {
	if r.settings.SumBy == nil {
		return 0, nil
	}
	by := *r.settings.SumBy
	o := observe.Summing{Add: []string{q.Response}, Strict: q.Strict, Whole: q.Trials == "" && q.Denominator == ""}
	for _, c := range []string{q.Trials, q.Denominator} {
		if c != "" {
			o.Add = append(o.Add, c)
		}
	}
	var err error
	if o.Whole {
		if o.Lost, err = lostKeys(ctx, t, from, by, q.Format); err != nil {
			return 0, err
		}
	}
	sums, err := t.SumBy(by, o)
	return sums.From - sums.Into, err
}

// lostKeys are those of the rows that a table has set aside, which takes another look at where it comes from.
func lostKeys(ctx context.Context, t *observe.Table, from source, key string, format observe.Format) (observe.Lost, error) {
	if len(t.Aside) == 0 {
		return observe.Lost{}, nil
	}
	all, err := from.read(ctx, observe.Request{NoPlaces: true, Keep: []string{key}, Format: format})
	if err != nil {
		return nil, err
	}
	return t.Lost(all, key), nil
}

// withinReach refuses a measurement that its distribution cannot have. To set such rows aside would raise the level.
func withinReach(t *observe.Table, response, distribution string) error {
	if distribution != plan.Gamma && distribution != plan.Tweedie {
		return nil
	}
	for i, y := range t.Column(response).Number {
		if y > 0 || y == 0 && distribution == plan.Tweedie {
			continue
		}
		fault := atRow(t, i)
		fault.Column, fault.Value = response, strconv.FormatFloat(y, 'g', -1, 64)
		fault.What, fault.Advice = "a gamma distribution has no 0", "use --distribution tweedie, in which amounts can be 0"
		if y < 0 {
			fault.What = "a " + distribution + " distribution has no negative values: " + strconv.Quote(fault.Value)
			fault.Advice = "correct the row, or use --distribution gaussian"
		}
		return fault
	}
	return nil
}

// request says which columns the settings need and what they must hold.
func (r *run) request() (observe.Request, error) {
	s := r.settings
	want := observe.Request{Response: *s.Response, Kind: observe.Measure, Linear: allCovariates(s, plan.Settings.Numbers),
		Category: allCovariates(s, everyCategory), Strict: *s.Strict, Format: Format(s)}
	switch *s.Distribution {
	case plan.Poisson, plan.NegativeBinomial:
		want.Kind = observe.Count
	case plan.Binomial, plan.BetaBinomial:
		want.Kind = observe.Positives
		want.Trials = *s.Trials
	}
	_, want.Denominator = s.Denominator()
	if s.Weight != nil {
		want.Weight = *s.Weight
	}
	locate(&want, s)
	want.Factor = s.Exposure()
	if cv := s.ExposureCV; cv != nil && cv.Column != "" {
		want.Linear = add(want.Linear, cv.Column) // 0 is a coefficient of variation
	}
	if s.ExposureStrata != nil {
		want.Category = add(want.Category, *s.ExposureStrata)
	}
	for _, key := range r.keys() {
		want.Keep = add(want.Keep, key)
	}
	want.Called = called(s)
	var err error
	want.Axes, err = Axes(s)
	return want, err
}

// called says what columns are in messages.
func called(s plan.Settings) map[string]string {
	names := map[string]string{}
	for _, one := range []struct {
		amount *plan.Amount
		name   string
	}{{s.Width, "width"}, {s.Detection, "share detected"}} {
		if one.amount != nil && one.amount.Column != "" {
			names[one.amount.Column] = one.name
		}
	}
	if s.SumBy != nil {
		names[*s.SumBy] = "key to sum by"
	}
	if s.Key != nil {
		names[s.Key.Column] = "key"
	}
	return names
}

// keys are the columns that rows are told apart by.
func (r *run) keys() (list []string) {
	if r.settings.Key != nil {
		list = append(list, r.settings.Key.Column)
	}
	if r.settings.SumBy != nil {
		list = append(list, *r.settings.SumBy)
	}
	return list
}

// add appends a name unless it is in the list.
func add(list []string, name string) []string {
	if slices.Contains(list, name) {
		return list
	}
	return append(slices.Clone(list), name)
}

// locate names the columns of the coordinates, where the settings do.
func locate(q *observe.Request, s plan.Settings) {
	if s.X != nil {
		q.X, q.Y = *s.X, *s.Y
	}
	if s.Geometry != nil {
		q.Geometry = *s.Geometry
	}
}

// Format says how the tables are written, as far as the settings do.
func Format(s plan.Settings) observe.Format {
	f := observe.Format{Missing: s.Missing, DecimalComma: s.DecimalComma != nil && *s.DecimalComma}
	if s.Separator != nil {
		f.Separator = map[string]rune{plan.Comma: ',', plan.Semicolon: ';', plan.Tab: '\t', plan.Pipe: '|'}[*s.Separator]
	}
	if s.BelowLimit != nil {
		f.BelowLimit = map[string]observe.BelowLimit{plan.HalfLimit: observe.HalfLimit, plan.AtLimit: observe.AtLimit, plan.AsideLimit: observe.AsideLimit}[*s.BelowLimit]
	}
	return f
}

// Axes says what the coordinates are, as far as --crs does.
func Axes(s plan.Settings) (observe.Axes, error) {
	switch {
	case s.CRS == nil:
		return observe.AxesByName, nil
	case crs.IsGeographic(*s.CRS):
		return observe.AxesDegrees, nil
	}
	if _, err := crs.Parse(*s.CRS); err != nil {
		return 0, refuse("", "--crs: %w", err)
	}
	return observe.AxesPlane, nil
}

// covariates takes the covariates' columns out of a table.
func covariates(t *observe.Table, s plan.Settings) []spatial.Covariate {
	var list []spatial.Covariate
	for _, name := range allCovariates(s, plan.Settings.Numbers) {
		list = append(list, spatial.Covariate{Name: name, Number: t.Column(name).Number})
	}
	for _, name := range allCovariates(s, everyCategory) {
		c := t.Column(name)
		list = append(list, spatial.Covariate{Name: name, Code: c.Code, Level: c.Level})
	}
	return list
}

// everyCategory lists categories and groups.
func everyCategory(s plan.Settings) []string { return slices.Concat(s.Categories(), s.Group) }

// readTable reads a file and its checksum in one go.
func readTable(ctx context.Context, path string, want observe.Request) (*observe.Table, string, error) {
	f, err := openFile(path)
	if err != nil {
		return nil, "", err
	}
	defer f.Close()
	sum := sha256.New()
	from := &stoppable{ctx: ctx, from: f}
	t, err := observe.Read(io.TeeReader(from, sum), filepath.Base(path), want)
	if err != nil {
		return nil, "", err
	}
	if _, err := io.Copy(sum, from); err != nil { // what the reader left unread
		return nil, "", err
	}
	return t, hex.EncodeToString(sum.Sum(nil)), nil
}

// openFile opens a file for reading, and says in plain words why it cannot.
func openFile(path string) (*os.File, error) {
	f, err := os.Open(path)
	switch {
	case os.IsNotExist(err):
		return nil, refuse("check the name and the folder you are in", "%s: there is no such file", path)
	case os.IsPermission(err):
		return nil, refuse("ask for the right to read it", "%s: the file may not be read", path)
	case err != nil:
		return nil, err
	}
	if info, err := f.Stat(); err == nil && info.IsDir() {
		f.Close()
		return nil, refuse("name a file in it", "%s: that is a folder", path)
	}
	return f, nil
}

// distinctPlaces returns the distinct places sorted by x, then y.
func distinctPlaces(at spatial.Places) (x, y []float64) {
	order := make([]int, at.Len())
	for i := range order {
		order[i] = i
	}
	sort.Slice(order, func(a, b int) bool {
		i, j := order[a], order[b]
		if at.X[i] != at.X[j] {
			return at.X[i] < at.X[j]
		}
		return at.Y[i] < at.Y[j]
	})
	for _, i := range order {
		if n := len(x); n == 0 || x[n-1] != at.X[i] || y[n-1] != at.Y[i] {
			x, y = append(x, at.X[i]), append(y, at.Y[i])
		}
	}
	return x, y
}

// Open opens a file for reading until ctx is cancelled.
func Open(ctx context.Context, path string) (io.ReadCloser, error) {
	f, err := openFile(path)
	if err != nil {
		return nil, err
	}
	return struct {
		io.Reader
		io.Closer
	}{&stoppable{ctx: ctx, from: f}, f}, nil
}

// ReadShared reads a whole table into memory, for several regions to take their rows from. The settings say how it is
// written; nothing else in them is looked at.
func ReadShared(ctx context.Context, s plan.Settings, path string) (*observe.Shared, error) {
	f, err := openFile(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	return observe.WholeAs(&stoppable{ctx: ctx, from: f}, filepath.Base(path), Format(s))
}

// CheckColumns refuses settings that name columns which a table does not have, before any row of it is read.
func CheckColumns(s plan.Settings, p observe.Part) error {
	want, err := (&run{settings: s}).request()
	if err != nil {
		return err
	}
	if s.Places != nil || len(s.Join) > 0 { // which file has a column is found out when the region is read
		want = observe.Request{Response: want.Response, Keep: want.Keep, Called: want.Called, Format: want.Format, NoPlaces: true, Kind: observe.Measure}
	}
	return p.Check(withoutLayers(s, want, p.Columns()))
}

// ReadFile reads a small file of at most that many bytes.
func ReadFile(path string, most int64) ([]byte, error) {
	f, err := openFile(path)
	if err != nil {
		return nil, err
	}
	defer f.Close()
	text, err := io.ReadAll(io.LimitReader(f, most+1))
	if err == nil && int64(len(text)) > most {
		err = refuse("check that this is the right file", "%s: the file is larger than %d MiB", path, most>>20)
	}
	return text, err
}

// FileSHA256 is the checksum of a file.
func FileSHA256(ctx context.Context, path string) (string, error) {
	f, err := openFile(path)
	if err != nil {
		return "", err
	}
	defer f.Close()
	sum := sha256.New()
	if _, err := io.Copy(sum, &stoppable{ctx: ctx, from: f}); err != nil {
		return "", err
	}
	return hex.EncodeToString(sum.Sum(nil)), nil
}
