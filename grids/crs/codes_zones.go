package crs

import (
	"fmt"
	"slices"
)

// family is a run of codes whose planes follow from the place of the code in it.
type family struct {
	first, count int
	entry        func(i int) entry
}

var families = slices.Concat(utmFamilies(), stripFamilies(), otherFamilies())

// utm is a zone of the universal transverse Mercator system.
func utm(code int, datum string, zone int, south bool, ellipsoid string) entry {
	letter, half, north := "N", "northern", 0
	if south {
		letter, half, north = "S", "southern", 10000000
	}
	lon0 := 6*zone - 183
	return entry{
		Code: Code{code, fmt.Sprintf("%s / UTM zone %d%s", datum, zone, letter), fmt.Sprintf("%s to %s, %s hemisphere", meridianWord(lon0-3), meridianWord(lon0+3), half)},
		words: fmt.Sprintf("transverse-mercator; lon0=%d; lat0=0; scale=0.9996; east=500000; north=%d; ellipsoid=%s",
			lon0, north, ellipsoid),
	}
}

func meridianWord(lon int) string {
	switch {
	case lon < 0:
		return fmt.Sprintf("%d W", -lon)
	case lon > 0:
		return fmt.Sprintf("%d E", lon)
	}
	return "0"
}

// utmSet is a run of codes of one datum, a zone each.
type utmSet struct {
	datum       string
	code        int // of the first zone
	first, last int
	south       bool
	ellipsoid   string
}

func utmFamilies() []family {
	var list []family
	for _, s := range []utmSet{
		{"WGS 84", 32601, 1, 60, false, "WGS84"},
		{"WGS 84", 32701, 1, 60, true, "WGS84"},
		{"ETRS89", 25828, 28, 38, false, "GRS80"},
		{"NAD83", 26901, 1, 23, false, "GRS80"},
		{"NAD83(2011)", 6330, 1, 19, false, "GRS80"},
		{"NAD83(2011)", 6328, 59, 60, false, "GRS80"},
		{"NAD83(CSRS)", 2955, 11, 13, false, "GRS80"},
		{"NAD83(CSRS)", 2958, 17, 21, false, "GRS80"},
		{"NAD83(CSRS)", 3154, 7, 10, false, "GRS80"},
		{"NAD83(CSRS)", 3158, 14, 16, false, "GRS80"},
		{"SIRGAS 2000", 31965, 11, 22, false, "GRS80"},
		{"SIRGAS 2000", 31977, 17, 25, true, "GRS80"},
		{"Mexico ITRF2008", 6366, 11, 16, false, "GRS80"},
		{"REGVEN", 2201, 18, 20, false, "GRS80"},
		{"SIRGAS-ROU98", 5382, 21, 22, true, "WGS84"},
		{"NZGD2000", 2133, 58, 60, true, "GRS80"},
		{"JGD2000", 3097, 51, 55, false, "GRS80"},
		{"JGD2011", 6688, 51, 55, false, "GRS80"},
		{"RDN2008", 7791, 32, 34, false, "GRS80"},
		{"RGFG95", 2972, 22, 22, false, "GRS80"},
		{"RGR92", 2975, 40, 40, true, "GRS80"},
		{"RGAF09", 5490, 20, 20, false, "GRS80"},
		{"PTRA08", 5014, 25, 26, false, "GRS80"},
		{"PTRA08", 5016, 28, 28, false, "GRS80"},
		{"REGCAN95", 4082, 27, 28, false, "GRS80"},
		{"IGRS", 3890, 37, 39, false, "GRS80"},
		{"DGN95", 23866, 46, 52, false, "WGS84"},
		{"DGN95", 23877, 47, 54, true, "WGS84"},
		{"SRB_ETRS89", 8682, 34, 34, false, "GRS80"},
	} {
		list = append(list, family{s.code, s.last - s.first + 1, func(i int) entry {
			return utm(s.code+i, s.datum, s.first+i, s.south, s.ellipsoid)
		}})
	}
	return list
}

