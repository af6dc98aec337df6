package archive_test

import (
	"bytes"
	"context"
	"crypto/sha256"
	"encoding/binary"
	"encoding/json"
	"errors"
	"flag"
	"math"
	"math/rand/v2"
	"os"
	"path/filepath"
	"reflect"
	"runtime"
	"slices"
	"strings"
	"testing"
	"testing/iotest"

	"drumlin/io/archive"
	"drumlin/spatial"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
)

var update = flag.Bool("update", false, "write the stored surface under testdata afresh")

// The layout as the package documents it.
const (
	magic    = "drumlin-surface\n"
	headAt   = len(magic) + 8
	checksum = sha256.Size
)

// fitted is a surface with places to compare predictions at.
type fitted struct {
	name    string
	surface *spatial.Surface
	at      spatial.Places
	z       []spatial.Covariate
}

// fits returns small fits of every kind: with and without a surface, with and without covariates, with the dispersion
// known and not. All numbers are invented.
func fits(t testing.TB) []fitted {
	t.Helper()
	random := rand.New(rand.NewPCG(7, 11))
	const n = 24
	d := spatial.Data{Response: make([]float64, n), Exposure: make([]float64, n),
		Places: spatial.Places{X: make([]float64, n), Y: make([]float64, n)}}
	depth := spatial.Covariate{Name: "depth", Number: make([]float64, n)}
	soil := spatial.Covariate{Name: "soil <&> \"äöü\"", Code: make([]int32, n), Level: []string{"clay", "loam, sandy", "péat"}}
	for i := range n {
		d.Places.X[i], d.Places.Y[i] = 5000*random.Float64(), 4000*random.Float64()
		depth.Number[i], soil.Code[i] = 10*random.Float64(), int32(i%3)
		d.Exposure[i] = 1 + random.Float64()
		d.Response[i] = math.Floor(20 + 10*math.Sin(d.Places.X[i]/900) + depth.Number[i] + 3*float64(i%3) + 4*random.Float64())
	}
	measured := d
	measured.Exposure = nil
	both := []spatial.Effect{{Name: depth.Name, Role: spatial.Linear}, {Name: soil.Name, Role: spatial.Category}}
	list := []fitted{}
	for _, c := range []struct {
		name  string
		model spatial.Model
		data  spatial.Data
	}{
		{"measurements", spatial.Model{Distribution: "gaussian", MaxKnots: 9}, measured},
		{"few knots", spatial.Model{Distribution: "gaussian", MaxKnots: 4}, measured},
		{"given smoothness", spatial.Model{Distribution: "gaussian", Link: "log", MaxKnots: 6,
			Smoothness: spatial.Smoothness{Method: spatial.Given, Lambda: 1e5 / 3}}, measured},
		{"counts with covariates", spatial.Model{Distribution: "poisson", MaxKnots: 8, Effects: both}, d},
		{"no surface", spatial.Model{Distribution: "poisson", Surface: spatial.None, Effects: both}, d},
		{"no surface, no covariates", spatial.Model{Distribution: "gaussian", Surface: spatial.None}, measured},
	} {
		c.data.Covariates = []spatial.Covariate{depth, soil}
		s, err := spatial.Fit(context.Background(), c.model, c.data, spatial.Options{Workers: 1})
		if err != nil {
			t.Fatalf("%s: %v", c.name, err)
		}
		list = append(list, fitted{c.name, s, spatial.Places{X: []float64{0, 1234.5, 9e4}, Y: []float64{10, 2222, -7e3}},
			[]spatial.Covariate{{Name: depth.Name, Number: []float64{0, 3.25, -1}}, {Name: soil.Name, Code: []int32{1, 0, 1}, Level: []string{"péat", "clay"}}}})
	}
	return list
}

