package batch

import (
	"cmp"
	"context"
	"errors"
	"fmt"
	"io/fs"
	"os"
	"path"
	"path/filepath"
	"slices"
	"strings"
	"unicode/utf8"

	"drumlin/cmd/internal/pipeline"
	"drumlin/io/draft"
	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// Batch is a plan with its regions found and their settings resolved: all that can be checked before any work is.
type Batch struct {
	plan    *plan.Batch
	path    string            // of the plan
	regions []region          // in the order of the plan
	there   map[string]bool   // files that are known to be there, while the plan is loaded
	inputs  map[string]string // by each folder that regions take files from, one of these
	unnamed observe.Unnamed
	pinned  []draft.Breaks // breaks that the plan names

	// fit has one region fitted; it is pipeline.RunRegion but in tests.
	fit func(context.Context, plan.Settings, pipeline.Region, string, pipeline.Events) (summary.Document, error)
}

// region is one unit of the batch. Its settings are resolved when they are wanted: a plan may have very many.
type region struct {
	name         string
	folder       string        // in the folder of the batch
	observations string        // path of its table, as seen from the plan
	rows         *observe.Part // of a table that all regions share; nil where it has a file of its own
	size         int64         // bytes of its rows: what its work is judged by
	group        group
	write        []string // the kinds of files asked for
}

// group is what regions must have in common to be held against one another.
type group struct{ response, unit string }

// settings resolves a region's.
func (b *Batch) settings(g region) (plan.Settings, error) {
	return b.plan.Region(g.name, g.observations, b.dir())
}

// Load reads a plan, finds its regions, and refuses what can be seen to be wrong before any work.
func Load(ctx context.Context, file string) (*Batch, error) {
	text, err := pipeline.ReadFile(file, plan.LargestPlan)
	if err != nil {
		return nil, err
	}
	p, err := plan.ReadBatch(text, filepath.Base(file))
	if err != nil {
		return nil, err
	}
	b := &Batch{plan: p, path: file, fit: pipeline.RunRegion, there: map[string]bool{}, inputs: map[string]string{}}
	for _, find := range []func(context.Context) error{b.findShared, b.findFiles, b.findNamed} {
		if err := find(ctx); err != nil {
			return nil, err
		}
	}
	if err := b.everyNameMeansARegion(); err != nil {
		return nil, err
	}
	b.nameFolders()
	b.there = nil
	for _, check := range []func() error{b.checkColumns, b.readBreaks} {
		if err := check(); err != nil {
			return nil, err
		}
	}
	return b, nil
}

func (b *Batch) dir() string { return filepath.Dir(b.path) }

// in is a path of the plan, taken from its folder.
func (b *Batch) in(path string) string {
	if filepath.IsAbs(path) {
		return path
	}
	return filepath.Join(b.dir(), path)
}

// add appends a region if its settings are in order and the files that they name are there.
func (b *Batch) add(name, observations string, rows *observe.Part, size int64) error {
	g := region{name: name, observations: observations, rows: rows, size: size}
	s, err := b.settings(g)
	if err != nil {
		return err
	}
	for _, file := range s.Files() {
		if b.there[file] {
			continue
		}
		if err := b.checkFile(file, func() (section, key string) { return b.plan.Origin(name, file, b.dir()) }); err != nil {
			return err
		}
		b.there[file] = true
		if dir := filepath.Dir(file); b.inputs[dir] == "" {
			b.inputs[dir] = file
		}
	}
	g.group, g.write = group{*s.Response, pipeline.Unit(s)}, s.Write
	b.regions = append(b.regions, g)
	return nil
}

// findShared reads the table that regions share and splits it.
func (b *Batch) findShared(ctx context.Context) error {
	if b.plan.File == "" {
		return nil
	}
	if err := b.checkFile(b.in(b.plan.File), func() (section, key string) { return "regions", "file" }); err != nil {
		return err
	}
	shared, err := pipeline.ReadShared(ctx, b.plan.Defaults, b.in(b.plan.File))
	if err != nil {
		return err
	}
	parts, unnamed, err := shared.Split(b.plan.SplitBy)
	if err != nil {
		return err
	}
	b.unnamed = unnamed
	if len(parts) == 0 {
		return b.plan.Fault("regions", "split_by", b.plan.SplitBy, "names no region: it is empty in every row of "+b.plan.File, "check which column names the regions")
	}
	for k := range parts {
		if err := b.add(parts[k].Name, b.plan.File, &parts[k], int64(parts[k].Bytes)); err != nil {
			return err
		}
	}
	return nil
}

// findFiles finds the files that the plan's patterns stand for, a region each.
func (b *Batch) findFiles(context.Context) error {
	taken := map[string]string{} // path by name
	for _, pattern := range b.plan.Patterns {
		base, rest := fixedPart(pattern)
		base = b.in(base)
		found, err := fs.Glob(os.DirFS(base), rest)
		if err != nil {
			return b.plan.Fault("regions", "files", pattern, "is no pattern of file names", "* stands for any letters, ? for one, [a-z] for one of those")
		}
		n := 0
		for _, match := range found {
			file := filepath.Join(base, filepath.FromSlash(match))
			info, err := os.Stat(file)
			if err == nil && info.IsDir() || hidden(match, rest) {
				continue
			}
			n++
			name := strings.TrimSuffix(match, path.Ext(match))
			switch other, twice := taken[name]; {
			case !utf8.ValidString(name):
				return b.plan.Fault("regions", "files", pattern, fmt.Sprintf("finds %q, a name that is not in UTF-8", match), "rename the file")
			case twice && other == file:
				continue
			case twice:
				return b.plan.Fault("regions", "files", pattern, fmt.Sprintf("finds two regions called %q: %s and %s", name, other, file), "rename one of the files")
			}
			taken[name] = file
			size := int64(0)
			if err == nil {
				size = info.Size()
			}
			if err := b.add(name, b.fromPlan(file), nil, size); err != nil {
				return err
			}
		}
		if n == 0 {
			return b.noFile(pattern, base)
		}
	}
	return nil
}

// hidden reports whether a file, or a folder on the way to it, is one that systems put beside others and do not show, and
// that the pattern does not ask for.
func hidden(match, pattern string) bool {
	asked := strings.Split(pattern, "/")
	for k, name := range strings.Split(match, "/") {
		if strings.HasPrefix(name, ".") && k < len(asked) && !strings.HasPrefix(asked[k], ".") {
			return true
		}
	}
	return false
}

// noFile says that a pattern finds nothing, and why if its folder is the reason.
func (b *Batch) noFile(pattern, folder string) error {
	message, hint := "finds no file", b.whence()
	switch _, err := os.ReadDir(folder); {
	case errors.Is(err, fs.ErrPermission):
		message, hint = "finds no file, as its folder may not be read", "ask for the right to read it"
	case err != nil:
		message = "finds no file: there is no folder " + b.fromPlan(folder)
	}
	return b.plan.Fault("regions", "files", pattern, message, hint)
}

// whence is the advice on a path of the plan that leads nowhere.
func (b *Batch) whence() string {
	advice := "check the path: it is taken from the folder of the plan"
	if b.dir() != "." {
		advice += ", " + b.dir()
	}
	return advice
}

// fromPlan is the path of a file as seen from the plan's folder, where it can be had.
func (b *Batch) fromPlan(file string) string {
	if rel, err := filepath.Rel(b.dir(), file); err == nil {
		return rel
	}
	return file
}

// fixedPart splits a pattern at the first folder with a sign that stands for others. Signs in the folders above are
// letters: they are on the disk already.
func fixedPart(pattern string) (base, rest string) {
	parts := strings.Split(filepath.ToSlash(pattern), "/")
	k := slices.IndexFunc(parts, func(p string) bool { return strings.ContainsAny(p, `*?[\`) })
	if k < 0 {
		k = len(parts) - 1
	}
	base = strings.Join(parts[:k], "/")
	switch {
	case k == 0:
		base = "."
	case base == "":
		base = "/"
	}
	return filepath.FromSlash(base), strings.Join(parts[k:], "/")
}

// findNamed adds the regions that name their own table.
func (b *Batch) findNamed(context.Context) error {
	have := b.names()
	for _, n := range b.plan.Named {
		if n.Settings.Observations == nil {
			continue
		}
		if have[n.Name] {
			return b.plan.Fault("region."+n.Name, "observations", *n.Settings.Observations, "is a second table for a region that has one from [regions]", "leave it out, or give the region another name")
		}
		size := int64(0)
		if info, err := os.Stat(b.in(*n.Settings.Observations)); err == nil {
			size = info.Size()
		}
		if err := b.add(n.Name, *n.Settings.Observations, nil, size); err != nil {
			return err
		}
	}
	return nil
}

func (b *Batch) names() map[string]bool {
	names := make(map[string]bool, len(b.regions))
	for _, r := range b.regions {
		names[r.name] = true
	}
	return names
}

// everyNameMeansARegion refuses a [region.NAME] that no data stand behind.
func (b *Batch) everyNameMeansARegion() error {
	have := b.names()
	for _, n := range b.plan.Named {
		if have[n.Name] {
			continue
		}
		return b.plan.Fault("region."+n.Name, "", "", "is no region of the plan: nothing under [regions] is called so, and it names no observations",
			b.suggest(n.Name, "name its table with observations"))
	}
	return nil
}

// suggest words a hint with the region that a name looks like, or else the other hint.
func (b *Batch) suggest(name, otherwise string) string {
	var all []string
	for _, r := range b.regions {
		all = append(all, r.name)
	}
	if near, ok := plan.Nearest(name, all); ok {
		return fmt.Sprintf("did you mean %q?", near)
	}
	return otherwise
}

func (b *Batch) nameFolders() {
	names := make([]string, len(b.regions))
	for i, r := range b.regions {
		names[i] = r.name
	}
	for i, folder := range FolderNames(names) {
		b.regions[i].folder = folder
	}
}

// checkFile refuses a file that is not there; named tells where the plan names it.
func (b *Batch) checkFile(file string, named func() (section, key string)) error {
	info, err := os.Stat(file)
	fault := func(message, hint string) error {
		section, key := named()
		return b.plan.Fault(section, key, b.fromPlan(file), message, hint)
	}
	switch {
	case errors.Is(err, fs.ErrPermission):
		return fault("may not be read", "ask for the right to read it")
	case err != nil:
		return fault("is not there", b.whence())
	case info.IsDir():
		return fault("is a folder", "name a file in it")
	}
	return nil
}

// checkColumns looks into the header of a shared table: what is missing there would fail every region.
func (b *Batch) checkColumns() error {
	if b.plan.File == "" {
		return nil
	}
	for _, r := range b.regions {
		if r.rows == nil || b.plan.Names(r.name) {
			continue
		}
		s, err := b.settings(r)
		if err != nil {
			return err
		}
		return pipeline.CheckColumns(s, *r.rows) // the others ask for the same
	}
	return nil
}

// groups lists the distinct responses and units: what may share colours and a mosaic.
func (b *Batch) groups() []group {
	seen := map[group]bool{}
	var list []group
	for _, r := range b.regions {
		if !seen[r.group] {
			seen[r.group] = true
			list = append(list, r.group)
		}
	}
	slices.SortFunc(list, func(a, b group) int { return cmp.Or(cmp.Compare(a.response, b.response), cmp.Compare(a.unit, b.unit)) })
	return list
}

// readBreaks takes the breaks that the plan names, as a list or as the file of an earlier batch.
func (b *Batch) readBreaks() error {
	groups := b.groups()
	switch {
	case b.plan.Breaks != nil && len(groups) > 1:
		return b.plan.Fault("pictures", "breaks", "", fmt.Sprintf("are one list, and the regions have %d responses or units, such as %s and %s", len(groups), groups[0].unit, groups[1].unit),
			"leave breaks out, or name a breaks file that has them by unit")
	case b.plan.Breaks != nil:
		b.pinned = []draft.Breaks{{Picture: draft.MapFile, Response: groups[0].response, Unit: groups[0].unit, Edges: b.plan.Breaks}}
	case b.plan.BreaksFile != "":
		file := b.in(b.plan.BreaksFile)
		if err := b.checkFile(file, func() (section, key string) { return "pictures", "breaks" }); err != nil {
			return err
		}
		text, err := pipeline.ReadFile(file, 1<<20)
		if err != nil {
			return err
		}
		if b.pinned, err = draft.ReadBreaks(text, filepath.Base(file)); err != nil {
			return err
		}
		for _, g := range groups {
			if _, ok := edgesOf(b.pinned, draft.MapFile, g); ok {
				return nil
			}
		}
		return b.plan.Fault("pictures", "breaks", b.plan.BreaksFile, fmt.Sprintf("has no breaks for %s in %s", groups[0].response, groups[0].unit), "name the breaks.toml of a batch with this response and unit")
	}
	return nil
}

func edgesOf(list []draft.Breaks, picture string, g group) ([]float64, bool) {
	for _, b := range list {
		if b.Picture == picture && b.Response == g.response && b.Unit == g.unit {
			return b.Edges, true
		}
	}
	return nil, false
}

// Len is the number of regions.
func (b *Batch) Len() int { return len(b.regions) }

// Pooled reports whether the regions share one smoothness.
func (b *Batch) Pooled() bool { return b.plan.Pooled }
