package isolines

import (
	"math"
	"math/big"

	"github.com/paulmach/orb"
)

// orientation is positive if r lies left of the way from p to q, negative if right, 0 if neither. The sign is exact: where
// rounding could decide, which the bound of Shewchuk (1997, Discrete & Computational Geometry 18:305-363) tells, fractions do.
func orientation(p, q, r orb.Point) float64 {
	if p[0] == q[0] && q[0] == r[0] || p[1] == q[1] && q[1] == r[1] {
		return 0
	}
	left, right := float64((q[0]-p[0])*(r[1]-q[1])), float64((q[1]-p[1])*(r[0]-q[0]))
	if cross := left - right; math.Abs(cross) > 4e-16*(math.Abs(left)+math.Abs(right)) {
		return cross
	}
	cross, _ := new(big.Rat).Sub(product(p[0], q[0], q[1], r[1]), product(p[1], q[1], q[0], r[0])).Float64()
	return cross
}

// product is (b - a) (d - c).
func product(a, b, c, d float64) *big.Rat {
	difference := func(u, v float64) *big.Rat {
		return new(big.Rat).Sub(new(big.Rat).SetFloat64(v), new(big.Rat).SetFloat64(u))
	}
	u, v := difference(a, b), difference(c, d)
	return u.Mul(u, v)
}
