package inspect

import (
	"context"
	"fmt"
	"math"
	"strconv"

	"drumlin/grids/crs"
	"drumlin/io/geotiff"
	"drumlin/io/plan"
)

// RasterReport is all that is said about a raster. Its JSON has always the same keys; what is not known is null or empty.
type RasterReport struct {
	File        string       `json:"file"`   // as it was named
	Format      string       `json:"format"` // "GeoTIFF" or "ASCII grid raster"
	Width       int          `json:"width"`  // columns of cells
	Height      int          `json:"height"` // rows of cells
	System      RasterSystem `json:"system"`
	CellWidth   float64      `json:"cell_width"` // in the unit
	CellHeight  float64      `json:"cell_height"`
	Unit        string       `json:"unit"` // "degrees", "metres" or "unknown"
	West        float64      `json:"west"` // outer edges
	South       float64      `json:"south"`
	East        float64      `json:"east"`
	North       float64      `json:"north"`
	ValuesOf    string       `json:"values_of"` // "areas" of the cells or "points", their centres
	BlockWidth  int          `json:"block_width"`
	BlockHeight int          `json:"block_height"`
	Overviews   int          `json:"overviews"`
	Bands       []RasterBand `json:"bands"`
	Findings    []Finding    `json:"findings"` // their columns are bands
	Proposal    *Proposal    `json:"proposal"` // null where no band can be mapped
}

// RasterSystem is the coordinate system of a raster.
type RasterSystem struct {
	Code     string `json:"code"`     // as the file has it; empty where it has none
	Name     string `json:"name"`     // empty where the code is not known
	Known    bool   `json:"known"`    // map can take the code
	Citation string `json:"citation"` // what the file says in words
	Said     string `json:"said"`     // what was said in its place; empty for nothing
}

// RasterBand is a band in the report. Figures are of the finite values, and null where there are none.
type RasterBand struct {
	Name     string   `json:"name"`
	Kind     string   `json:"kind"`    // of the stored numbers, such as "uint8" or "float32"
	NoData   string   `json:"no_data"` // the stored number that the file declares for cells without a value; empty for none
	Scale    float64  `json:"scale"`
	Offset   float64  `json:"offset"`
	Missing  int      `json:"missing"` // cells without a value
	Infinite int      `json:"infinite"`
	Least    *float64 `json:"least"`
	Mean     *float64 `json:"mean"`
	Most     *float64 `json:"most"`
}

// ExamineRaster makes the report of a raster, of which every cell is read, block by block. The path as Observations and
// words that go into the proposal as they are, such as CRS, are in said. An error is that of reading, or of ctx.
func ExamineRaster(ctx context.Context, r *geotiff.Raster, said plan.Settings) (RasterReport, error) {
	tallies, err := tally(ctx, r)
	if err != nil {
		return RasterReport{}, err
	}
	e := &rasterExaminer{raster: r, said: said, tallies: tallies}
	e.report = RasterReport{File: *said.Observations, Format: geoTIFF, Width: r.Width, Height: r.Height, System: systemOf(r, said.CRS),
		CellWidth: r.CellX, CellHeight: r.CellY, ValuesOf: "areas", BlockWidth: r.BlockWidth, BlockHeight: r.BlockHeight, Overviews: r.Overviews,
		Findings: []Finding{}}
	e.report.Unit = unitOf(r, e.report.System)
	e.report.West, e.report.South, e.report.East, e.report.North = r.Bounds()
	if r.Bands[0].Kind == geotiff.Text {
		e.report.Format = asciiGrid
	}
	if r.PixelIsPoint {
		e.report.ValuesOf = "points"
	}
	for i, b := range r.Bands {
		e.report.Bands = append(e.report.Bands, bandReport(b, tallies[i]))
	}
	e.system()
	e.size()
	e.sameNames()
	for i, b := range r.Bands {
		e.values(b, tallies[i])
	}
	e.propose()
	return e.report, nil
}

// The formats of rasters.
const (
	geoTIFF   = "GeoTIFF"
	asciiGrid = "ASCII grid raster"
)

// rasterExaminer collects what is found about a raster.
type rasterExaminer struct {
	raster  *geotiff.Raster
	said    plan.Settings
	tallies []bandTally
	report  RasterReport
}