func (f fitted) saved() archive.Saved {
	threshold := 0.30000000000000004 // no short decimal
	return archive.Saved{Surface: f.surface.State(), Program: "v1.2.3",
		Reporting: archive.Reporting{CRS: "EPSG:32633", Degrees: true, Response: "plants", Factor: 1e5 / 3, Unit: "plants per ha <é>",
			Threshold: &threshold, Reference: 1.0 / 7, Confidence: 0.95},
		PlaceX: []float64{1.0 / 3, math.Copysign(0, -1)}, PlaceY: []float64{math.Pi, 5e-324}}
}

func (f fitted) predict(t testing.TB, s *spatial.Surface) (eta, se []float64) {
	t.Helper()
	eta, se = make([]float64, f.at.Len()), make([]float64, f.at.Len())
	if err := s.PredictTo(context.Background(), eta, se, f.at, f.z); err != nil {
		t.Fatal(err)
	}
	return eta, se
}

func write(t testing.TB, s archive.Saved) []byte {
	t.Helper()
	var b bytes.Buffer
	if err := archive.Write(&b, s); err != nil {
		t.Fatal(err)
	}
	return b.Bytes()
}

func read(t testing.TB, raw []byte) archive.Saved {
	t.Helper()
	s, err := archive.Read(bytes.NewReader(raw))
	if err != nil {
		t.Fatal(err)
	}
	return s
}

// exactly compares to the bit: NaN equals itself, and 0 is not -0. Slices without elements are alike.
var exactly = []cmp.Option{
	cmp.Comparer(func(a, b float64) bool { return math.Float64bits(a) == math.Float64bits(b) }),
	cmpopts.EquateEmpty(), cmp.Exporter(func(reflect.Type) bool { return true }),
}

// same compares what is stored: the basis' scaled knots follow from the others.
func same(t testing.TB, want, got archive.Saved) {
	t.Helper()
	options := append(slices.Clone(exactly), cmp.FilterPath(func(p cmp.Path) bool {
		name := p.Last().String()
		return name == ".sx" || name == ".sy"
	}, cmp.Ignore()))
	if diff := cmp.Diff(want, got, options...); diff != "" {
		t.Errorf("it is not what was written (-written +read):\n%s", diff)
	}
}

func TestRoundTrip(t *testing.T) {
	for _, f := range fits(t) {
		t.Run(f.name, func(t *testing.T) {
			want := f.saved()
			got := read(t, write(t, want))
			same(t, f.saved(), got)
			if diff := cmp.Diff(f.saved(), want, exactly...); diff != "" {
				t.Errorf("writing changed the surface itself:\n%s", diff)
			}
			for _, workers := range []int{1, 2} {
				restored, err := spatial.Restore(got.Surface, workers)
				if err != nil {
					t.Fatal(err)
				}
				eta, se := f.predict(t, f.surface)
				again, seAgain := f.predict(t, restored)
				if diff := cmp.Diff([][]float64{eta, se}, [][]float64{again, seAgain}, exactly...); diff != "" {
					t.Errorf("%d workers: the surface read back predicts otherwise:\n%s", workers, diff)
				}
				if q, again := f.surface.Quantile(0.9), restored.Quantile(0.9); q != again {
					t.Errorf("quantile %v, and %v after reading back", q, again)
				}
			}
		})
	}
}

// A row of a level that the data did not have predicts NaN before and after; the others are numbers, so that the
// comparison above compares something.
func TestRoundTripComparesNumbers(t *testing.T) {
	for _, f := range fits(t) {
		eta, se := f.predict(t, f.surface)
		for i := range eta {
			if math.IsNaN(eta[i]) || !(se[i] > 0) {
				t.Errorf("%s: place %d has %g with standard error %g", f.name, i, eta[i], se[i])
			}
		}
	}
}

// everyNumber sets every float64 that v reaches through structs, pointers and slices of these, and returns how many
// there were; slices of numbers are left.
func everyNumber(v reflect.Value, set func() float64) (n int) {
	switch v.Kind() {
	case reflect.Float64:
		if v.CanSet() {
			v.SetFloat(set())
			return 1
		}
	case reflect.Pointer:
		if !v.IsNil() {
			return everyNumber(v.Elem(), set)
		}
	case reflect.Struct:
		for i := range v.NumField() {
			n += everyNumber(v.Field(i), set)
		}
	case reflect.Slice:
		if k := v.Type().Elem().Kind(); k == reflect.Struct || k == reflect.Pointer {
			for i := range v.Len() {
				n += everyNumber(v.Index(i), set)
			}
		}
	}
	return n
}

