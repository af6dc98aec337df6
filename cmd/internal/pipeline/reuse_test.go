package pipeline

import (
	"bytes"
	"encoding/binary"
	"errors"
	"fmt"
	"math"
	"os"
	"path/filepath"
	"slices"
	"strings"
	"testing"

	"drumlin/io/archive"

	"github.com/google/go-cmp/cmp"
)

func reused(t *testing.T, saved, at string) string {
	t.Helper()
	out := filepath.Join(t.TempDir(), "reused.csv")
	if err := Reuse(t.Context(), ReuseRequest{Saved: saved, At: at, Out: out, Workers: 1}, silent{}); err != nil {
		t.Fatal(err)
	}
	return out
}

func lines(t *testing.T, path string) []string {
	t.Helper()
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	return strings.Split(string(raw), "\n")
}

var (
	utm    = field{n: 60, wide: 9000, high: 7000, x0: 431000, y0: 5512000, scale: 1, xName: "easting", yName: "northing"}
	lonLat = field{n: 60, wide: 1.2, high: 0.9, x0: 17.3, y0: -33.1, scale: 1, xName: "lon", yName: "lat"}
)

// models are ways to look at the invented survey, with what is held where a map needs it.
var models = []struct {
	name        string
	words, hold []string
}{
	{"measurement", []string{"response=zinc"}, nil},
	{"covariates", []string{"response=zinc", "linear=depth", "category=soil", "threshold=30", "confidence=0.8"}, []string{"hold=depth=0.375", "hold=soil=peat"}},
	{"log", []string{"response=zinc", "distribution=gaussian", "link=log", "linear=depth"}, []string{"hold=depth=0.375"}},
	{"rate", []string{"response=cases", "people=people", "per=1000", "threshold=3", "reference=overall"}, nil},
	{"share", []string{"response=positive", "trials=examined", "per=100", "threshold=40", "category=soil"}, []string{"hold=soil=peat"}},
	{"no surface", []string{"response=n", "area=plot_ha", "surface=none", "linear=depth"}, []string{"hold=depth=0.375"}},
	{"curve", []string{"response=zinc", "curve=depth", "smoothness-uncertainty=off"}, []string{"hold=depth=0.375"}},
	{"group", []string{"response=caught", "effort=plot_ha", "group=observer", "threshold=9"}, nil},
}

// planar are models that need no other plane than the local one to be tried in.
var planar = []struct {
	name        string
	words, hold []string
}{
	{"curve for each soil", []string{"response=zinc", "curve-per=depth=soil", "group=observer", "threshold=30"}, []string{"hold=depth=0.375", "hold=soil=peat"}},
	{"surface for each year", []string{"response=caught", "effort=plot_ha", "surface-per=year", "curve=depth", "per=10"}, []string{"hold=depth=0.375", "hold=year=dry"}},
	{"surfaces with groups", []string{"response=seen", "trials=examined", "surface-per=year", "surface-smoothness=own", "group=observer"}, []string{"hold=year=dry"}},
	{"shrunken", []string{"response=zinc", "shrink", "category=soil"}, []string{"hold=soil=peat"}},
	{"curves alone", []string{"response=dose", "distribution=gamma", "surface=none", "curve=depth", "group=observer"}, []string{"hold=depth=0.375"}},
	{"certain", []string{"response=cases", "people=people", "smoothness-uncertainty=off", "max-knots=30"}, nil},
	{"negative-binomial", []string{"response=caught", "effort=plot_ha", "distribution=negative-binomial", "reference=overall"}, nil},
	{"beta-binomial", []string{"response=seen", "trials=examined", "distribution=beta-binomial", "threshold=0.4"}, nil},
	{"gamma", []string{"response=dose", "distribution=gamma", "linear=depth"}, []string{"hold=depth=0.375"}},
	{"tweedie", []string{"response=rain", "distribution=tweedie", "area=plot_ha", "threshold=2"}, nil},
	{"shape given", []string{"response=rain", "distribution=tweedie", "shape=1.6", "confidence=0.5"}, nil},
	{"complementary log-log", []string{"response=positive", "trials=examined", "link=complementary-log-log", "curve=depth"}, []string{"hold=depth=0.375"}},
	{"scaled", []string{"response=caught", "effort=plot_ha", "extra-variation=scale", "threshold=9"}, nil},
}