func (e *rasterExaminer) look(code, sentence string, bands ...string) {
	e.report.Findings = append(e.report.Findings, Finding{Look, code, append([]string{}, bands...), sentence})
}

// bandTally is what is counted in a band. The marks for missing values that a file does not declare are the least or the
// greatest of all, so these two are enough to count.
type bandTally struct {
	missing, infinite, finite int
	sum, least, most          float64 // of finite values
	atLeast, atMost           int     // cells that hold these
}

// mostWindow bounds the cells that are looked at together: a block may be the whole raster.
const mostWindow = 1 << 20

// tally reads all bands by blocks, and of a large block some rows at a time. All bands of a block come before the next
// block, because the file may have them interleaved.
func tally(ctx context.Context, r *geotiff.Raster) ([]bandTally, error) {
	list := make([]bandTally, len(r.Bands))
	for i := range list {
		list[i].least, list[i].most = math.Inf(1), math.Inf(-1)
	}
	var window []float64
	for y := 0; y < r.Height; y += r.BlockHeight {
		for x := 0; x < r.Width; x += r.BlockWidth {
			width, end := min(r.BlockWidth, r.Width-x), min(y+r.BlockHeight, r.Height)
			step := max(1, mostWindow/width)
			for band := range list {
				for top := y; top < end; top += step {
					if err := ctx.Err(); err != nil {
						return nil, err
					}
					rows := min(step, end-top)
					if width*rows > len(window) {
						window = make([]float64, width*rows)
					}
					if err := r.Window(window[:width*rows], band, x, top, width, rows); err != nil {
						return nil, err
					}
					list[band].add(window[:width*rows])
				}
			}
		}
	}
	return list, nil
}

func (t *bandTally) add(values []float64) {
	sum := 0.0
	for _, v := range values {
		switch {
		case math.IsNaN(v):
			t.missing++
			continue
		case math.IsInf(v, 0):
			t.infinite++
			continue
		}
		t.finite++
		sum += v
		if v < t.least {
			t.least, t.atLeast = v, 0
		}
		if v > t.most {
			t.most, t.atMost = v, 0
		}
		if v == t.least {
			t.atLeast++
		}
		if v == t.most {
			t.atMost++
		}
	}
	t.sum += sum
}

func bandReport(b geotiff.Band, t bandTally) RasterBand {
	d := RasterBand{Name: b.Name, Kind: b.Kind.String(), Scale: b.Scale, Offset: b.Offset, Missing: t.missing, Infinite: t.infinite}
	if b.HasNoData {
		d.NoData = strconv.FormatFloat(b.NoData, 'g', -1, 64)
	}
	if t.finite > 0 {
		d.Least, d.Mean, d.Most = figure(t.least), figure(t.sum/float64(t.finite)), figure(t.most)
	}
	return d
}

// systemOf says what is known of the coordinate system of a raster, in whose place another may have been said.
func systemOf(r *geotiff.Raster, said *string) RasterSystem {
	s := RasterSystem{Code: r.CRS(), Citation: r.Citation}
	if said != nil {
		s.Said = *said
	}
	switch _, err := crs.Parse(s.Code); {
	case crs.IsGeographic(s.Code):
		s.Name, s.Known = "longitude and latitude", true
	case r.EPSG == 0 && r.Azimuthal != nil:
		s.Name, s.Known = "equal-area plane around that place", err == nil
	case s.Code != "" && err == nil:
		s.Known = true
	}
	for _, c := range crs.Codes() {
		if s.Known && c.EPSG == r.EPSG {
			s.Name = c.Name
		}
	}
	return s
}

// unitOf is the unit of the coordinates as map would take them.
func unitOf(r *geotiff.Raster, s RasterSystem) string {
	switch {
	case s.Said != "" && crs.IsGeographic(s.Said), s.Said == "" && (r.Geographic || crs.IsGeographic(s.Code)):
		return "degrees"
	case s.Said == "" && s.Code != "" && !s.Known:
		return "unknown"
	}
	return "metres"
}

// localMetres is what this program writes of coordinates that are tied to no system.
const localMetres = "local metres"

