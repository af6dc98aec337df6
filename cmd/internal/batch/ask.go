package batch

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"sync"

	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
)

// ask puts together what a region is run with, and its fingerprint.
func (r *runner) ask(ctx context.Context, i int) (pipeline.Region, plan.Settings, error) {
	g := r.regions[i]
	s, err := r.settings(g)
	if err != nil {
		return pipeline.Region{}, s, err
	}
	s.Workers, s.Force, s.Quiet = &r.inner, new(true), new(true)
	if r.pooled != nil {
		r.pooled.settle(&s)
	}
	asked := pipeline.Region{Name: g.name, Rows: g.rows, SplitBy: r.plan.SplitBy}
	if asked.Beyond, err = r.beyond(ctx, i); err != nil {
		return asked, s, err
	}
	asked.Fingerprint, err = r.fingerprint(ctx, s, asked)
	return asked, s, err
}

// fingerprint stands for all that a region's results follow from: the program, the settings, and the input byte for
// byte. Where the input lies has no part in it.
func (r *runner) fingerprint(ctx context.Context, s plan.Settings, g pipeline.Region) (string, error) {
	var identity struct {
		Version  string
		Name     string
		Settings []plan.Entry
		Said     []bool
		Files    []string
		Beyond   []string
	}
	identity.Version, identity.Name, identity.Settings = pipeline.Version(), g.Name, s.Effective()
	for _, e := range identity.Settings {
		identity.Said = append(identity.Said, e.Why == "")
	}
	files := s.Files()
	if g.Rows != nil { // the first file is the table that all share, and only the region's own rows bear on it
		identity.Files = append(identity.Files, g.Rows.SHA256())
		files = files[1:]
	}
	for _, f := range files {
		sum, err := r.sums.of(ctx, f)
		if err != nil {
			return "", err
		}
		identity.Files = append(identity.Files, sum)
	}
	for _, p := range g.Beyond {
		identity.Beyond = append(identity.Beyond, p.SHA256())
	}
	text, err := json.Marshal(identity)
	if err != nil {
		return "", fmt.Errorf("fingerprint: %w", err)
	}
	sum := sha256.Sum256(text)
	return hex.EncodeToString(sum[:]), nil
}

// fileSums are the checksums of files. One that several regions name, such as that of their zones, is read once.
type fileSums struct {
	mu    sync.Mutex
	known map[string]*fileSum
}

type fileSum struct {
	once sync.Once
	sum  string
	err  error
}

// mostSums bounds how many checksums are kept: files that regions share are few.
const mostSums = 1000

func (f *fileSums) of(ctx context.Context, path string) (string, error) {
	f.mu.Lock()
	if f.known == nil || len(f.known) >= mostSums {
		f.known = map[string]*fileSum{}
	}
	s := f.known[path]
	if s == nil {
		s = &fileSum{}
		f.known[path] = s
	}
	f.mu.Unlock()
	s.once.Do(func() { s.sum, s.err = pipeline.FileSHA256(ctx, path) })
	return s.sum, s.err
}
