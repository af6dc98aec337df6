package batch

import (
	"crypto/sha256"
	"fmt"
	"maps"
	"regexp"
	"slices"
	"strings"
	"testing"
	"unicode"
	"unicode/utf8"

	"golang.org/x/text/cases"
	"golang.org/x/text/unicode/norm"
	"pgregory.net/rapid"
)

func suffix(name string, digits int) string {
	return "-" + fmt.Sprintf("%x", sha256.Sum256([]byte(name)))[:digits]
}

func TestFolderNameOfOneRegion(t *testing.T) {
	same := "" // the name itself, without digits
	for _, c := range []struct{ about, name, base string }{
		{"plain", "north-fen_2.1", same},
		{"accents", "Ørevåg", same},
		{"marks that have no composed form", "हिन्दी", same},
		{"right to left", "שדה-צפון", same},
		{"right to left, told so by a control", "\u202bשדה\u202c", "שדה"},
		{"digits of another script", "٣-٤", same},
		{"a date is no suffix", "survey-20240101", same},
		{"60 bytes", strings.Repeat("a", 60), same},
		{"61 bytes", strings.Repeat("a", 61), strings.Repeat("a", 51)},
		{"300 characters", strings.Repeat("marsh ", 50), strings.Repeat("marsh-", 8) + "mar"},
		{"cut between letters", strings.Repeat("a", 50) + "öööööö", strings.Repeat("a", 50)},
		{"cut before a dot", strings.Repeat("a", 50) + ".bbbbbbbbbbb", strings.Repeat("a", 50)},
		{"climbs", "../../etc/passwd", "etc-passwd"},
		{"absolute", "/etc/passwd", "etc-passwd"},
		{"slash", "a/b", "a-b"},
		{"backslash", `a\b`, "a-b"},
		{"drive", `C:\data`, "C-data"},
		{"stream", "a:b", "a-b"},
		{"patterns", "a*b?c", "a-b-c"},
		{"run", "a -- b", "a-b"},
		{"run as such", "a--b", "a-b"},
		{"empty", "", "region"},
		{"blanks", " \t ", "region"},
		{"punctuation only", "!?/..-", "region"},
		{"dot", ".", "region"},
		{"two dots", "..", "region"},
		{"hidden", ".hidden", "hidden"},
		{"trailing dots", "fen...", "fen"},
		{"trailing blanks", "fen  ", "fen"},
		{"leading hyphen", "-rf", "rf"},
		{"control characters", "a\tb\nc\x7fd\x1be", "a-b-c-d-e"},
		{"a NUL", "a\x00b", "a-b"},
		{"no UTF-8", "a\xffb", "a-b"},
		{"emoji", "fen 🦆", "fen"},
		{"emoji with a selector", "❤\ufe0f", "region"},
		{"joined emoji", "👩\u200d🌾 field", "field"},
		{"decomposed", "e\u0301tang", "étang"},
		{"mark on nothing", "\u0301a", "a"},
		{"invisible letter", "fen\u3164", "fen"},
		{"invisible mark", "a\u034fb", "a-b"},
		{"superscript of a device", "COM¹", "COM"},
		{"device", "CON", "CON"},
		{"device in small letters", "nul", "nul"},
		{"device with a number", "lpt9", "lpt9"},
		{"device with an extension", "con.txt", "con-txt"},
		{"device with two", "Aux.tar.gz", "Aux-tar-gz"},
		{"device with a blank and an extension", "con .txt", "con-.txt"},
		{"almost a device", "console", same},
		{"device in a name", "a.con", same},
		{"ledger", "ledger.jsonl", "ledger-jsonl"},
		{"ledger in capitals", "LEDGER.CSV", "LEDGER-CSV"},
		{"a part's ledger", "ledger.3-of-4.jsonl", "ledger-3-of-4-jsonl"},
		{"comparison", "regions.csv", "regions-csv"},
		{"mosaic", "mosaic.png", "mosaic-png"},
		{"album", "album.html", "album-html"},
		{"job file", "batch.slurm", "batch-slurm"},
		{"breaks", "breaks.toml", "breaks-toml"},
		{"breaks to a file system that folds", "breakſ.toml", "breakſ-toml"},
		{"pooled smoothness", "pooled.json", "pooled-json"},
		{"logs of the parts", "Logs", "Logs"},
		{"unfinished folder", "fen.partial", "fen-partial"},
		{"lock", "fen.lock", "fen-lock"},
		{"folder on its way out", "fen.replaced", "fen-replaced"},
		{"nothing of ours", "regions", same},
		{"nothing of ours either", "mosaic", same},
	} {
		want := c.name
		if c.base != same {
			want = c.base + suffix(c.name, 8)
		}
		if got := FolderNames([]string{c.name})[0]; got != want {
			t.Errorf("%s: %q became %q, want %q", c.about, c.name, got, want)
		}
	}
}

