package plan

import (
	"fmt"
	"slices"
	"strings"

	"github.com/pelletier/go-toml/v2/unstable"
)

var (
	sourceKeys  = []string{"files", "file", "split_by", "margin"}
	pictureKeys = []string{"scale", "breaks"}
	ownKeys     = keysWhere(func(w Word) bool { return !w.RunOnly }) // of [region.NAME]
	defaultKeys = keysWhere(func(w Word) bool { return !w.RunOnly && w.Name != "observations" })
	wordOf      = wordsByKey()
)

func keysWhere(suits func(Word) bool) []string {
	var keys []string
	for _, w := range words {
		if suits(w) {
			keys = append(keys, w.Key())
		}
	}
	return keys
}

func wordsByKey() map[string]Word {
	byKey := map[string]Word{}
	for _, w := range words {
		byKey[w.Key()] = w
	}
	return byKey
}

// pooled is a smoothness that only [defaults] can have.
const pooled = "pooled"

// takeDefault reads a word of [defaults].
func (r *planReader) takeDefault(e statement) error {
	if e.key == "observations" {
		return r.fault(e.offset, e.key, "cannot be the same for all regions", "name files under [regions], or observations in a [region.NAME]")
	}
	if e.key == "smoothness" && e.value.Kind == unstable.String && string(e.value.Data) == pooled {
		r.batch.Pooled = true
		return nil
	}
	return r.takeWord(&r.batch.Defaults, e, defaultKeys)
}

// takeOwn reads a word of a [region.NAME].
func (r *planReader) takeOwn(e statement) error {
	if e.key == "smoothness" && e.value.Kind == unstable.String && string(e.value.Data) == pooled {
		return r.fault(e.from, e.key, "is pooled over all regions or not at all", `put smoothness = "pooled" under [defaults]`)
	}
	return r.takeWord(&r.batch.Named[len(r.batch.Named)-1].Settings, e, ownKeys)
}

// unknown refuses a key that is none of a section's.
func (r *planReader) unknown(e statement, keys []string) error {
	key := strings.ReplaceAll(e.key, "-", "_")
	if w, ok := wordOf[key]; ok && w.RunOnly {
		flag := "--" + w.Name
		if !w.Flag() {
			flag += " " + w.Arg
		}
		return r.fault(e.offset, shownKey(e.key), "bears on how a batch is run, and is not said in a plan", "say "+flag+" on the command line")
	}
	hint := "drumlin map --help lists the words; in a plan they have underscores"
	if len(keys) < 10 {
		hint = "the keys of " + r.heading() + " are " + strings.Join(keys, ", ")
	}
	near, isNear := Nearest(key, keys)
	home := homeOf(key)
	switch {
	case isNear && near == key, isNear && home == "":
		hint = "did you mean " + near + "?"
	case home != "":
		hint = "it belongs under " + home
	}
	return r.fault(e.offset, shownKey(e.key), "is no word of "+r.heading(), hint)
}

// homeOf is the section that a key belongs to, or empty.
func homeOf(key string) string {
	switch {
	case key == "observations":
		return "a [region.NAME]"
	case slices.Contains(defaultKeys, key):
		return "[defaults]"
	case slices.Contains(sourceKeys, key):
		return "[regions]"
	case slices.Contains(pictureKeys, key):
		return "[pictures]"
	}
	return ""
}

// takeWord sets a word to its value.
func (r *planReader) takeWord(s *Settings, e statement, keys []string) error {
	if !slices.Contains(keys, e.key) {
		return r.unknown(e, keys)
	}
	w := wordOf[e.key]
	if err := r.hasForm(e, w.takes); err != nil {
		return err
	}
	if e.value.Kind == unstable.Array {
		return r.setList(s, w, e)
	}
	said, err := r.scalar(e.key, e.value, e.from)
	if err != nil {
		return err
	}
	return r.refused(w.Set(s, said), e.from)
}

// longestList bounds the lists of words; no model has as many columns.
const longestList = 1000

func (r *planReader) setList(s *Settings, w Word, e statement) error {
	list, offsets, err := r.texts(e)
	if err != nil {
		return err
	}
	if len(list) > longestList {
		return r.fault(e.from, e.key, fmt.Sprintf("is a list of %d, and %d are the most", len(list), longestList), "")
	}
	var alone Settings
	for i, said := range list {
		into := s
		if !w.Repeat {
			into = &alone // each by itself first, to know which is wrong
		}
		if err := w.Set(into, said); err != nil {
			return r.refused(err, offsets[i])
		}
	}
	if w.Repeat {
		return nil
	}
	return r.refused(w.Set(s, strings.Join(list, ",")), e.from)
}

// refused says of the plan what Set said of the word.
func (r *planReader) refused(err error, offset int) error {
	if err == nil {
		return nil
	}
	key, message, hint := keyed(err.(*Error))
	return r.fault(offset, key, message, hint)
}
