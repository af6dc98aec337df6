package batch

import (
	"context"
	"crypto/sha256"
	"encoding/hex"
	"encoding/json"
	"fmt"
	"io"
	"math"
	"os"
	"path/filepath"
	"strconv"

	"drumlin/basis2d/blocks"
	"drumlin/cmd/internal/locks"
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/plan"
	"drumlin/io/summary"
)

// pooled is the one smoothness of all regions: the lambda at which their restricted likelihoods, added up, are best.
// The regions are taken for independent given it, so their likelihoods multiply.
type pooled struct {
	// Of stands for the input, settings and program that it follows from.
	Of      string  `json:"of"`
	Lambda  float64 `json:"lambda"`
	Regions int     `json:"regions"` // that it was estimated from
	// Least and Most are the range of the regions' own, but for Planes whose own surface is a plane, of no lambda.
	Least  float64 `json:"least"`
	Most   float64 `json:"most"`
	Planes int     `json:"planes"`
	// Loss is by how much the restricted likelihood of the regions together is worse than with a smoothness each.
	Loss summary.Number `json:"loss"`
}

// settle fixes a region's smoothness.
func (p *pooled) settle(s *plan.Settings) {
	s.Choose("smoothness", strconv.FormatFloat(p.Lambda, 'g', -1, 64),
		fmt.Sprintf("pooled: the restricted likelihood of %d regions together is best there", p.Regions))
}

// told words it.
func (p *pooled) told() string {
	planes := ""
	if p.Planes > 0 {
		planes = fmt.Sprintf(", but for %d that would be tilted planes", p.Planes)
	}
	return fmt.Sprintf("smoothness pooled over %d regions: %.6g (their own lie between %.3g and %.3g%s; by sharing one the regions together lose %.3g of log likelihood)",
		p.Regions, p.Lambda, p.Least, p.Most, planes, math.Max(0, float64(p.Loss)))
}

const pooledFile = "pooled.json"

// poolSmoothness estimates the smoothness that the regions share, where the plan asks for it. Parts of a batch come to
// the same answer from the same input; the first to come writes it down, and the others wait for that.
func (r *runner) poolSmoothness(ctx context.Context) error {
	if !r.plan.Pooled {
		return nil
	}
	of, err := r.allInput(ctx)
	if err != nil {
		return err
	}
	path := filepath.Join(r.out, pooledFile)
	if r.pooled = readPooled(path, of); r.pooled != nil {
		return nil
	}
	if r.Gather {
		return &fault{"the smoothness of all regions is not known for the input as it is now, so no region's folder is up to date", "run the batch or its parts again"}
	}
	release, err := locks.Wait(ctx, filepath.Join(r.out, "batch.pooled.lock"), "the pooling of the smoothness", func(h locks.Holder) {
		r.events.Note("waiting for the pooled smoothness: " + told(h))
	})
	if err != nil {
		return err
	}
	defer release()
	if r.pooled = readPooled(path, of); r.pooled != nil {
		return nil
	}
	p, err := r.pool(ctx)
	if err != nil {
		return err
	}
	p.Of = of
	err = pipeline.ReplaceFile(ctx, path, func(w io.Writer) error {
		e := json.NewEncoder(w)
		e.SetIndent("", "  ")
		return e.Encode(p)
	})
	if err == nil {
		r.pooled = p
	}
	return err
}

// allInput stands for everything that the pooled smoothness follows from.
func (r *runner) allInput(ctx context.Context) (string, error) {
	sum := sha256.New()
	for i, g := range r.regions {
		asked, _, err := r.ask(ctx, i)
		if ctx.Err() != nil {
			return "", ctx.Err()
		}
		if err != nil { // it has no part in the pooling, and will fail by itself
			asked.Fingerprint = "failed"
		}
		fmt.Fprintf(sum, "%q %s\n", g.name, asked.Fingerprint)
	}
	return hex.EncodeToString(sum.Sum(nil)), nil
}

