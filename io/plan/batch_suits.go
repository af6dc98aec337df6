package plan

import (
	"cmp"
)

// suits refuses what is wrong between sections.
func (b *Batch) suits() error {
	return cmp.Or(b.hasRegions(), b.sharesColours(), b.poolsAll())
}

// hasRegions refuses a plan that does not say where its regions come from.
func (b *Batch) hasRegions() error {
	files, byPattern := b.regions.place("files")
	file, byColumn := b.regions.place("file")
	split, splits := b.regions.place("split_by")
	switch {
	case byPattern && byColumn && file.after(files):
		return b.fault(file, "file", "stands beside files, and regions come from one of the two", "keep one of them")
	case byPattern && byColumn:
		return b.fault(files, "files", "stands beside file, and regions come from one of the two", "keep one of them")
	case byPattern && splits:
		return b.fault(split, "split_by", "goes with file, and with files each file is a region", "leave it out, or name one table with file")
	case byColumn && !splits:
		return b.fault(file, "file", "is named without split_by", `add split_by = "COLUMN", the column that names the region of a row; `+
			"for files that are a region each use files")
	case splits && !byColumn:
		return b.fault(split, "split_by", "is named without file", `add file = "FILE", the table with the rows of all regions`)
	case byPattern || byColumn:
		return nil
	}
	return b.hasTables()
}

// hasTables demands a table of each region where [regions] names none.
func (b *Batch) hasTables() error {
	const advice = `add files = "data/*.csv", or file and split_by, under [regions]`
	for i := range b.Named {
		if n := &b.Named[i]; n.Settings.Observations == nil {
			return b.fault(n.section.head, header("region", n.Name), "names no observations, and [regions] names no files",
				`add observations = "FILE" to it; or `+advice)
		}
	}
	switch {
	case len(b.Named) > 0:
		return nil
	case b.regions.head != place{}:
		return b.fault(b.regions.head, "[regions]", "names no files", advice)
	}
	return b.fault(beginning, "", "the plan names no regions", advice+", or a [region.NAME] with observations")
}

func (b *Batch) sharesColours() error {
	if at, said := b.pictures.place("breaks"); said && b.Own {
		return b.fault(at, "breaks", `are for all regions, and with scale = "own" each has its own`, "keep one of the two")
	}
	return nil
}

// poolsAll refuses words against one smoothness for all regions.
func (b *Batch) poolsAll() error {
	if !b.Pooled {
		return nil
	}
	if err := b.pools(b.Defaults, b.defaults); err != nil {
		return err
	}
	for i := range b.Named {
		if err := b.pools(b.Named[i].Settings, b.Named[i].section); err != nil {
			return err
		}
	}
	return nil
}

// pools refuses words of one section against a smoothness that is pooled.
func (b *Batch) pools(s Settings, said section) error {
	const advice = `leave it out, or leave out smoothness = "pooled" under [defaults]`
	var key, message string
	switch {
	case s.Smoothness != nil:
		key, message = "smoothness", "is pooled under [defaults], and a region cannot have its own"
	case s.Surface != nil && *s.Surface == NoSurface:
		key, message = "surface", "is none, and smoothness is pooled: there is no surface to pool it with"
	case s.SurfaceSmoothness != nil && *s.SurfaceSmoothness == OwnSmoothness:
		key, message = "surface_smoothness", "is own, and smoothness is pooled: one smoothness is for all surfaces"
	case s.SmoothnessUncertainty != nil && *s.SmoothnessUncertainty == On:
		key, message = "smoothness_uncertainty", "is on, and smoothness is pooled: what all regions together have chosen is taken as known"
	case s.ExtraVariation != nil && *s.ExtraVariation == ScaleVariation:
		key, message = "extra_variation", "is scale, and smoothness is pooled: there is no restricted likelihood to pool where the variation is scaled"
	default:
		return nil
	}
	at, _ := said.place(key)
	return b.fault(at, key, message, advice)
}