// strips is a run of codes of transverse Mercator planes that differ in their central meridian.
type strips struct {
	code      int
	name      string // with %s for what tells them apart
	area      string
	mark      func(i int) string
	lon0      []float64
	lat0      float64
	scale     float64
	east      []float64 // one for all, or one each
	north     float64
	ellipsoid string // and what comes after it
}

func (s strips) entry(i int) entry {
	return entry{
		Code: Code{s.code + i, fmt.Sprintf(s.name, s.mark(i)), s.area},
		words: fmt.Sprintf("transverse-mercator; lon0=%v; lat0=%v; scale=%v; east=%s; north=%s; ellipsoid=%s",
			s.lon0[i], s.lat0, s.scale, plainNumber(s.east[min(i, len(s.east)-1)]), plainNumber(s.north), s.ellipsoid),
	}
}

// upward is count numbers from first on.
func upward(first, step float64, count int) []float64 {
	list := make([]float64, count)
	for i := range list {
		list[i] = first + float64(i)*step
	}
	return list
}

// counted marks with a number, the first one and every step-th after it.
func counted(first, step int) func(i int) string {
	return func(i int) string { return fmt.Sprint(first + i*step) }
}

// named marks with words.
func named(words ...string) func(i int) string {
	return func(i int) string { return words[i] }
}

func stripFamilies() []family {
	swerefNorth := []float64{12, 13.5, 15, 16.5, 18, 14.25, 15.75, 17.25, 18.75, 20.25, 21.75, 23.25}
	swerefMark := named("12 00", "13 30", "15 00", "16 30", "18 00", "14 15", "15 45", "17 15", "18 45", "20 15", "21 45", "23 15")
	var list []family
	for _, s := range []strips{
		{3007, "SWEREF99 %s", "Sweden, a local zone", swerefMark, swerefNorth, 0, 1, []float64{150000}, 0, "GRS80"},
		{3873, "ETRS89 / GK%sFIN", "Finland, a local zone", counted(19, 1), upward(19, 1, 13), 0, 1,
			upward(19.5e6, 1e6, 13), 0, "GRS80"},
		{5105, "ETRS89 / NTM zone %s", "Norway, a local zone", counted(5, 1), upward(5.5, 1, 26), 58, 1,
			[]float64{100000}, 1000000, "GRS80"},
		{2176, "ETRF2000-PL / CS2000/%s", "Poland, a local zone", counted(15, 3), upward(15, 3, 4), 0, 0.999923,
			upward(5.5e6, 1e6, 4), 0, "GRS80"},
		{31466, "DHDN / 3-degree Gauss-Kruger zone %s", "Germany (west)", counted(2, 1), upward(6, 3, 4), 0, 1,
			upward(2.5e6, 1e6, 4), 0, "Bessel1841; shift=" + toDHDN},
		{31257, "MGI / Austria GK %s", "Austria", named("M28", "M31", "M34"), []float64{10 + 1./3, 13 + 1./3, 16 + 1./3}, 0, 1,
			[]float64{150000, 450000, 750000}, -5000000, "Bessel1841; shift=" + toMGI},
		{31254, "MGI / Austria GK %s", "Austria", named("West", "Central", "East"), []float64{10 + 1./3, 13 + 1./3, 16 + 1./3}, 0, 1,
			[]float64{0}, -5000000, "Bessel1841; shift=" + toMGI},
		{5253, "TUREF / TM%s", "Türkiye, a local zone", counted(27, 3), upward(27, 3, 7), 0, 1,
			[]float64{500000}, 0, "GRS80"},
		{5343, "POSGAR 2007 / Argentina %s", "Argentina, a belt", counted(1, 1), upward(-72, 3, 7), -90, 1,
			upward(1.5e6, 1e6, 7), 0, "GRS80"},
		{28348, "GDA94 / MGA zone %s", "Australia, 6 degrees of longitude", counted(48, 1), upward(105, 6, 11), 0, 0.9996,
			[]float64{500000}, 10000000, "GRS80"},
		{7846, "GDA2020 / MGA zone %s", "Australia, 6 degrees of longitude", counted(46, 1), upward(93, 6, 14), 0, 0.9996,
			[]float64{500000}, 10000000, "GRS80"},
		{5185, "Korea 2000 / %s Belt 2010", "Republic of Korea, a belt", named("West", "Central", "East", "East Sea"), upward(125, 2, 4), 38, 1,
			[]float64{200000}, 600000, "GRS80"},
		{4513, "CGCS2000 / 3-degree Gauss-Kruger zone %s", "China, 3 degrees of longitude", counted(25, 1), upward(75, 3, 21), 0, 1,
			upward(25.5e6, 1e6, 21), 0, "GRS80"},
		{4534, "CGCS2000 / 3-degree Gauss-Kruger CM %sE", "China, 3 degrees of longitude", counted(75, 3), upward(75, 3, 21), 0, 1,
			[]float64{500000}, 0, "GRS80"},
		{4491, "CGCS2000 / Gauss-Kruger zone %s", "China, 6 degrees of longitude", counted(13, 1), upward(75, 6, 11), 0, 1,
			upward(13.5e6, 1e6, 11), 0, "GRS80"},
		{4502, "CGCS2000 / Gauss-Kruger CM %sE", "China, 6 degrees of longitude", counted(75, 6), upward(75, 6, 11), 0, 1,
			[]float64{500000}, 0, "GRS80"},
		{3121, "PRS92 / Philippines zone %s", "Philippines", named("1", "2", "3", "4", "5"), upward(117, 2, 5), 0, 0.99995,
			[]float64{500000}, 0, "Clarke1866; frame-shift=" + toPRS92},
	} {
		list = append(list, family{s.code, len(s.lon0), s.entry})
	}
	return list
}

