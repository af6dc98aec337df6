package batch

import (
	"cmp"
	"context"
	"crypto/sha256"
	"encoding/hex"
	"fmt"
	"io"
	"os"
	"path/filepath"
	"slices"
	"strings"

	"drumlin/basis2d/blocks"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/chart"
	"drumlin/io/draft"
	"drumlin/io/plan"
)

// Files beside the regions' folders.
const (
	breaksFile  = "breaks.toml"
	regionsFile = "regions.csv"
)

// draw does what needs all regions: their pictures in common colours, the mosaic, and the table that compares them. It
// returns the files it wrote beside the regions' folders.
func (r *runner) draw(ctx context.Context, report *Report) (written []string, err error) {
	var fitted []Outcome
	for _, o := range report.Outcomes {
		if o.Status != Failed {
			fitted = append(fitted, o)
		}
	}
	err = r.writeFile(ctx, regionsFile, func(w io.Writer) error { return WriteRegions(w, report.Outcomes) })
	if err != nil {
		return nil, err
	}
	written = append(written, regionsFile)
	list, err := r.breaks(ctx, fitted)
	if err != nil {
		return written, err
	}
	if list != nil {
		if err := r.writeFile(ctx, breaksFile, func(w io.Writer) error { return draft.WriteBreaks(w, list) }); err != nil {
			return written, err
		}
		written = append(written, breaksFile)
	}
	if err := r.drawPictures(ctx, fitted, list); err != nil {
		return written, err
	}
	mosaic, err := r.drawMosaic(ctx, report, list)
	return append(written, mosaic...), err
}

func (r *runner) writeFile(ctx context.Context, name string, content func(io.Writer) error) error {
	return pipeline.ReplaceFile(ctx, filepath.Join(r.out, name), content)
}

// remove takes away a file that an earlier run wrote and that this one has no reason to write.
func (r *runner) remove(names ...string) error {
	for _, name := range names {
		if err := os.Remove(filepath.Join(r.out, name)); err != nil && !os.IsNotExist(err) {
			return pipeline.Plainly(err, name)
		}
	}
	return nil
}

// openDraft reads what the pictures of a region are made of.
func (r *runner) openDraft(folder string) (draft.Draft, error) {
	path := filepath.Join(r.out, folder, pipeline.DraftFile)
	f, err := os.Open(path)
	if err != nil {
		return draft.Draft{}, pipeline.Plainly(err, path)
	}
	defer f.Close()
	d, err := draft.Read(f)
	if err != nil {
		return d, &fault{fmt.Sprintf("%s: %v", path, err), fmt.Sprintf("remove the folder %s and run the batch again", filepath.Join(r.out, folder))}
	}
	return d, nil
}

// writes reports whether the region of an outcome was asked for a kind of file.
func (r *runner) writes(name string, kinds ...string) bool {
	write := r.regions[r.at[name]].write
	return slices.ContainsFunc(kinds, func(kind string) bool { return slices.Contains(write, kind) })
}

// samples bounds how many values of all regions together the common breaks are chosen from, and how many of one.
const samplesTogether, leastSample, mostSample = 2_000_000, 16, 512