// Numbers that come out of a fit may be NaN or infinite, each on its own: a criterion without a value, a dispersion
// with nothing left to estimate it from. A number that a later field adds must be stored as well.
func TestNumbersOfTheFitKeepEveryBit(t *testing.T) {
	f := fits(t)[3]
	for name, set := range map[string]func(n int) float64{
		"NaN":          func(int) float64 { return math.NaN() },
		"NaN with sum": func(n int) float64 { return math.Float64frombits(0x7ff8_0000_0000_0001 + uint64(n)) },
		"infinity":     func(int) float64 { return math.Inf(-1) },
		"minus zero":   func(int) float64 { return math.Copysign(0, -1) },
		"each its own": func(n int) float64 { return math.Sqrt(float64(n + 2)) },
		"the least":    func(n int) float64 { return float64(n+1) * 5e-324 },
	} {
		t.Run(name, func(t *testing.T) {
			filled := func() archive.Saved {
				s := f.saved()
				basis := *s.Surface.Basis
				s.Surface.Basis = &basis
				s.Surface.Report.Coefficients = slices.Clone(s.Surface.Report.Coefficients)
				s.Surface.Report.Smooths = slices.Clone(s.Surface.Report.Smooths)
				s.Surface.Effect = slices.Clone(s.Surface.Effect)
				n := 0
				for _, part := range []any{&s.Surface.Report, &s.Surface.Effect, &s.Surface.Phi, &basis.CentreX, &basis.CentreY, &basis.Scale} {
					everyNumber(reflect.ValueOf(part).Elem(), func() float64 { n++; return set(n) })
				}
				if n < 20 {
					t.Fatalf("only %d numbers were set", n)
				}
				return s
			}
			same(t, filled(), read(t, write(t, filled())))
		})
	}
}

// fill sets everything that v reaches to values of its own.
func fill(v reflect.Value, n *int) {
	*n++
	switch v.Kind() {
	case reflect.Float64:
		v.SetFloat(math.Sqrt(float64(*n)))
	case reflect.Int, reflect.Int32, reflect.Int64:
		v.SetInt(int64(*n))
	case reflect.Uint8, reflect.Uint64:
		v.SetUint(uint64(*n % 200))
	case reflect.Bool:
		v.SetBool(true)
	case reflect.String:
		v.SetString(strings.Repeat("é", *n%5+1))
	case reflect.Pointer:
		v.Set(reflect.New(v.Type().Elem()))
		fill(v.Elem(), n)
	case reflect.Slice:
		v.Set(reflect.MakeSlice(v.Type(), 2, 2))
		for i := range v.Len() {
			fill(v.Index(i), n)
		}
	case reflect.Struct:
		for i := range v.NumField() {
			if v.Field(i).CanSet() {
				fill(v.Field(i), n)
			}
		}
	default:
		panic("archive: a kind of field that this test does not know: " + v.Kind().String())
	}
}

// A field that is added to what a surface predicts with, or reports, must be stored as well.
func TestEveryFieldIsStored(t *testing.T) {
	full := func() archive.Saved {
		var s archive.Saved
		n := 0
		fill(reflect.ValueOf(&s).Elem(), &n)
		s.Reporting.Confidence = 0.75
		return s
	}
	same(t, full(), read(t, write(t, full())))
}

func TestSameBytes(t *testing.T) {
	for k, f := range fits(t) {
		raw := write(t, f.saved())
		if again := write(t, fits(t)[k].saved()); !bytes.Equal(raw, again) {
			t.Errorf("%s: fitted and written twice, it differs", f.name)
		}
		if again := write(t, read(t, raw)); !bytes.Equal(raw, again) {
			t.Errorf("%s: read and written again, it differs", f.name)
		}
	}
}

