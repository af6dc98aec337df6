package pipeline

import (
	"context"
	"fmt"
	"slices"
	"strconv"
	"strings"

	"drumlin/io/observe"
	"drumlin/io/plan"
	"drumlin/io/summary"
	"drumlin/spatial"
)

func (r *run) heldNames() map[string]bool {
	names := map[string]bool{}
	for _, h := range r.settings.Hold {
		names[h.Name] = true
	}
	return names
}

// holdAll gives every covariate its held value all over the lattice, and says what to add where one has none.
func (r *run) holdAll() error {
	held := r.heldNames()
	var lacking []string
	for _, c := range r.obs.data.Covariates {
		if held[c.Name] || layered(r.settings, c.Name) || !r.mapNeeds(c.Name) {
			continue
		}
		value := plan.AtMean
		if c.Number == nil {
			value = plan.AtCommonest
		}
		lacking = append(lacking, "--hold "+quoted(c.Name+"="+value))
	}
	if lacking != nil {
		return refuse(fmt.Sprintf("add %s for a map adjusted to that, or --at FILE with places that have the covariate", strings.Join(lacking, " ")),
			"the map needs a value of %s in every cell", coveredBy(r.settings))
	}
	r.target.held, r.target.heldNumber = map[string]string{}, map[string]float64{}
	for _, h := range r.settings.Hold {
		if err := r.hold(h); err != nil {
			return err
		}
	}
	return nil
}

// mapNeeds reports whether the map's own model needs a covariate everywhere: not a group, of which the map shows the
// average, and not a covariate of an alternative.
func (r *run) mapNeeds(name string) bool {
	return slices.Contains(r.settings.Numbers(), name) || slices.Contains(r.settings.Categories(), name)
}

// quoted puts quotes around an argument that a shell would take apart.
func quoted(s string) string {
	if strings.ContainsAny(s, " \t'\"\\$&|;<>()*?[]#~`!{}") {
		return "'" + strings.ReplaceAll(s, "'", `'\''`) + "'"
	}
	return s
}

func coveredBy(s plan.Settings) string {
	return strings.Join(slices.Concat(s.Numbers(), s.Categories()), ", ")
}

// hold fixes one covariate at all places of the target.
func (r *run) hold(h plan.Hold) error {
	n := r.target.places.Len()
	for _, c := range r.obs.data.Covariates {
		if c.Name != h.Name {
			continue
		}
		fixed := spatial.Covariate{Name: c.Name}
		if c.Number != nil {
			v, err := heldNumber(c, h)
			if err != nil {
				return err
			}
			fixed.Number = repeat(v, n)
			r.target.heldNumber[c.Name] = v
			r.target.held[c.Name] = summary.Short(summary.Number(v))
			if h.Value == plan.AtMean {
				r.target.held[c.Name] += " (mean)"
			}
		} else {
			k, err := heldLevel(c, h)
			if err != nil {
				return err
			}
			fixed.Level, fixed.Code = c.Level, make([]int32, n)
			for i := range fixed.Code {
				fixed.Code[i] = k
			}
			r.target.held[c.Name] = c.Level[k]
			if h.Value == plan.AtCommonest {
				r.target.held[c.Name] += " (commonest)"
			}
		}
		r.target.covariates = append(r.target.covariates, fixed)
	}
	return nil
}

// pick takes the values of covariates at some places, which may come more than once.
func pick(list []spatial.Covariate, places []int) []spatial.Covariate {
	var picked []spatial.Covariate
	for _, c := range list {
		p := spatial.Covariate{Name: c.Name, Level: c.Level}
		if c.Number != nil {
			p.Number = make([]float64, len(places))
			for k, i := range places {
				p.Number[k] = c.Number[i]
			}
		} else {
			p.Code = make([]int32, len(places))
			for k, i := range places {
				p.Code[k] = c.Code[i]
			}
		}
		picked = append(picked, p)
	}
	return picked
}

