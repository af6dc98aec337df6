package plan

import (
	"fmt"
	"path"
	"path/filepath"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

// takeSource reads a key of [regions].
func (r *planReader) takeSource(e statement) (err error) {
	b := r.batch
	switch e.key {
	case "files":
		b.Patterns, b.patterns, err = r.files(e)
	case "file":
		b.File, err = r.oneText(e)
	case "split_by":
		b.SplitBy, err = r.oneText(e)
	case "margin":
		b.Margin, err = r.margin(e)
	default:
		err = r.unknown(e, sourceKeys)
	}
	return err
}

// takePicture reads a key of [pictures].
func (r *planReader) takePicture(e statement) (err error) {
	b := r.batch
	switch e.key {
	case "scale":
		b.Own, err = r.scale(e)
	case "breaks":
		b.Breaks, b.BreaksFile, err = r.breaks(e)
	default:
		err = r.unknown(e, pictureKeys)
	}
	return err
}

func (r *planReader) files(e statement) (patterns []string, at []place, err error) {
	if err := r.hasForm(e, asList|asText); err != nil {
		return nil, nil, err
	}
	patterns, offsets := []string{string(e.value.Data)}, []int{e.from}
	if e.value.Kind == unstable.Array {
		if patterns, offsets, err = r.texts(e); err != nil {
			return nil, nil, err
		}
	}
	for i, pattern := range patterns {
		_, err := parseText(pattern)
		if _, bad := path.Match(filepath.ToSlash(pattern), ""); bad != nil {
			err = advise("is no pattern of file names", "* stands for any letters, ? for one, [a-z] for one of those")
		}
		if err != nil {
			return nil, nil, r.refused(located(e.key, pattern, err), offsets[i])
		}
		at = append(at, r.cursor.place(offsets[i]))
	}
	return patterns, at, nil
}

// oneText reads a value that is one text.
func (r *planReader) oneText(e statement) (string, error) {
	if err := r.hasForm(e, asText); err != nil {
		return "", err
	}
	said, err := parseText(string(e.value.Data))
	if err != nil {
		return "", r.refused(located(e.key, string(e.value.Data), err), e.from)
	}
	return said, nil
}

func (r *planReader) margin(e statement) (float64, error) {
	if err := r.hasForm(e, asNumber|asText); err != nil {
		return 0, err
	}
	said, err := r.scalar(e.key, e.value, e.from)
	if err != nil {
		return 0, err
	}
	metres, err := parseDistance(said)
	if err != nil {
		return 0, r.refused(located(e.key, said, err), e.from)
	}
	return metres, nil
}

// parseDistance reads a distance in metres, or with m or km behind it.
func parseDistance(value string) (metres float64, err error) {
	number, unit := strings.TrimSpace(value), 1.0
	if kilometres, ok := strings.CutSuffix(number, "km"); ok {
		number, unit = kilometres, 1000
	} else {
		number = strings.TrimSuffix(number, "m")
	}
	v, err := parseNumber(number)
	if err != nil && hintOf(err) == "" {
		return 0, advise("is not a distance", `write it as "10 km", "500 m" or a number of metres`)
	}
	if err != nil {
		return 0, err
	}
	return parsePositive(spoken(v * unit))
}

func (r *planReader) scale(e statement) (own bool, err error) {
	said, err := r.oneText(e)
	if err != nil {
		return false, err
	}
	if _, err := parseChoice("shared", "own")(said); err != nil {
		return false, r.refused(located(e.key, said, err), e.from)
	}
	return said == "own", nil
}

const leastBreaks, mostBreaks = 2, 11

// breaks reads either numbers or the path of a file that has them.
func (r *planReader) breaks(e statement) (list []float64, file string, err error) {
	switch {
	case e.value.Kind == unstable.String:
		file, err = r.oneText(e)
		return nil, file, err
	case e.value.Kind != unstable.Array:
		return nil, "", r.fault(e.from, e.key, "takes a list of numbers, or the path of a file in quotes, not "+called(e.value.Kind),
			"for example breaks = [0, 5, 10, 20]")
	}
	for it := e.value.Children(); it.Next(); {
		v, err := r.rising(e, it.Node(), list)
		if err != nil {
			return nil, "", err
		}
		if list = append(list, v); len(list) > mostBreaks {
			break
		}
	}
	if len(list) < leastBreaks || len(list) > mostBreaks {
		return nil, "", r.fault(e.from, e.key, fmt.Sprintf("takes from %d to %d numbers", leastBreaks, mostBreaks), "")
	}
	return list, "", nil
}

// rising reads the next of breaks.
func (r *planReader) rising(e statement, n *unstable.Node, before []float64) (float64, error) {
	offset := offsetOf(n, e.from)
	if n.Kind != unstable.Integer && n.Kind != unstable.Float {
		return 0, r.fault(offset, e.key, "takes numbers, not "+called(n.Kind), "")
	}
	said, err := r.scalar(e.key, n, offset)
	if err != nil {
		return 0, err
	}
	v, err := parseNumber(said)
	if k := len(before); err == nil && k > 0 && v <= before[k-1] {
		err = advise("is not above "+spoken(before[k-1])+", the one before it", "let them rise")
	}
	if err != nil {
		return 0, r.refused(located(e.key, said, err), offset)
	}
	return v, nil
}