func readPooled(path, of string) *pooled {
	text, err := os.ReadFile(path)
	if err != nil {
		return nil
	}
	var p pooled
	if json.Unmarshal(text, &p) != nil || p.Of != of || !(p.Lambda > 0) {
		return nil
	}
	return &p
}

// pool finds the lambda. Each region is first fitted by itself, which settles its distribution and its knots.
func (r *runner) pool(ctx context.Context) (*pooled, error) {
	own, err := r.ownProfiles(ctx)
	if err != nil {
		return nil, err
	}
	p := &pooled{Least: math.Inf(1), Most: 0}
	best := 0.0
	for _, f := range own {
		if f == nil {
			continue
		}
		p.Regions++
		best += f.Criterion
		if f.AtUpper {
			p.Planes++
		} else {
			p.Least, p.Most = math.Min(p.Least, f.Lambda), math.Max(p.Most, f.Lambda)
		}
	}
	switch {
	case p.Regions == 0:
		return nil, &fault{"no region could be fitted, so there is no smoothness to pool", "run one of them with drumlin map to see what is wrong"}
	case p.Most == 0:
		return nil, &fault{"every region's surface came out as a tilted plane, so there is no smoothness to pool", "leave out smoothness = \"pooled\""}
	}
	passes := 0
	log, value, err := minimise(math.Log(p.Least), math.Log(p.Most), func(rho float64) (float64, error) {
		passes++
		return r.together(ctx, own, math.Exp(rho), passes)
	})
	if err != nil {
		return nil, err
	}
	// Six digits are more than the data know; a number that can be read is one that can be pinned.
	p.Lambda, err = strconv.ParseFloat(strconv.FormatFloat(math.Exp(log), 'g', 6, 64), 64)
	p.Loss = summary.Number(value - best)
	return p, err
}

// ownProfiles fits every region by itself; an entry is nil where that cannot be done.
func (r *runner) ownProfiles(ctx context.Context) ([]*pipeline.Profiled, error) {
	own := make([]*pipeline.Profiled, len(r.regions))
	err := r.profiles(ctx, "pooling the smoothness, own fits", func(i int) error {
		asked, s, err := r.ask(ctx, i)
		if err == nil {
			own[i], err = profile(ctx, s, asked)
		}
		if ctx.Err() != nil {
			return ctx.Err()
		}
		return nil // a region that fails is told of when its turn comes
	})
	return own, err
}

// profile is nil beside an error, a panic among them, and where there is no criterion.
func profile(ctx context.Context, s plan.Settings, g pipeline.Region) (*pipeline.Profiled, error) {
	p, err := guarded(func() (pipeline.Profiled, error) { return pipeline.Profile(ctx, s, g) })
	if err != nil || math.IsNaN(p.Criterion) {
		return nil, err
	}
	return &p, nil
}

// together adds up the criteria of the regions at one lambda, in their order.
func (r *runner) together(ctx context.Context, own []*pipeline.Profiled, lambda float64, pass int) (float64, error) {
	values := make([]float64, len(own))
	err := r.profiles(ctx, fmt.Sprintf("pooling the smoothness, pass %d", pass), func(i int) error {
		if own[i] == nil {
			return nil
		}
		asked, _, err := r.ask(ctx, i)
		if err != nil {
			return err
		}
		s := own[i].Settings
		s.Choose("smoothness", strconv.FormatFloat(lambda, 'g', -1, 64), "tried for all regions")
		f, err := pipeline.Profile(ctx, s, asked)
		if err != nil {
			return fmt.Errorf("%s at the smoothness %.6g: %w", r.regions[i].name, lambda, err)
		}
		values[i] = f.Criterion
		return nil
	})
	sum := 0.0
	for _, v := range values {
		sum += v
	}
	return sum, err
}

// profiles calls do for every region, in parallel.
func (r *runner) profiles(ctx context.Context, stage string, do func(i int) error) error {
	r.inner = 1
	done := 0
	return blocks.Do(ctx, blocks.Workers(r.Workers), len(r.regions), func(_, i int) error {
		err := do(i)
		r.mu.Lock()
		defer r.mu.Unlock()
		done++
		r.events.Stage(stage, done, len(r.regions))
		return err
	})
}