// heldAt repeats the values that covariates are held at for n places.
func heldAt(held []spatial.Covariate, n int) []spatial.Covariate {
	var list []spatial.Covariate
	for _, c := range held {
		if c.Number != nil {
			c.Number = repeat(c.Number[0], n)
		} else {
			code := c.Code[0]
			c.Code = make([]int32, n)
			for i := range c.Code {
				c.Code[i] = code
			}
		}
		list = append(list, c)
	}
	return list
}

func heldNumber(c spatial.Covariate, h plan.Hold) (float64, error) {
	if h.Value == plan.AtMean {
		mean := 0.0
		for _, v := range c.Number {
			mean += v / float64(len(c.Number))
		}
		return mean, nil
	}
	v, err := strconv.ParseFloat(h.Value, 64)
	if err != nil || v-v != 0 {
		return 0, refuse("give a number, or "+plan.AtMean, "--hold %s=%s: %q is not a number", h.Name, h.Value, h.Value)
	}
	return v, nil
}

func heldLevel(c spatial.Covariate, h plan.Hold) (int32, error) {
	if h.Value == plan.AtCommonest {
		count := make([]int, len(c.Level))
		for _, k := range c.Code {
			count[k]++
		}
		return int32(slices.Index(count, slices.Max(count))), nil
	}
	if k := slices.Index(c.Level, h.Value); k >= 0 {
		return int32(k), nil
	}
	return 0, refuse("levels are "+strings.Join(firstFew(c.Level), ", ")+", or "+plan.AtCommonest,
		"--hold %s=%s: %q is not a level of %s", h.Name, h.Value, h.Value, h.Name)
}

func firstFew(s []string) []string {
	if len(s) > 12 {
		return append(slices.Clone(s[:12]), "...")
	}
	return s
}

func repeat(v float64, n int) []float64 {
	s := make([]float64, n)
	for i := range s {
		s[i] = v
	}
	return s
}

// covariatesAt takes covariates from the places' own columns, or from --hold.
func (r *run) covariatesAt(ctx context.Context, t *observe.Table) error {
	held := r.heldNames()
	sampled, whole, err := r.sampleCells(ctx, r.target.places.X, r.target.places.Y)
	if err != nil {
		return err
	}
	r.target.held, r.target.heldNumber = map[string]string{}, map[string]float64{}
	for _, c := range r.obs.data.Covariates {
		if held[c.Name] {
			continue
		}
		own := t.Column(c.Name)
		if !r.mapNeeds(c.Name) {
			if own != nil && slices.Contains(r.settings.Group, c.Name) { // a level that is new has the average level and its variance
				r.target.covariates = append(r.target.covariates, spatial.Covariate{Name: c.Name, Code: own.Code, Level: own.Level})
			}
			continue
		}
		if own == nil {
			if len(whole) < t.Len() {
				fault := atRow(t, firstMissing(whole))
				fault.What, fault.Advice = "a layer has no value there, or one that was not observed", "take the place out, or give its covariates as columns"
				return fault
			}
			k := slices.IndexFunc(sampled, func(s spatial.Covariate) bool { return s.Name == c.Name })
			r.target.covariates, r.target.layers = append(r.target.covariates, sampled[k]), append(r.target.layers, sampled[k])
			continue
		}
		if c.Number != nil {
			r.target.covariates = append(r.target.covariates, spatial.Covariate{Name: c.Name, Number: own.Number})
			continue
		}
		if err := knownLevels(t, own, c.Level); err != nil {
			return err
		}
		r.target.covariates = append(r.target.covariates, spatial.Covariate{Name: c.Name, Code: own.Code, Level: own.Level})
	}
	for _, h := range r.settings.Hold {
		if err := r.hold(h); err != nil {
			return err
		}
	}
	return nil
}

// knownLevels refuses a level that no observation had: nothing is known of it.
func knownLevels(t *observe.Table, c *observe.Column, levels []string) error {
	for i, k := range c.Code {
		if !slices.Contains(levels, c.Level[k]) {
			return &observe.Error{File: t.Source, Line: int(t.Line[i]), Row: int(t.Row[i]), Column: c.Name, Value: c.Level[k],
				What: "no observation has this level", Advice: "levels are " + strings.Join(firstFew(levels), ", ")}
		}
	}
	return nil
}