// small is the shortest file at hand.
func small(t testing.TB) []byte {
	var least []byte
	for _, f := range fits(t) {
		if raw := write(t, f.saved()); least == nil || len(raw) < len(least) {
			least = raw
		}
	}
	return least
}

func refused(t testing.TB, raw []byte, what string) error {
	t.Helper()
	s, err := archive.Read(bytes.NewReader(raw))
	if err == nil {
		t.Fatalf("%s was taken", what)
	}
	if !cmp.Equal(s, archive.Saved{}, exactly...) {
		t.Fatalf("%s: half a surface came with the error", what)
	}
	return err
}

func TestCutShort(t *testing.T) {
	raw := small(t)
	for n := range raw {
		err := refused(t, raw[:n], "a file cut short")
		var damaged *archive.DamagedError
		if !errors.As(err, &damaged) || damaged.Hint() == "" {
			t.Fatalf("cut to %d bytes: %v", n, err)
		}
	}
	refused(t, append(slices.Clone(raw), 0), "a file with a byte too many")
}

func TestEveryFlippedBit(t *testing.T) {
	raw := small(t)
	for i := range raw {
		for bit := range 8 {
			raw[i] ^= 1 << bit
			err := refused(t, raw, "a file with a flipped bit")
			raw[i] ^= 1 << bit
			var newer *archive.NewerError
			var damaged *archive.DamagedError
			inVersion := i >= len(magic) && i < len(magic)+4
			if !errors.As(err, &damaged) && !(inVersion && errors.As(err, &newer)) {
				t.Fatalf("byte %d, bit %d: %T %v", i, bit, err, err)
			}
		}
	}
}

// sealed puts the right checksum under a body.
func sealed(body []byte) []byte {
	sum := sha256.Sum256(body)
	return append(slices.Clone(body), sum[:]...)
}

// file makes a file of the given parts with the right checksum.
func file(version uint32, head string, arrays []byte) []byte {
	b := []byte(magic)
	b = binary.LittleEndian.AppendUint32(b, version)
	b = binary.LittleEndian.AppendUint32(b, uint32(len(head)))
	return sealed(append(append(b, head...), arrays...))
}

// parts takes a file apart.
func parts(raw []byte) (head string, arrays []byte) {
	n := int(binary.LittleEndian.Uint32(raw[len(magic)+4:]))
	return string(raw[headAt : headAt+n]), raw[headAt+n : len(raw)-checksum]
}

func TestNewer(t *testing.T) {
	head, arrays := parts(small(t))
	for _, version := range []uint32{archive.Version + 1, 77, math.MaxUint32} {
		for name, raw := range map[string][]byte{
			"as a later program may write it": file(version, `{"Unheard":[1,2]}`, arrays),
			"otherwise the same":              file(version, head, arrays),
			"without a checksum that we know": append(file(version, head, arrays), "another kind of checksum"...),
		} {
			var newer *archive.NewerError
			if err := refused(t, raw, name); !errors.As(err, &newer) || newer.Version != version || newer.Hint() == "" {
				t.Errorf("layout %d, %s: %v", version, name, err)
			}
		}
	}
	var damaged *archive.DamagedError
	if err := refused(t, file(0, head, arrays), "layout 0"); !errors.As(err, &damaged) {
		t.Errorf("layout 0: %v", err)
	}
}

// edited is the small file with the value of a key of its head replaced, and the right checksum.
func edited(t testing.TB, raw []byte, key, value string) []byte {
	t.Helper()
	text, arrays := parts(raw)
	var head map[string]json.RawMessage
	if err := json.Unmarshal([]byte(text), &head); err != nil {
		t.Fatal(err)
	}
	if _, ok := head[key]; !ok {
		t.Fatalf("the head has no %q", key)
	}
	head[key] = json.RawMessage(value)
	changed, err := json.Marshal(head)
	if err != nil {
		t.Fatal(err)
	}
	return file(archive.Version, string(changed), arrays)
}