// long names differ only beyond what stays of them.
func long(i int) string { return strings.Repeat("a", 60) + fmt.Sprintf(" %d", i) }

func TestFolderNamesOfSeveral(t *testing.T) {
	for _, c := range []struct {
		about  string
		names  []string
		suffix []int // digits
	}{
		{"different", []string{"a", "b"}, []int{0, 0}},
		{"by case", []string{"Fen", "fen", "fell"}, []int{8, 8, 0}},
		{"three by case", []string{"FEN", "Fen", "fen"}, []int{8, 8, 8}},
		{"composed and not", []string{"étang", "e\u0301tang"}, []int{8, 8}},
		{"composed and not, by case", []string{"étang", "E\u0301tang"}, []int{8, 8}},
		{"final sigma", []string{"ΟΔΟΣ", "Οδος"}, []int{8, 8}},
		{"sharp s", []string{"Weißach", "Weissach"}, []int{8, 8}},
		{"dotted i", []string{"İzmir", "izmir", "ızmir"}, []int{8, 8, 8}},
		{"the same once safe", []string{"a/b", `a\b`, "a-b"}, []int{8, 8, 0}},
		{"taken by another's suffix", []string{"a/b", "a-b" + suffix("a/b", 8)}, []int{16, 8}},
		{"taken by another's suffix but for case", []string{"a/b", "A-b" + suffix("a/b", 8)}, []int{16, 8}},
		// Found by trying: the SHA-256 of both begins with b014b038.
		{"the same 8 digits", []string{long(11793), long(43597)}, []int{16, 16}},
	} {
		got := FolderNames(c.names)
		for i, name := range c.names {
			want := safe(name)
			if n := c.suffix[i]; n > 0 {
				want = want[:min(len(want), 59-n)] + suffix(name, n)
			}
			if got[i] != want {
				t.Errorf("%s: %.40q became %q, want %q", c.about, name, got[i], want)
			}
		}
	}
}

func TestFolderNamesPanicOnEqualNames(t *testing.T) {
	defer func() {
		if r := recover(); r != duplicateName {
			t.Errorf("recovered %v", r)
		}
	}()
	FolderNames([]string{"fen", "fell", "fen"})
}

// How a file system may hold one name for another: each of these maps whole names.
var foldings = map[string]func(string) string{
	"small letters":      strings.ToLower,
	"capitals":           strings.ToUpper,
	"simple folding":     func(s string) string { return strings.Map(orbit, s) },
	"full folding":       func(s string) string { return cases.Fold().String(s) },
	"composed":           norm.NFC.String,
	"decomposed":         norm.NFD.String,
	"small and composed": func(s string) string { return strings.ToLower(norm.NFC.String(s)) },
}

// orbit returns the least of the letters that differ from r by case alone.
func orbit(r rune) rune {
	least := r
	for s := unicode.SimpleFold(r); s != r; s = unicode.SimpleFold(s) {
		least = min(least, s)
	}
	return least
}

