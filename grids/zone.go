package grids

import (
	"fmt"
	"math"

	"github.com/paulmach/orb"

	"drumlin/grids/crs"
)

// Zone is a named part of the plane to total or average over.
type Zone struct {
	Name  string
	Shape orb.MultiPolygon // in the plane; within a polygon the first ring is the edge, the others are holes
}

// Validate returns an error if a vertex of the zone is not finite or if the zone has no area.
func (z Zone) Validate() error {
	for i, p := range z.Shape {
		if !usablePolygon(p) {
			return fmt.Errorf("zone %q: polygon %d has a vertex that is not a finite place", z.Name, i+1)
		}
	}
	if !(planeArea(z.Shape) > 0) {
		return fmt.Errorf("zone %q has no area", z.Name)
	}
	return nil
}

// AreaOf returns the true ground area of z in square metres, z being in the plane of sys: the polygons' areas less their
// holes', each divided by the area scale, integrated over the polygon. Polygons that overlap count twice. It is NaN if a
// vertex is not finite or lies where the plane has no area scale.
func AreaOf(z Zone, sys crs.System) float64 {
	total := 0.0
	for _, polygon := range z.Shape {
		for r, ring := range polygon {
			a := math.Abs(ringGround(ring, sys))
			if r > 0 {
				a = -a
			}
			total += a
		}
	}
	return total
}

// planeArea is the area in the plane, whatever the ground is like.
func planeArea(shape orb.MultiPolygon) float64 { return AreaOf(Zone{Shape: shape}, crs.Local{}) }

// ringGround integrates 1/AreaScale over a ring, positive for counter-clockwise ones: the signed triangles from its
// first vertex, each with a rule of degree five, by far enough for a scale that changes with the square of the
// distance over thousands of kilometres. What is integrated is 1/AreaScale - 1, so equal-area planes give the polygon's
// own area exactly.
func ringGround(ring orb.Ring, sys crs.System) float64 {
	sum := 0.0
	for v := 1; v+1 < len(ring); v++ {
		a, b, c := ring[0], ring[v], ring[v+1]
		if twice := turn(a, b, c); twice != 0 {
			sum += twice / 2 * (1 + triangleMean(a, b, c, func(x, y float64) float64 { return 1/sys.AreaScale(x, y) - 1 }))
		}
	}
	return sum
}

// triangleMean is the mean of f over a triangle by the seven-point rule of degree five (Radon 1948, Monatsh. Math.
// 52:286-300; Stroud 1971, T2:5-1; from memory).
func triangleMean(a, b, c orb.Point, f func(x, y float64) float64) float64 {
	root := math.Sqrt(15)
	mean := 9. / 40 * f((a[0]+b[0]+c[0])/3, (a[1]+b[1]+c[1])/3)
	for _, s := range [2]float64{-root, root} {
		t, w := (6+s)/21, (155+s)/1200
		for _, q := range [3][3]orb.Point{{a, b, c}, {b, c, a}, {c, a, b}} {
			mean += w * f((1-2*t)*q[0][0]+t*(q[1][0]+q[2][0]), (1-2*t)*q[0][1]+t*(q[1][1]+q[2][1]))
		}
	}
	return mean
}

// LengthOf returns the true length of lines in metres, in the plane of sys: each piece divided by the root of the area
// scale at its middle. It is 0 for what is no line.
func LengthOf(g orb.Geometry, sys crs.System) (sum float64) {
	switch g := g.(type) {
	case orb.LineString:
		for i := 1; i < len(g); i++ {
			a, b := g[i-1], g[i]
			sum += math.Hypot(b[0]-a[0], b[1]-a[1]) / math.Sqrt(sys.AreaScale((a[0]+b[0])/2, (a[1]+b[1])/2))
		}
	case orb.MultiLineString:
		for _, l := range g {
			sum += LengthOf(l, sys)
		}
	}
	return sum
}