// TestReuseIsMap: the saved surface gives the same text as map --at for the same places, and as map for the cells of
// its lattice, whose coordinates surface.csv has in full.
func TestReuseIsMap(t *testing.T) {
	for plane, f := range map[string]field{"local": plain, "utm": utm, "lon-lat": lonLat} {
		obs, elsewhere := write(t, "obs.csv", f.table(1)), write(t, "at.csv", f.table(2))
		tried := models
		if plane == "local" && !testing.Short() {
			tried = slices.Concat(models, planar)
		}
		for _, m := range tried {
			t.Run(plane+"/"+m.name, func(t *testing.T) {
				words := m.words
				if plane == "utm" {
					words = append([]string{"crs=EPSG:32633"}, words...)
				}
				at := mapped(t, obs, append([]string{"at=" + elsewhere, "write=csv,saved"}, words...)...)
				want := lines(t, filepath.Join(at, "surface.csv"))
				got := lines(t, reused(t, filepath.Join(at, "saved.surface"), elsewhere))
				if diff := cmp.Diff(want, got); diff != "" || len(want) != 62 {
					t.Errorf("map --at and reuse differ: %s", diff)
				}
				inOrder(t, f, elsewhere, filepath.Join(at, "surface.csv"))

				lattice := mapped(t, obs, append(append([]string{"cells-across=15", "write=csv,saved"}, words...), m.hold...)...)
				cells := readSheet(t, filepath.Join(lattice, "surface.csv"))
				if plane != "lon-lat" {
					want := lines(t, filepath.Join(lattice, "surface.csv"))
					got := lines(t, reused(t, filepath.Join(lattice, "saved.surface"), write(t, "cells.csv", places(cells, "x", "y"))))
					if diff := cmp.Diff(want, got); diff != "" || len(want) < 60 {
						t.Errorf("map and reuse differ in the cells of the lattice: %s", diff)
					}
					return
				}
				// Longitude and latitude go into the plane and back with rounding, so the text may differ in its last digits.
				again := readSheet(t, reused(t, filepath.Join(lattice, "saved.surface"), write(t, "cells.csv", places(cells, "lon", "lat"))))
				for _, name := range cells.header {
					for i, v := range cells.numbers(name) {
						if w := again.numbers(name)[i]; math.Abs(v-w) > 1e-9*math.Max(1, math.Abs(v)) {
							t.Errorf("%s of row %d: %.12g from map, %.12g from reuse", name, i+1, v, w)
						}
					}
				}
			})
		}
	}
}

// places writes the coordinates of the cells with the covariates that the models hold.
func places(cells sheet, x, y string) string {
	var b strings.Builder
	fmt.Fprintf(&b, "name,%s,%s,depth,soil,year\n", x, y)
	for i, v := range cells.text(x) {
		fmt.Fprintf(&b, "cell %d,%s,%s,0.375,peat,dry\n", i, v, cells.text(y)[i])
	}
	return b.String()
}

// inOrder demands a row for each place of the file, in its order, with its coordinates.
func inOrder(t *testing.T, f field, at, surface string) {
	t.Helper()
	asked, got := readSheet(t, at), readSheet(t, surface)
	if len(asked.rows) != len(got.rows) {
		t.Fatalf("%d rows for %d places", len(got.rows), len(asked.rows))
	}
	x, y := "x", "y"
	if f.xName == "lon" {
		x, y = "lon", "lat"
	}
	for i := range asked.rows {
		dx, dy := asked.numbers(f.xName)[i]-got.numbers(x)[i], asked.numbers(f.yName)[i]-got.numbers(y)[i]
		if math.Abs(dx) > 1e-11 || math.Abs(dy) > 1e-11 {
			t.Errorf("row %d is (%g, %g) away from the place asked about", i+1, dx, dy)
		}
	}
}

// TestAtKeepsPlacesFarAway: places are never masked, and one that comes twice has two rows that are alike.
func TestAtKeepsPlacesFarAway(t *testing.T) {
	at := write(t, "at.csv", "x,y\n500,400\n50000,-9000\n500,400\n0.25,799\n")
	dir := mapped(t, write(t, "obs.csv", plain.table(1)), "response=zinc", "at="+at, "write=csv")
	s := lines(t, filepath.Join(dir, "surface.csv"))
	if len(s) != 6 || s[1] != s[3] || !strings.HasPrefix(s[2], "50000,-9000,,,") || !strings.HasPrefix(s[4], "0.25,799,,,") {
		t.Errorf("surface.csv holds\n%s", strings.Join(s, "\n"))
	}
	se := readSheet(t, filepath.Join(dir, "surface.csv")).numbers("standard_error")
	if !(se[1] > 10*se[0]) {
		t.Errorf("fifty kilometres away the error is %g, and %g among the observations", se[1], se[0])
	}
}