func TestFoldIsNoFinerThanAnyFolding(t *testing.T) {
	for r := rune(0); r <= unicode.MaxRune; r++ {
		if !unicode.IsLetter(r) && !unicode.IsMark(r) {
			continue
		}
		s := "a" + string(r) // a mark has something to stand on
		key := fold(s)
		for name, f := range foldings {
			if folded := f(s); folded != s && fold(folded) != key {
				t.Errorf("%U is %q, and after %s %q", r, key, name, fold(folded))
			}
		}
	}
}

// names are drawn so that there are many of nearly the same.
func drawNames(t *rapid.T) []string {
	letter := rapid.OneOf(rapid.SampledFrom([]rune(`aAbcCoOnNßſİıσςΣéÉ./\-_ 1`+"\u0301\u0345\u200d\x00🦆שא")), rapid.Rune())
	name := rapid.OneOf(
		rapid.StringOfN(letter, 0, 4, -1),
		rapid.StringOfN(letter, 0, 100, -1),
		rapid.SampledFrom([]string{"con", "Con", "CON.txt", "ledger.x", "fen.lock", "LOGS", "a-b" + suffix("a/b", 8), "A-B" + suffix("a/b", 8), "a/b"}),
		rapid.StringMatching("[a.]{45,65}[é🦆]{0,9}"),
	)
	return rapid.SliceOfNDistinct(name, 0, 30, rapid.ID).Draw(t, "names")
}

var windowsDevice = regexp.MustCompile(`(?i)^(con|prn|aux|nul|com[0-9]|lpt[0-9]) *(\..*)?$`)

func TestFolderNamesAreSafeAndDistinct(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		names := drawNames(t)
		got := FolderNames(names)
		taken := map[string]map[string]string{}
		for folding := range foldings {
			taken[folding] = map[string]string{}
		}
		for i, f := range got {
			if f == "" || len(f) > 60 || !utf8.ValidString(f) || !norm.NFC.IsNormalString(f) || windowsDevice.MatchString(f) || reserved(fold(f)) {
				t.Fatalf("%q became %q", names[i], f)
			}
			if strings.ContainsAny(f[:1]+f[len(f)-1:], "-. ") || strings.Contains(f, "--") {
				t.Fatalf("%q became %q", names[i], f)
			}
			for _, r := range f {
				if !strings.ContainsRune("-_.", r) && !unicode.In(r, unicode.L, unicode.M, unicode.Nd) {
					t.Fatalf("%q became %q, with %q", names[i], f, r)
				}
			}
			for folding, to := range foldings {
				if other, ok := taken[folding][to(f)]; ok {
					t.Fatalf("%q and %q both became %q after %s", names[i], other, f, folding)
				}
				taken[folding][to(f)] = names[i]
			}
		}
	})
}

func TestFolderNamesDoNotDependOnOrder(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		names := drawNames(t)
		if len(names) == 0 {
			return
		}
		shuffled := rapid.Permutation(names).Draw(t, "shuffled")
		want, got := map[string]string{}, map[string]string{}
		for i, f := range FolderNames(names) {
			want[names[i]] = f
		}
		for i, f := range FolderNames(shuffled) {
			got[shuffled[i]] = f
		}
		if !maps.Equal(want, got) {
			t.Fatalf("%v and %v", want, got)
		}
	})
}

func TestFolderNamesOfManyRegions(t *testing.T) {
	names := make([]string, 100_000)
	for i := range names {
		names[i] = long(i)
	}
	got := FolderNames(names)
	if distinct := slices.Compact(slices.Sorted(slices.Values(got))); len(distinct) != len(names) {
		t.Errorf("%d folders for %d names", len(distinct), len(names))
	}
}

func BenchmarkFolderNames(b *testing.B) {
	for _, kind := range []struct{ name, format string }{{"plain", "district-%d"}, {"accents", "Ørevåg %d"}} {
		b.Run(kind.name+"/n=100000", func(b *testing.B) {
			names := make([]string, 100_000)
			for i := range names {
				names[i] = fmt.Sprintf(kind.format, i)
			}
			b.ReportAllocs()
			for b.Loop() {
				FolderNames(names)
			}
		})
	}
}
