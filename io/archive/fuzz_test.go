package archive_test

import (
	"bytes"
	"context"
	"errors"
	"testing"

	"drumlin/io/archive"
	"drumlin/spatial"
)

// FuzzRead reads bytes as they are, and once more under a checksum that is right, so that what lies behind it is reached.
// Seeds under testdata are heads that promise what is not there; whole files are added here, in the layout of the day.
// Whatever is taken must come back from another round, and must be restored or refused without a panic.
func FuzzRead(f *testing.F) {
	for _, fit := range fits(f) {
		f.Add(write(f, fit.saved()))
	}
	f.Fuzz(func(t *testing.T, raw []byte) {
		try(t, raw)
		if len(raw) > checksum {
			try(t, sealed(raw[:len(raw)-checksum]))
		}
	})
}

func try(t *testing.T, raw []byte) {
	s, err := archive.Read(bytes.NewReader(raw))
	if err != nil {
		var damaged *archive.DamagedError
		var newer *archive.NewerError
		if !errors.As(err, &damaged) && !errors.As(err, &newer) {
			t.Fatalf("%T %v", err, err)
		}
		return
	}
	var b bytes.Buffer
	if err := archive.Write(&b, s); err != nil {
		t.Fatalf("what was read cannot be written: %v", err)
	}
	if again := write(t, read(t, b.Bytes())); !bytes.Equal(again, b.Bytes()) {
		t.Fatal("written, read and written again, it differs")
	}
	surface, err := spatial.Restore(s.Surface, 1)
	if err != nil {
		return
	}
	predict(t, surface, s)
}

// predict uses a restored surface as reuse does.
func predict(t *testing.T, surface *spatial.Surface, s archive.Saved) {
	var z []spatial.Covariate
	for _, e := range s.Surface.Effect {
		c := spatial.Covariate{Name: e.Name, Number: []float64{1}}
		if e.Role == spatial.Category {
			c = spatial.Covariate{Name: e.Name, Code: []int32{0}, Level: e.Level}
		}
		z = append(z, c)
	}
	eta, se := make([]float64, 1), make([]float64, 1)
	if err := surface.PredictTo(context.Background(), eta, se, spatial.Places{X: []float64{1}, Y: []float64{2}}, z); err != nil {
		return // two effects of one name and different kinds, for example
	}
	q := surface.Quantile(s.Reporting.Confidence)
	surface.Mean(eta[0] + q*se[0])
	surface.MeanSlope(eta[0])
	if s.Reporting.Threshold != nil {
		surface.Chance(eta[0], se[0], surface.Linear(*s.Reporting.Threshold/s.Reporting.Factor))
	}
}