// breaks chooses the class edges of each picture for each response and unit: those that the plan has pinned, and else
// ones common to all regions that may be used. It is nil where each region has its own.
func (r *runner) breaks(ctx context.Context, fitted []Outcome) ([]draft.Breaks, error) {
	var drawn []Outcome
	for _, o := range fitted {
		if r.writes(o.Region, plan.Pictures) {
			drawn = append(drawn, o)
		}
	}
	if r.plan.Own || len(drawn) == 0 {
		return nil, r.remove(breaksFile)
	}
	type picture struct {
		file string
		kind chart.Kind
		group
	}
	samples := map[picture][]chart.Sample{}
	size := min(mostSample, max(leastSample, samplesTogether/len(drawn)))
	parts := make([]map[picture]chart.Sample, len(drawn))
	err := blocks.Do(ctx, r.Workers, len(drawn), func(_, k int) error {
		if drawn[k].Status == Stop {
			return nil // what is not to be used has no say in the colours of the others
		}
		d, err := r.openDraft(drawn[k].Folder)
		if err != nil {
			return err
		}
		parts[k] = map[picture]chart.Sample{}
		for _, p := range d.Pictures() {
			if p.Classes != p.File {
				continue // it takes the colours of another picture, and has no say in them
			}
			parts[k][picture{p.File, p.Kind, group{d.Response, d.Unit}}] = chart.NewSample(p.Values(), size)
		}
		return nil
	})
	if err != nil {
		return nil, err
	}
	for _, part := range parts {
		for p, s := range part {
			samples[p] = append(samples[p], s)
		}
	}
	list := []draft.Breaks{}
	for p, s := range samples {
		if p.kind == chart.Chance {
			continue // its classes are fixed
		}
		edges, pinned := edgesOf(r.pinned, p.file, p.group)
		if pinned {
			edges = chart.Reaching(edges, s)
		} else {
			edges = chart.SharedBreaks(p.kind, s)
		}
		if edges != nil {
			list = append(list, draft.Breaks{Picture: p.file, Response: p.response, Unit: p.unit, Edges: edges})
		}
	}
	slices.SortFunc(list, func(a, b draft.Breaks) int {
		return cmp.Or(cmp.Compare(a.Response, b.Response), cmp.Compare(a.Unit, b.Unit), cmp.Compare(a.Picture, b.Picture))
	})
	return list, nil
}

// drawnFile has the mark of what the pictures in a folder were drawn from, and their names, so that no picture is drawn
// twice.
const drawnFile = "pictures.drawn"

// drawPictures draws the pictures of every region that is to have some.
func (r *runner) drawPictures(ctx context.Context, fitted []Outcome, list []draft.Breaks) error {
	done := 0
	return blocks.Do(ctx, r.Workers, len(fitted), func(_, k int) error {
		err := r.drawRegion(ctx, fitted[k], list)
		r.mu.Lock()
		defer r.mu.Unlock()
		done++
		r.events.Stage("drawing", done, len(fitted))
		return err
	})
}

func (r *runner) drawRegion(ctx context.Context, o Outcome, list []draft.Breaks) error {
	if !r.writes(o.Region, plan.Pictures) {
		return nil
	}
	dir := filepath.Join(r.out, o.Folder)
	sum, err := pipeline.FileSHA256(ctx, filepath.Join(dir, pipeline.DraftFile))
	if err != nil {
		return err
	}
	g := group{o.Figures.Response, o.Figures.Unit}
	mark, err := drawnMark(sum, g, list)
	if err != nil {
		return err
	}
	if isDrawn(dir, mark) {
		return nil
	}
	d, err := r.openDraft(o.Folder)
	if err != nil {
		return err
	}
	drawn := []string{mark}
	for _, p := range d.Pictures() {
		if edges, ok := edgesOf(list, p.Classes, g); ok {
			p.Breaks, p.Shared = edges, true
		}
		if err := pipeline.ReplaceFile(ctx, filepath.Join(dir, p.File), p.WritePNG); err != nil {
			return err
		}
		drawn = append(drawn, p.File)
	}
	return pipeline.ReplaceFile(ctx, filepath.Join(dir, drawnFile), func(w io.Writer) error {
		_, err := io.WriteString(w, strings.Join(drawn, "\n")+"\n")
		return err
	})
}

// isDrawn reports whether the pictures in a folder bear the mark and are all there.
func isDrawn(dir, mark string) bool {
	text, err := os.ReadFile(filepath.Join(dir, drawnFile))
	if err != nil {
		return false
	}
	drawn := strings.Fields(string(text))
	gone := func(file string) bool {
		_, err := os.Stat(filepath.Join(dir, file))
		return err != nil
	}
	return len(drawn) > 0 && drawn[0] == mark && !slices.ContainsFunc(drawn[1:], gone)
}

// drawnMark stands for all that a region's pictures follow from.
func drawnMark(draftSum string, g group, list []draft.Breaks) (string, error) {
	own := slices.DeleteFunc(slices.Clone(list), func(b draft.Breaks) bool { return b.Response != g.response || b.Unit != g.unit })
	sum := sha256.New()
	fmt.Fprintf(sum, "%s\n%s\n", pipeline.Version(), draftSum)
	err := draft.WriteBreaks(sum, own)
	return hex.EncodeToString(sum.Sum(nil)), err
}

