package basis2d

import (
	"math"
	"math/rand/v2"
	"testing"
)

func curveValues(seed uint64, n int) []float64 {
	random := rand.New(rand.NewPCG(seed, 3))
	z := make([]float64, n)
	for i := range z {
		z[i] = 40 + 25*random.Float64()*random.Float64()
	}
	return z
}

// TestCurveColumnsAreCentredAndSpanLines checks the identities the basis promises: every column has mean zero over the
// rows, and the first is the covariate itself.
func TestCurveColumnsAreCentredAndSpanLines(t *testing.T) {
	z := curveValues(1, 300)
	c, err := NewCurve(z, DefaultFunctions)
	if err != nil {
		t.Fatal(err)
	}
	sum, row := make([]float64, c.Dim()), make([]float64, c.Dim())
	for _, v := range z {
		c.RowTo(row, v)
		for j, x := range row {
			sum[j] += x
		}
		if got := row[0]*c.Scale + c.Centre; math.Abs(got-v) > 1e-12*v {
			t.Fatalf("the straight column gives %g for %g", got, v)
		}
	}
	for j, s := range sum {
		if math.Abs(s) > 1e-10*float64(len(z)) {
			t.Errorf("column %d has sum %g", j, s)
		}
	}
	if !c.Whole() {
		t.Error("not whole")
	}
}

// TestCurvePenaltyIsTheIdentity compares u'u with the squared second differences of the B-spline coefficients that a
// curve with penalised coefficients u has, found here by collocation at the knots.
func TestCurvePenaltyIsTheIdentity(t *testing.T) {
	c, err := NewCurve(curveValues(2, 100), 12)
	if err != nil {
		t.Fatal(err)
	}
	random := rand.New(rand.NewPCG(7, 7))
	u := make([]float64, c.Functions-2)
	want := 0.0
	for j := range u {
		u[j] = random.NormFloat64()
		want += u[j] * u[j]
	}
	coefficient := make([]float64, c.Functions)
	for i := range coefficient {
		for j, v := range u {
			coefficient[i] += c.Whiten[i*len(u)+j] * v
		}
	}
	got := 0.0
	for i := 0; i+2 < len(coefficient); i++ {
		d := coefficient[i] - 2*coefficient[i+1] + coefficient[i+2]
		got += d * d
	}
	if math.Abs(got-want) > 1e-11*want {
		t.Errorf("u'u = %.15g, squared second differences %.15g", want, got)
	}
}

// TestCubicPieces checks values and slopes against the recursion of Cox and de Boor, and that they sum to one and zero.
func TestCubicPieces(t *testing.T) {
	var deBoor func(k, degree int, x float64) float64
	deBoor = func(k, degree int, x float64) float64 { // uniform knots at the integers
		if degree == 0 {
			if x >= float64(k) && x < float64(k+1) {
				return 1
			}
			return 0
		}
		d := float64(degree)
		return (x-float64(k))/d*deBoor(k, degree-1, x) + (float64(k+degree+1)-x)/d*deBoor(k+1, degree-1, x)
	}
	for _, at := range []float64{0, 0.125, 0.5, 0.9, 0.999} {
		value, slope := CubicPieces(at)
		sum, sumSlope := 0.0, 0.0
		for i := range value {
			if want := deBoor(i-3, 3, at); math.Abs(value[i]-want) > 1e-14 {
				t.Errorf("t = %g: piece %d is %g, want %g", at, i, value[i], want)
			}
			const h = 1e-6
			up, _ := CubicPieces(at + h)
			down, _ := CubicPieces(at - h)
			if want := (up[i] - down[i]) / (2 * h); math.Abs(slope[i]-want) > 1e-9 {
				t.Errorf("t = %g: slope %d is %g, want %g", at, i, slope[i], want)
			}
			sum, sumSlope = sum+value[i], sumSlope+slope[i]
		}
		if math.Abs(sum-1) > 1e-15 || math.Abs(sumSlope) > 1e-15 {
			t.Errorf("t = %g: sums %g and %g", at, sum, sumSlope)
		}
	}
}

// TestCurveGoesOnStraight holds the curve beyond its range against the tangent at its end.
func TestCurveGoesOnStraight(t *testing.T) {
	c, err := NewCurve([]float64{0, 1, 2, 5, 9, 10}, 8)
	if err != nil {
		t.Fatal(err)
	}
	at := func(v float64) []float64 {
		row := make([]float64, c.Dim())
		c.RowTo(row, v)
		return row
	}
	const h = 1e-6
	end, before, beyond := at(10), at(10-h), at(13)
	for j := range end {
		slope := (end[j] - before[j]) / h
		if want := end[j] + 3*slope; math.Abs(beyond[j]-want) > 2e-5 {
			t.Errorf("column %d: %g beyond, the tangent gives %g", j, beyond[j], want)
		}
	}
}

func TestCurveRefusesWhatCannotBend(t *testing.T) {
	for name, z := range map[string][]float64{"two values": {1, 2, 1, 2}, "NaN": {1, math.NaN(), 3, 4}, "none": nil} {
		if _, err := NewCurve(z, DefaultFunctions); err == nil {
			t.Errorf("%s: accepted", name)
		}
	}
	if _, err := NewCurve([]float64{1, 2, 3}, 3); err == nil {
		t.Error("three B-splines: accepted")
	}
}
