package pipeline

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"errors"
	"fmt"
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
	table  *observe.Table
	own    int // the first rows, which are reported; those after them are of neighbouring regions
	sha256 string
	system crs.System
	said   string // how the coordinates were taken, in words
	data   spatial.Data

	placeX, placeY []float64 // distinct places of its own, sorted by x, then y
	spacing        float64   // median distance from one to the nearest other
}

// read reads the table of observations and puts it into the plane.
func (r *run) read(ctx context.Context) error {
	want, err := r.request()
	if err != nil {
		return err
	}
	o := &observations{}
	if o.table, o.sha256, err = r.readRows(ctx, want); err != nil {
		return err
	}
	if err := withinReach(o.table, *r.settings.Response, *r.settings.Distribution); err != nil {
		return err
	}
	o.own = o.table.Len()
	if err := r.readBeyond(o, want); err != nil {
		return err
	}
	if err := o.project(r.settings); err != nil {
		return err
	}
	o.placeX, o.placeY = distinctPlaces(o.ownPlaces())
	o.spacing = grids.MedianSpacing(o.placeX, o.placeY)
	o.data.Response = o.table.Column(*r.settings.Response).Number
	if _, column := r.settings.Denominator(); column != "" {
		o.data.Exposure = o.table.Column(column).Number
	}
	if c := r.settings.Trials; c != nil {
		o.data.Trials = o.table.Column(*c).Number
	}
	if c := r.settings.Weight; c != nil {
		o.data.Weight = o.table.Column(*c).Number
	}
	o.data.Covariates = covariates(o.table, r.settings)
	r.obs = o
	return nil
}

// readRows reads the region's own rows.
func (r *run) readRows(ctx context.Context, want observe.Request) (*observe.Table, string, error) {
	if r.region == nil || r.region.Rows == nil {
		return readTable(ctx, *r.settings.Observations, want)
	}
	t, err := observe.ReadPart(*r.region.Rows, want)
	return t, r.region.Rows.SHA256(), err
}

// readBeyond adds the rows of neighbouring regions. What is wrong with them is told where they are reported.
func (r *run) readBeyond(o *observations, want observe.Request) error {
	if r.region == nil {
		return nil
	}
	want.Strict = false
	for _, p := range r.region.Beyond {
		t, err := observe.ReadPart(p, want)
		if err == nil {
			err = withinReach(t, *r.settings.Response, *r.settings.Distribution)
		}
		var unusable *observe.Error
		if errors.As(err, &unusable) {
			continue
		}
		if err == nil {
			err = o.table.Append(t)
		}
		if err != nil {
			return err
		}
	}
	return nil
}

// ownPlaces are the places of the rows that are reported.
func (o *observations) ownPlaces() spatial.Places {
	return spatial.Places{X: o.data.Places.X[:o.own], Y: o.data.Places.Y[:o.own]}
}

// withinReach refuses a measurement that its distribution cannot have. To set such rows aside would raise the level.
func withinReach(t *observe.Table, response, distribution string) error {
	for i, y := range t.Column(response).Number {
		fault := &observe.Error{File: t.Source, Line: int(t.Line[i]), Row: int(t.Row[i]), Column: response,
			Value: strconv.FormatFloat(y, 'g', -1, 64)}
		switch {
		case distribution == plan.Gamma && y == 0:
			fault.What, fault.Advice = "a gamma distribution has no 0", "use --distribution tweedie, in which amounts can be 0"
		case (distribution == plan.Gamma || distribution == plan.Tweedie) && y < 0:
			fault.What = "a " + distribution + " distribution has no negative values: " + strconv.Quote(fault.Value)
			fault.Advice = "correct the row, or use --distribution gaussian"
		default:
			continue
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
	if s.X != nil {
		want.X, want.Y = *s.X, *s.Y
	}
	var err error
	want.Axes, err = Axes(s)
	return want, err
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
	t, err := observe.ReadCSV(io.TeeReader(from, sum), filepath.Base(path), want)
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

// project puts the rows into the plane: degrees into an equal-area plane around them, a plane as it is.
func (o *observations) project(s plan.Settings) error {
	x, y := o.table.XY()
	columns := fmt.Sprintf("columns %s, %s", o.table.XName, o.table.YName)
	if o.table.Degrees {
		system, err := crs.AzimuthalAround(x[:o.own], y[:o.own])
		if err != nil {
			return refuse("", "%s: %w", o.table.Source, err)
		}
		o.system = system
		for i := range x {
			x[i], y[i] = system.Forward(x[i], y[i])
		}
		o.said = columns + " taken as longitude and latitude, in an equal-area plane around them"
	} else {
		o.system = crs.Local{}
		o.said = columns + " taken as local metres"
		if s.CRS != nil {
			var err error
			if o.system, err = crs.Parse(*s.CRS); err != nil {
				return refuse("", "--crs: %w", err)
			}
			if o.system.Geographic() && inRangeOfDegrees(x, y) {
				return refuse("leave out --crs for longitude and latitude, or name other columns with --x and --y",
					"%s: %s run from %.6g to %.6g and from %.6g to %.6g, which looks like degrees and not like metres of %s",
					o.table.Source, columns, slices.Min(x), slices.Max(x), slices.Min(y), slices.Max(y), o.system.Code())
			}
			o.said = columns + " taken as " + o.system.Code() + " in metres"
		}
	}
	o.data.Places = spatial.Places{X: x, Y: y}
	return o.onThePlane(x, y)
}

// inRangeOfDegrees reports whether all coordinates could be degrees. In a national or world-wide plane that would be one
// spot of some hundred metres at its origin, where nobody is.
func inRangeOfDegrees(x, y []float64) bool {
	for i := range x {
		if math.Abs(x[i]) > 360 || math.Abs(y[i]) > 90 {
			return false
		}
	}
	return true
}

// onThePlane refuses coordinates where the projection is not defined: they are in another system than was said.
func (o *observations) onThePlane(x, y []float64) error {
	for i := range x {
		if scale := o.system.AreaScale(x[i], y[i]); math.IsNaN(x[i]) || math.IsNaN(scale) {
			p := o.table.Geometry[i].Bound().Min
			return &observe.Error{File: o.table.Source, Line: int(o.table.Line[i]), Row: int(o.table.Row[i]),
				What:   fmt.Sprintf("the place (%g, %g) lies outside of %s", p[0], p[1], o.system.Code()),
				Advice: "say what the coordinates are with --crs, or name their columns with --x and --y"}
		}
	}
	return nil
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
	return p.Check(want)
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