// drawMosaic writes the map of all regions together, or notes why there is none.
func (r *runner) drawMosaic(ctx context.Context, report *Report, list []draft.Breaks) ([]string, error) {
	var tiles []Tile
	var left []string
	for _, o := range report.Outcomes {
		switch {
		case o.Status == Failed || !r.writes(o.Region, plan.CSV, plan.GeoJSON, plan.Pictures):
		case o.Status == Stop:
			left = append(left, o.Region)
		default:
			tiles = append(tiles, Tile{Region: o.Region, Open: func() (draft.Draft, error) { return r.openDraft(o.Folder) }})
		}
	}
	r.events.Stage("drawing the mosaic", 0, 0)
	m, err := BuildMosaic(ctx, tiles)
	if err != nil {
		return nil, err
	}
	var written []string
	var unwanted []string
	file := func(name string, kind string, content func(io.Writer) error) error {
		wanted := m.Why == "" && (kind != plan.GeoJSON || m.FitsGeoJSON()) && slices.ContainsFunc(tiles, func(t Tile) bool { return r.writes(t.Region, kind) })
		if !wanted {
			unwanted = append(unwanted, name)
			return nil
		}
		written = append(written, name)
		return r.writeFile(ctx, name, content)
	}
	if m.Why != "" {
		report.Notes = append(report.Notes, "no mosaic: "+m.Why)
	} else {
		report.Notes = append(report.Notes, m.Notes()...)
	}
	if err := file("mosaic.csv", plan.CSV, m.WriteCSV); err != nil {
		return written, err
	}
	if err := file("mosaic.geojson", plan.GeoJSON, m.WriteGeoJSON); err != nil {
		return written, err
	}
	err = file("mosaic.png", plan.Pictures, func(w io.Writer) error {
		p, err := m.Picture(ctx, r.mosaicTitle(), r.plan.Margin, left)
		if err != nil {
			return err
		}
		if edges, ok := edgesOf(list, draft.MapFile, group{m.Response, m.Unit}); ok {
			p.Breaks, p.Shared = edges, true
		}
		return p.WritePNG(w)
	})
	if err != nil {
		return written, err
	}
	return written, r.remove(unwanted...)
}

// mosaicTitle is the title that the plan gives all regions, or the response.
func (r *runner) mosaicTitle() string {
	if t := r.plan.Defaults.Title; t != nil {
		return *t
	}
	return r.regions[0].group.response
}

// writeLedger brings the ledger into a table: the last word on each region of the plan, in the plan's order. Parts leave
// it to the gathering.
func (r *runner) writeLedger(report *Report) error {
	if r.Part.Of > 0 {
		return nil
	}
	lines, err := ReadLedgers(r.out)
	if err != nil {
		return err
	}
	latest := Latest(lines)
	var list []Line
	for _, g := range r.regions {
		if line, ok := latest[g.name]; ok {
			list = append(list, line)
		}
	}
	const name = "ledger.csv"
	report.Written = append([]string{name}, report.Written...)
	// The ledger is to be true after an interrupt too.
	return r.writeFile(context.Background(), name, func(w io.Writer) error { return WriteLedgerCSV(w, list) })
}

// notes tells what a person should know that stands in no region's summary.
func (r *runner) notes() []string {
	var list []string
	if r.pooled != nil {
		list = append(list, r.pooled.told())
	}
	if r.unnamed.Rows > 0 {
		list = append(list, r.nameless())
	}
	if stale := r.strangers(); len(stale) > 0 {
		list = append(list, fmt.Sprintf("%s of an earlier run left alone, of no region in the plan, such as %s", Counted(len(stale), "folder"), stale[0]))
	}
	return list
}

// strangers lists folders with results that belong to no region.
func (r *runner) strangers() []string {
	ours := make(map[string]bool, len(r.regions))
	for _, g := range r.regions {
		ours[g.folder] = true
	}
	entries, err := os.ReadDir(r.out)
	if err != nil {
		return nil
	}
	var list []string
	for _, e := range entries {
		if !e.IsDir() || ours[e.Name()] {
			continue
		}
		if _, err := os.Stat(filepath.Join(r.out, e.Name(), "summary.json")); err == nil {
			list = append(list, e.Name())
		}
	}
	return list
}