func (e *rasterExaminer) system() {
	switch s := e.report.System; {
	case s.Said != "":
	case e.raster.Geographic && !s.Known:
		which := "the file does not say on which datum"
		if s.Code != "" {
			which = s.Code + " is not known here"
		}
		e.look("system", "longitude and latitude: "+which+", and map takes them for those of WGS 84")
	case s.Code != "" && !s.Known:
		e.look("system", fmt.Sprintf("the coordinate system %s is not known here; map needs --crs to say what the coordinates are, "+
			"and drumlin inspect --crs-list lists what can be said", s.Code))
	case s.Code == "" && s.Citation != "" && s.Citation != localMetres:
		e.look("system", "the coordinate system has no code, and is told in words alone; map takes the coordinates for metres of their own unless --crs says what they are")
	}
}

// mostCells is where a raster becomes a long wait.
const mostCells = 25_000_000

func (e *rasterExaminer) size() {
	if cells := e.raster.Width * e.raster.Height; cells > mostCells {
		e.look("many-cells", fmt.Sprintf("%d cells: map reads them all and fits some of them, evenly spaced, so what is finer is not in its map; "+
			"cut out the part that is asked about", cells))
	}
}

func (e *rasterExaminer) sameNames() {
	seen, told := map[string]bool{}, map[string]bool{}
	for _, b := range e.raster.Bands {
		if seen[b.Name] && !told[b.Name] {
			told[b.Name] = true
			e.look("same-names", "more than one band is called "+b.Name+", and only the first can be asked for", b.Name)
		}
		seen[b.Name] = true
	}
}

// values says what is unusual about the values of a band.
func (e *rasterExaminer) values(b geotiff.Band, t bandTally) {
	if t.infinite > 0 {
		e.look("infinite-values", fmt.Sprintf("infinite in %s of %s, and nothing measured is", countOf(t.infinite, "cell", "cells"), b.Name), b.Name)
	}
	if t.finite == 0 {
		if t.infinite == 0 {
			e.look("empty-band", "no cell of "+b.Name+" has a value", b.Name)
		}
		return
	}
	low, high := looksMissing(b, t.least), looksMissing(b, t.most) && t.most > t.least
	if low {
		e.missingMark(b.Name, t.least, t.atLeast)
	}
	if high {
		e.missingMark(b.Name, t.most, t.atMost)
	}
	if t.least == t.most && !low {
		e.look("constant-band", fmt.Sprintf("the same value, %s, in every cell of %s that has one", short(t.least), b.Name), b.Name)
	}
}

func (e *rasterExaminer) missingMark(name string, v float64, cells int) {
	e.look("missing-mark", fmt.Sprintf("%s in %s of %s: likely a mark for cells without a value, which the file does not declare; map takes it for a value, "+
		"so write the raster again with the mark declared", short(v), countOf(cells, "cell", "cells"), name), name)
}

// missingMarks are stored numbers that often stand for no value, beside those of a size that nothing measured has (common
// practice, no source).
var missingMarks = []float64{-9999, -99999, -32768, -2147483648}

const beyondMeasure = 9.9e19

// looksMissing reports whether a value is likely a mark that the file should have declared.
func looksMissing(b geotiff.Band, v float64) bool {
	for _, mark := range missingMarks {
		if v == b.Scale*mark+b.Offset {
			return true
		}
	}
	return math.Abs(v-b.Offset) >= beyondMeasure*math.Abs(b.Scale)
}

// propose puts the first band whose values differ into a command.
func (e *rasterExaminer) propose() {
	for i, b := range e.raster.Bands {
		if t := e.tallies[i]; t.finite == 0 || t.least == t.most {
			continue
		}
		s := plan.Settings{Response: new(b.Name)}.Over(e.said)
		p := &Proposal{Command: command(s, "map-"+slug(b.Name)), Settings: map[string]any{}, Choices: []string{}, Open: []string{}, settings: s}
		for _, entry := range s.Effective() {
			p.Settings[entry.Key] = entry.Value
		}
		p.Settings["observations"] = e.report.File
		if e.report.Unit == "unknown" {
			p.Open = append(p.Open, "what the coordinates are in: say it with --crs")
		}
		e.report.Proposal = p
		return
	}
}