// adversarial returns files with the right checksum whose contents are wrong.
func adversarial(t testing.TB) map[string][]byte {
	t.Helper()
	raw := small(t)
	head, arrays := parts(raw)
	var lengths struct{ Lengths []int }
	if err := json.Unmarshal([]byte(head), &lengths); err != nil {
		t.Fatal(err)
	}
	with := func(k, n int) string {
		l := slices.Clone(lengths.Lengths)
		l[k] = n
		text, _ := json.Marshal(l)
		return string(text)
	}
	long := slices.Clone(raw[:len(raw)-checksum])
	binary.LittleEndian.PutUint32(long[len(magic)+4:], math.MaxUint32)
	over := slices.Clone(raw[:len(raw)-checksum])
	binary.LittleEndian.PutUint32(over[len(magic)+4:], uint32(len(raw)-headAt-checksum+1))
	list := map[string][]byte{
		"a head of 4 GiB":              sealed(long),
		"a head one byte too long":     sealed(over),
		"no head":                      file(archive.Version, "", arrays),
		"a head that is no JSON":       file(archive.Version, "drumlin", arrays),
		"a head of another shape":      file(archive.Version, `[1,2,3]`, arrays),
		"an empty head":                file(archive.Version, `{}`, nil),
		"a deep head":                  file(archive.Version, `{"Model":`+strings.Repeat("[", 200000), nil),
		"two heads":                    file(archive.Version, head+head, arrays),
		"half a number at the end":     file(archive.Version, head, arrays[:len(arrays)-3]),
		"a number too many":            file(archive.Version, head, append(slices.Clone(arrays), make([]byte, 8)...)),
		"nothing but the fixed part":   sealed([]byte(magic + "\x01\x00\x00\x00\x00\x00\x00\x00")),
		"too few lengths":              edited(t, raw, "Lengths", "[1]"),
		"no lengths":                   edited(t, raw, "Lengths", "null"),
		"a length that is a fraction":  edited(t, raw, "Lengths", "[1.5]"),
		"names in another order":       edited(t, raw, "ArrayNames", `["beta","scalars"]`),
		"one coefficient too many":     edited(t, raw, "Report", `{"Coefficients":[{},{},{}]}`),
		"no confidence":                edited(t, raw, "Reporting", `{"Factor":1}`),
		"a confidence of 2":            edited(t, raw, "Reporting", `{"Factor":1,"Confidence":2}`),
		"a confidence of -1":           edited(t, raw, "Reporting", `{"Factor":1,"Confidence":-1}`),
		"a factor of 0":                edited(t, raw, "Reporting", `{"Factor":0,"Confidence":0.9}`),
		"a factor out of range":        edited(t, raw, "Reporting", `{"Factor":1e999,"Confidence":0.9}`),
		"a reference below 0":          edited(t, raw, "Reporting", `{"Factor":1,"Confidence":0.9,"Reference":-1}`),
		"a head of effects":            file(archive.Version, `{"Effects":[{}`+strings.Repeat(`,{}`, 500000)+`]}`, nil),
		"a head of levels":             file(archive.Version, `{"Effects":[{"Level":[""`+strings.Repeat(`,""`, 500000)+`]}]}`, nil),
		"a head of lengths":            file(archive.Version, `{"Lengths":[0`+strings.Repeat(`,0`, 500000)+`]}`, nil),
		"a head of coefficients":       file(archive.Version, `{"Report":{"Coefficients":[{}`+strings.Repeat(`,{}`, 500000)+`]}}`, nil),
		"a head of more than is taken": file(archive.Version, `{}`+strings.Repeat(" ", 5<<20), nil),
	}
	for k := range lengths.Lengths {
		for _, n := range []int{-1, math.MinInt64, lengths.Lengths[k] + 1, 1 << 31, 1 << 60, 1<<61 + lengths.Lengths[k], math.MaxInt64} {
			list["length "+with(k, n)] = edited(t, raw, "Lengths", with(k, n))
		}
	}
	return list
}

