package batch

import (
	"crypto/sha256"
	"encoding/hex"
	"regexp"
	"slices"
	"strings"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/cases"
	"golang.org/x/text/unicode/norm"
)

const duplicateName = "batch: two regions of the same name"

// longestFolder is the most bytes that a folder's name has. It leaves room for what is put behind it on the way.
const longestFolder = 60

// FolderNames returns, for each region's name, the name of its folder: safe on Linux, macOS and Windows, and different
// for all, also where a file system takes upper and lower case, or composed and decomposed letters, for the same.
//
// Unicode letters with their marks, digits and "-_." stay, in composed form (NFC); what else there is turns to "-", once
// for a run of it, and none stands at either end. A name that is safe as given is its folder's name. One that had to be
// changed, is longer than 60 bytes, belongs to a device under Windows or to a file of the batch itself, or is the same as
// another's but for case, is followed by "-" and hexadecimal digits of its SHA-256, so that apart from the last case the
// folder does not depend on which other regions there are, and never on their order. There are 8 digits, and more only
// where two folders would be the same with 8.
//
// FolderNames panics if two names are the same byte for byte.
func FolderNames(names []string) []string {
	folders := make([]folder, len(names))
	seen := make(map[string]bool, len(names))
	alike := make(map[string][]int, len(names))
	for i, name := range names {
		if seen[name] {
			panic(duplicateName)
		}
		seen[name] = true
		folders[i] = newFolder(name)
		key := folders[i].key
		if folders[i].base != name {
			key = fold(name)
		}
		alike[key] = append(alike[key], i)
	}
	for _, same := range alike {
		for _, i := range same {
			if len(same) > 1 && folders[i].digits == 0 {
				folders[i].lengthen()
			}
		}
	}
	for separate(folders) {
	}
	result := make([]string, len(folders))
	for i := range folders {
		result[i] = folders[i].String()
	}
	return result
}

// separate gives more digits to all folders that are the same but for case, and reports whether there were any.
func separate(folders []folder) bool {
	first := make(map[string]int, len(folders))
	clash := make(map[int]bool)
	for i := range folders {
		key := folders[i].key
		if folders[i].digits > 0 {
			key = fold(folders[i].String())
		}
		if j, taken := first[key]; taken {
			clash[i], clash[j] = true, true
			continue
		}
		first[key] = i
	}
	changed := false
	for i := range clash {
		changed = folders[i].lengthen() || changed
	}
	return changed
}

// folder is a folder's name in the making.
type folder struct {
	name   string // of the region, as given
	base   string // what of it is safe
	key    string // base folded
	digits int    // of its SHA-256 that follow; 0 only where name and base are the same
}

func newFolder(name string) folder {
	base := safe(name)
	key := fold(base)
	taken := reserved(key)
	if taken {
		base = safe(strings.ReplaceAll(base, ".", "-")) // "con.txt-..." would still be the device
		key = fold(base)
	}
	if base == "" {
		base = "region"
	}
	f := folder{name: name, base: base, key: key}
	if taken || base != name || len(base) > longestFolder {
		f.lengthen()
	}
	return f
}

// lengthen takes more digits, up to half of them, where the chance of two names having the same is nil. It reports
// whether there were more to take.
func (f *folder) lengthen() bool {
	if f.digits == sha256.Size {
		return false
	}
	f.digits = max(8, 2*f.digits)
	return true
}

func (f *folder) String() string {
	if f.digits == 0 {
		return f.base
	}
	sum := sha256.Sum256([]byte(f.name))
	return cut(f.base, longestFolder-1-f.digits) + "-" + hex.EncodeToString(sum[:])[:f.digits]
}

// cut returns the start of a folder's name, of at most the given bytes and of whole letters.
func cut(base string, most int) string {
	if len(base) <= most {
		return base
	}
	for !utf8.RuneStart(base[most]) {
		most--
	}
	return strings.TrimRight(base[:most], "-.")
}

// safe keeps of a name what may stand in a folder's.
func safe(name string) string {
	var b strings.Builder
	last := '-' // written before; at the start, where "-" is not wanted either
	for _, r := range norm.NFC.String(name) {
		if !keeps(r) && !(unicode.IsMark(r) && visible(r) && (unicode.IsLetter(last) || unicode.IsMark(last))) {
			r = '-'
		}
		if r != '-' || last != '-' {
			b.WriteRune(r)
		}
		last = r
	}
	return strings.Trim(b.String(), "-.")
}

func keeps(r rune) bool {
	return r == '_' || r == '.' || (unicode.IsLetter(r) || unicode.IsDigit(r)) && visible(r)
}

// visible is false for the letters and marks that show nothing, so that two names could look the same.
func visible(r rune) bool {
	return !unicode.In(r, unicode.Other_Default_Ignorable_Code_Point, unicode.Variation_Selector)
}

// fold returns what file systems that ignore case may take for the same name. They differ in how they go about it
// (small letters, capitals, full case folding), so names that are the same to any of them are the same here.
func fold(name string) string {
	name = strings.ToLower(norm.NFC.String(name))
	if !slices.ContainsFunc([]byte(name), func(b byte) bool { return b >= utf8.RuneSelf }) {
		return name
	}
	name = cases.Fold().String(strings.ToUpper(name))
	return norm.NFC.String(strings.ReplaceAll(name, "i\u0307", "i")) // what full folding makes of a dotted capital I
}

// device matches what Windows takes for a device, with or without an extension (Microsoft, "Naming Files, Paths, and
// Namespaces"; from memory).
var device = regexp.MustCompile(`^(con|prn|aux|nul|(com|lpt)[0-9])(\.|$)`)

// Names in the folder of a batch that are its own, in small letters.
var (
	ownNames   = []string{"regions.csv", "breaks.toml", pooledFile, logFolder}
	ownStarts  = []string{"ledger.", "mosaic.", "album.", "batch."}
	ownEndings = []string{".partial", ".lock", ".replaced"}
)

// reserved reports whether a folder must not have that name, which is folded: a device's, or one that the batch uses.
func reserved(key string) bool {
	return device.MatchString(key) || slices.Contains(ownNames, key) ||
		slices.ContainsFunc(ownStarts, func(s string) bool { return strings.HasPrefix(key, s) }) ||
		slices.ContainsFunc(ownEndings, func(s string) bool { return strings.HasSuffix(key, s) })
}