// TestReuseOfOnePlaceAtATime: the figures of a place do not depend on its company.
func TestReuseOfOnePlaceAtATime(t *testing.T) {
	dir := mapped(t, write(t, "obs.csv", plain.table(1)), "response=cases", "people=people", "cells-across=20", "write=csv,saved")
	all := lines(t, filepath.Join(dir, "surface.csv"))
	cells := readSheet(t, filepath.Join(dir, "surface.csv"))
	for _, i := range []int{0, 7, 100, len(cells.rows) - 1} {
		at := write(t, "one.csv", "x,y\n"+cells.rows[i][0]+","+cells.rows[i][1]+"\n")
		if got := lines(t, reused(t, filepath.Join(dir, "saved.surface"), at))[1]; got != all[i+1] {
			t.Errorf("alone  %s\namong  %s", got, all[i+1])
		}
	}
}

func TestReuseOfColumnsByName(t *testing.T) {
	f := plain
	f.xName, f.yName = "east_m", "north_m"
	obs := write(t, "obs.csv", f.table(1))
	dir := mapped(t, obs, "response=zinc", "x=east_m", "y=north_m", "at="+obs, "write=csv,saved")
	out := filepath.Join(t.TempDir(), "out.csv")
	q := ReuseRequest{Saved: filepath.Join(dir, "saved.surface"), At: obs, Out: out, X: "east_m", Y: "north_m", Workers: 2}
	if err := Reuse(t.Context(), q, silent{}); err != nil {
		t.Fatal(err)
	}
	if diff := cmp.Diff(lines(t, filepath.Join(dir, "surface.csv")), lines(t, out)); diff != "" {
		t.Error(diff)
	}
}

// TestDamagedSurface: whatever a file that is not a whole saved surface of this version holds, it is refused with a
// reason, and no table appears.
func TestDamagedSurface(t *testing.T) {
	at := write(t, "at.csv", "x,y,depth\n1,2,3\n")
	dir := mapped(t, write(t, "obs.csv", plain.table(1)), "response=zinc", "linear=depth", "hold=depth=mean", "max-knots=5", "cells-across=5", "write=saved")
	whole, err := os.ReadFile(filepath.Join(dir, "saved.surface"))
	if err != nil {
		t.Fatal(err)
	}
	folder := t.TempDir()
	saved, out := filepath.Join(folder, "saved.surface"), filepath.Join(folder, "out.csv")
	try := func(raw []byte) error {
		t.Helper()
		if err := os.WriteFile(saved, raw, 0o644); err != nil {
			t.Fatal(err)
		}
		return Reuse(t.Context(), ReuseRequest{Saved: saved, At: at, Out: out, Workers: 1}, silent{})
	}
	refused := func(what string, raw []byte) error {
		t.Helper()
		err := try(raw)
		var hinted interface{ Hint() string }
		if err == nil || !errors.As(err, &hinted) || hinted.Hint() == "" || !strings.HasPrefix(err.Error(), saved+": ") {
			t.Fatalf("%s: %v", what, err)
		}
		if entries, _ := os.ReadDir(folder); len(entries) != 1 {
			t.Fatalf("%s: something was written", what)
		}
		return err
	}
	step := max(1, len(whole)/400)
	for n := 0; n < len(whole); n += step {
		refused(fmt.Sprintf("cut after %d bytes of %d", n, len(whole)), whole[:n])
	}
	for n := range 40 {
		refused("cut at its end", whole[:len(whole)-1-n])
	}
	for n := 0; n < len(whole); n += step {
		raw := bytes.Clone(whole)
		raw[n] ^= 1 << (n % 8)
		refused(fmt.Sprintf("bit of byte %d turned", n), raw)
	}
	refused("a byte too many", append(bytes.Clone(whole), 0))
	refused("twice", append(bytes.Clone(whole), whole...))
	refused("zeros", make([]byte, len(whole)))

	word := len("drumlin-surface\n") // version and length of the head follow, 32 bits each
	newer := bytes.Clone(whole)
	binary.LittleEndian.PutUint32(newer[word:], archive.Version+1)
	if err := refused("newer", newer); !strings.Contains(err.Error(), fmt.Sprint(archive.Version+1)) {
		t.Errorf("a newer layout: %v", err)
	}
	for _, claim := range []uint32{math.MaxUint32, 1 << 31, uint32(len(whole))} {
		raw := bytes.Clone(whole)
		binary.LittleEndian.PutUint32(raw[word+4:], claim)
		refused(fmt.Sprintf("a head that claims %d bytes", claim), raw)
	}
	if err := try(whole); err != nil {
		t.Fatalf("the whole file: %v", err)
	}
	if n := len(lines(t, out)); n != 3 {
		t.Errorf("%d lines", n)
	}
}