// Reading makes room for what is there, not for what is promised: bytes allocated stay below a few times the file's
// own, and below some hundred times that for a head full of empty objects, whose length has a limit of its own.
func TestAdversarialHeads(t *testing.T) {
	for name, raw := range adversarial(t) {
		factor := 8.0
		if strings.HasPrefix(name, "a head of ") || name == "a deep head" {
			factor = 400
		}
		var before, after runtime.MemStats
		runtime.ReadMemStats(&before)
		err := refused(t, raw, name)
		runtime.ReadMemStats(&after)
		var damaged *archive.DamagedError
		if !errors.As(err, &damaged) {
			t.Errorf("%s: %T %v", name, err, err)
		}
		if strings.ContainsAny(err.Error(), "\n") || len(err.Error()) > 300 {
			t.Errorf("%s: the message is no line: %q", name, err)
		}
		spent := float64(after.TotalAlloc - before.TotalAlloc)
		if spent > factor*float64(len(raw))+16<<10 {
			t.Errorf("%s: %.0f bytes were allocated for a file of %d", name, spent, len(raw))
		}
	}
}

// Parts that are whole each and do not belong together are for spatial.Restore: reading them is no error, restoring is.
func TestPartsThatDoNotBelongTogether(t *testing.T) {
	raw := write(t, fits(t)[4].saved()) // two effects
	for name, damaged := range map[string][]byte{
		"effects without columns": edited(t, raw, "Effects", `[{"Name":"a","Role":0},{"Name":"b","Role":1,"Level":["1","2"]}]`),
		"a role there is not":     edited(t, raw, "Effects", `[{"Name":"a","Role":7},{"Name":"b","Role":1,"Level":["1","2"]}]`),
		"no such distribution":    edited(t, raw, "Model", `{"Distribution":"cauchy"}`),
		"a basis without knots":   edited(t, raw, "HasBasis", `true`),
	} {
		s, err := archive.Read(bytes.NewReader(damaged))
		if err != nil {
			t.Errorf("%s: %v", name, err)
			continue
		}
		if _, err := spatial.Restore(s.Surface, 1); err == nil {
			t.Errorf("%s: restored", name)
		}
	}
}

// endless gives zeros for ever.
type endless struct{ given int }

func (e *endless) Read(p []byte) (int, error) {
	clear(p)
	e.given += len(p)
	return len(p), nil
}

func TestTooLarge(t *testing.T) {
	const limit = 3 << 20
	e := &endless{}
	_, err := archive.ReadUpTo(e, limit)
	var damaged *archive.DamagedError
	if !errors.As(err, &damaged) || !strings.Contains(err.Error(), "3 MiB") {
		t.Errorf("an endless file: %v", err)
	}
	if e.given > limit+1 {
		t.Errorf("%d bytes were read", e.given)
	}
	raw := small(t)
	if _, err := archive.ReadUpTo(bytes.NewReader(raw), len(raw)); err != nil {
		t.Errorf("a file of just the limit: %v", err)
	}
	if _, err := archive.ReadUpTo(bytes.NewReader(raw), len(raw)-1); err == nil {
		t.Error("a file of a byte more than the limit was taken")
	}
}

// tooLarge gives s more numbers than a file may hold, most of them one slice several times over.
func tooLarge(s *archive.Saved) {
	part := make([]float64, archive.Limit/8/6)
	for _, v := range []*[]float64{&s.Surface.Factor, &s.Surface.Beta, &s.Surface.Mix, &s.Surface.R, &s.PlaceX, &s.PlaceY} {
		*v = part
	}
}

