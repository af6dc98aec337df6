package crs

// Shifts to WGS 84, as in codes_europe.go.
const (
	toPRS92  = "-127.62,-67.24,-47.04,3.068,-4.903,-1.578,-1.06"                                         // EPSG 15708, coordinate frame
	toHK80   = "-162.619,-276.959,-161.764,-0.067753,2.243648,1.158828,-1.094246"                        // EPSG 1825, coordinate frame
	toIsrael = "23.772,17.49,17.859,0.3132,1.85274,-1.67299,-5.4262"                                     // EPSG 9676, coordinate frame
	toQND95  = "-119.4248,-303.65872,-11.00061,1.164298,0.174458,1.096259,3.657065"                      // EPSG 1840
	toCGRS93 = "8.846,-4.394,-1.122,-0.00237,-0.146528,0.130428,0.783926"                                // CGRS93 to WGS 84 (1)
	toVN2000 = "-191.90441429,-39.30318279,-111.45032835,-0.00928836,0.01975479,-0.00427372,0.252906278" // EPSG 6960, coordinate frame
)

// Planes of Africa, Asia and Oceania.
var otherCodes = []entry{
	{Code{2193, "NZGD2000 / New Zealand Transverse Mercator 2000", "New Zealand"},
		"transverse-mercator; lon0=173; lat0=0; scale=0.9996; east=1600000; north=10000000; ellipsoid=GRS80"},
	{Code{3851, "NZGD2000 / NZCS2000", "New Zealand and its sea"},
		"conformal-conic-two; lon0=173; lat0=-41; parallel1=-37.5; parallel2=-44.5; east=3000000; north=7000000; ellipsoid=GRS80"},
	{Code{3793, "NZGD2000 / Chatham Islands TM 2000", "Chatham Islands"},
		"transverse-mercator; lon0=-176.5; lat0=0; scale=1; east=3500000; north=10000000; ellipsoid=GRS80"},
	{Code{3577, "GDA94 / Australian Albers", "Australia"},
		"albers; lon0=132; lat0=0; parallel1=-18; parallel2=-36; ellipsoid=GRS80"},
	{Code{9473, "GDA2020 / Australian Albers", "Australia"},
		"albers; lon0=132; lat0=0; parallel1=-18; parallel2=-36; ellipsoid=GRS80"},
	{Code{3112, "GDA94 / Geoscience Australia Lambert", "Australia"},
		"conformal-conic-two; lon0=134; lat0=0; parallel1=-18; parallel2=-36; ellipsoid=GRS80"},
	{Code{7845, "GDA2020 / GA LCC", "Australia"},
		"conformal-conic-two; lon0=134; lat0=0; parallel1=-18; parallel2=-36; ellipsoid=GRS80"},
	{Code{3111, "GDA94 / Vicgrid", "Victoria"},
		"conformal-conic-two; lon0=145; lat0=-37; parallel1=-36; parallel2=-38; east=2500000; north=2500000; ellipsoid=GRS80"},
	{Code{7899, "GDA2020 / Vicgrid", "Victoria"},
		"conformal-conic-two; lon0=145; lat0=-37; parallel1=-36; parallel2=-38; east=2500000; north=2500000; ellipsoid=GRS80"},
	{Code{3308, "GDA94 / NSW Lambert", "New South Wales"},
		"conformal-conic-two; lon0=147; lat0=-33.25; parallel1=-30.75; parallel2=-35.75; east=9300000; north=4500000; ellipsoid=GRS80"},
	{Code{8058, "GDA2020 / NSW Lambert", "New South Wales"},
		"conformal-conic-two; lon0=147; lat0=-33.25; parallel1=-30.75; parallel2=-35.75; east=9300000; north=4500000; ellipsoid=GRS80"},
	{Code{3107, "GDA94 / SA Lambert", "South Australia"},
		"conformal-conic-two; lon0=135; lat0=-32; parallel1=-28; parallel2=-36; east=1000000; north=2000000; ellipsoid=GRS80"},
	{Code{8059, "GDA2020 / SA Lambert", "South Australia"},
		"conformal-conic-two; lon0=135; lat0=-32; parallel1=-28; parallel2=-36; east=1000000; north=2000000; ellipsoid=GRS80"},
	{Code{3163, "RGNC91-93 / Lambert New Caledonia", "New Caledonia"},
		"conformal-conic-two; lon0=166; lat0=-21.5; parallel1=-20.66666666666667; parallel2=-22.33333333333333; east=400000; north=300000; ellipsoid=GRS80"},
	{Code{5179, "Korea 2000 / Unified CS", "Republic of Korea"},
		"transverse-mercator; lon0=127.5; lat0=38; scale=0.9996; east=1000000; north=2000000; ellipsoid=GRS80"},
	{Code{3825, "TWD97 / TM2 zone 119", "Taiwan, Penghu"},
		"transverse-mercator; lon0=119; lat0=0; scale=0.9999; east=250000; north=0; ellipsoid=GRS80"},
	{Code{3826, "TWD97 / TM2 zone 121", "Taiwan"},
		"transverse-mercator; lon0=121; lat0=0; scale=0.9999; east=250000; north=0; ellipsoid=GRS80"},
	{Code{2326, "Hong Kong 1980 Grid System", "Hong Kong"},
		"transverse-mercator; lon0=114.1785555555556; lat0=22.31213333333333; scale=1; east=836694.05; north=819069.8; ellipsoid=International1924; frame-shift=" + toHK80},
	{Code{3414, "SVY21 / Singapore TM", "Singapore"},
		"transverse-mercator; lon0=103.8333333333333; lat0=1.366666666666667; scale=1; east=28001.642; north=38744.572"},
	{Code{3375, "GDM2000 / Peninsula RSO", "Malaysia (peninsula)"},
		"oblique-mercator-equator; lon0=102.25; lat0=4; azimuth=323.0257964666666; bearing=323.1301023611111; scale=0.99984; east=804671; north=0; ellipsoid=GRS80"},
	{Code{3376, "GDM2000 / East Malaysia BRSO", "Malaysia (Borneo)"},
		"oblique-mercator-equator; lon0=115; lat0=4; azimuth=53.31580995; bearing=53.13010236111111; scale=0.99984; ellipsoid=GRS80"},
	{Code{3405, "VN-2000 / UTM zone 48N", "Vietnam (west)"},
		"transverse-mercator; lon0=105; lat0=0; scale=0.9996; east=500000; north=0; frame-shift=" + toVN2000},
	{Code{3406, "VN-2000 / UTM zone 49N", "Vietnam (east)"},
		"transverse-mercator; lon0=111; lat0=0; scale=0.9996; east=500000; north=0; frame-shift=" + toVN2000},
	{Code{7755, "WGS 84 / India NSF LCC", "India"},
		"conformal-conic-two; lon0=80; lat0=24; parallel1=12.472955; parallel2=35.17280444444444; east=4000000; north=4000000"},
	{Code{2039, "Israel 1993 / Israeli TM Grid", "Israel"},
		"transverse-mercator; lon0=35.20451694444444; lat0=31.73439361111111; scale=1.0000067; east=219529.584; north=626907.39; ellipsoid=GRS80; frame-shift=" + toIsrael},
	{Code{2932, "QND95 / Qatar National Grid", "Qatar"},
		"transverse-mercator; lon0=51.21666666666667; lat0=24.45; scale=0.99999; east=200000; north=300000; ellipsoid=International1924; shift=" + toQND95},
	{Code{6312, "CGRS93 / Cyprus Local Transverse Mercator", "Cyprus"},
		"transverse-mercator; lon0=33; lat0=0; scale=0.99995; east=200000; north=-3500000; shift=" + toCGRS93},
}