// otherFamilies are the nineteen plane rectangular systems of Japan, on both its geodetic datums, and the nine conformal
// conic zones of metropolitan France.
func otherFamilies() []family {
	return []family{
		{2443, 19, func(i int) entry { return japan(2443+i, "JGD2000", i) }},
		{6669, 19, func(i int) entry { return japan(6669+i, "JGD2011", i) }},
		{3942, 9, func(i int) entry { return frenchConic(42 + i) }},
	}
}

var japanOrigins = [19][2]float64{
	{129.5, 33}, {131, 33}, {132 + 1./6, 36}, {133.5, 33}, {134 + 1./3, 36}, {136, 36}, {137 + 1./6, 36}, {138.5, 36},
	{139 + 5./6, 36}, {140 + 5./6, 40}, {140.25, 44}, {142.25, 44}, {144.25, 44}, {142, 26}, {127.5, 26}, {124, 26},
	{131, 26}, {136, 20}, {154, 26},
}

var japanNumerals = [19]string{"I", "II", "III", "IV", "V", "VI", "VII", "VIII", "IX", "X", "XI", "XII", "XIII", "XIV", "XV", "XVI",
	"XVII", "XVIII", "XIX"}

func japan(code int, datum string, i int) entry {
	return entry{
		Code:  Code{code, datum + " / Japan Plane Rectangular CS " + japanNumerals[i], "Japan, a zone"},
		words: fmt.Sprintf("transverse-mercator; lon0=%v; lat0=%v; scale=0.9999; ellipsoid=GRS80", japanOrigins[i][0], japanOrigins[i][1]),
	}
}

func frenchConic(lat int) entry {
	return entry{
		Code: Code{3900 + lat, fmt.Sprintf("RGF93 v1 / CC%d", lat), "France, a zone"},
		words: fmt.Sprintf("conformal-conic-two; lon0=3; lat0=%d; parallel1=%v; parallel2=%v; east=1700000; north=%d; ellipsoid=GRS80",
			lat, float64(lat)-0.75, float64(lat)+0.75, 1200000+1000000*(lat-42)),
	}
}