func TestWriteRefusesWhatReadDoes(t *testing.T) {
	f := fits(t)[3]
	for name, spoil := range map[string]func(s *archive.Saved){
		"more than the limit": tooLarge,
		"a long head":         func(s *archive.Saved) { s.Reporting.Unit = strings.Repeat("x", 5<<20) },
		"no confidence":       func(s *archive.Saved) { s.Reporting.Confidence = 0 },
		"a NaN factor":        func(s *archive.Saved) { s.Reporting.Factor = math.NaN() },
		"a NaN threshold":     func(s *archive.Saved) { s.Reporting.Threshold = new(math.NaN()) },
		"an infinite lambda":  func(s *archive.Saved) { s.Surface.Model.Smoothness.Lambda = math.Inf(1) },
	} {
		s := f.saved()
		spoil(&s)
		var b bytes.Buffer
		if err := archive.Write(&b, s); err == nil || b.Len() != 0 {
			t.Errorf("%s: error %v with %d bytes written", name, err, b.Len())
		}
	}
	var hint interface{ Hint() string }
	s := f.saved()
	tooLarge(&s)
	if err := archive.Write(&bytes.Buffer{}, s); !errors.As(err, &hint) || !strings.Contains(hint.Hint(), "--max-knots") {
		t.Errorf("too large: %v says nothing of what to do", err)
	}
}

// fullDisk takes some bytes and then no more.
type fullDisk struct{ room int }

var errFull = errors.New("no space left")

func (d *fullDisk) Write(p []byte) (int, error) {
	if len(p) > d.room {
		n := d.room
		d.room = 0
		return n, errFull
	}
	d.room -= len(p)
	return len(p), nil
}

func TestErrorsOfTheStreams(t *testing.T) {
	saved := fits(t)[3].saved()
	raw := write(t, saved)
	for room := 0; room < len(raw); room += 97 {
		if err := archive.Write(&fullDisk{room}, saved); !errors.Is(err, errFull) {
			t.Fatalf("a disk full after %d bytes: %v", room, err)
		}
	}
	_, err := archive.Read(iotest.TimeoutReader(iotest.OneByteReader(bytes.NewReader(raw))))
	if !errors.Is(err, iotest.ErrTimeout) {
		t.Errorf("a reader that fails: %v", err)
	}
	if s, err := archive.Read(iotest.HalfReader(bytes.NewReader(raw))); err != nil {
		t.Errorf("a reader in pieces: %v", err)
	} else {
		same(t, saved, s)
	}
}

// The stored file was written by layout 1. It must be readable, byte for byte, for as long as that layout is: a file that
// is written otherwise now is another layout. The predictions beside it were made when it was written.
func TestStoredSurface(t *testing.T) {
	path := filepath.Join("testdata", "layout1.surface")
	f := fits(t)[3]
	want := filepath.Join("testdata", "layout1.json")
	if *update {
		eta, se := f.predict(t, f.surface)
		text, err := json.Marshal([][]float64{eta, se})
		if err != nil {
			t.Fatal(err)
		}
		for name, content := range map[string][]byte{path: write(t, f.saved()), want: append(text, '\n')} {
			if err := os.WriteFile(name, content, 0o644); err != nil {
				t.Fatal(err)
			}
		}
	}
	raw, err := os.ReadFile(path)
	if err != nil {
		t.Fatal(err)
	}
	s := read(t, raw)
	if again := write(t, s); !bytes.Equal(raw, again) {
		t.Error("the layout has changed: raise Version and keep reading this file, or, before the first release, run with -update")
	}
	restored, err := spatial.Restore(s.Surface, 1)
	if err != nil {
		t.Fatal(err)
	}
	text, err := os.ReadFile(want)
	if err != nil {
		t.Fatal(err)
	}
	var stored [][]float64
	if err := json.Unmarshal(text, &stored); err != nil {
		t.Fatal(err)
	}
	eta, se := f.predict(t, restored)
	// 1e-12 of the value: processors differ in whether they round between a multiplication and an addition.
	if diff := cmp.Diff(stored, [][]float64{eta, se}, cmpopts.EquateApprox(1e-12, 0)); diff != "" {
		t.Errorf("it predicts otherwise than when it was written:\n%s", diff)
	}
}
