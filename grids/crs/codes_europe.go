package crs

// Shifts to WGS 84, position vector unless the words say frame-shift: translations in metres, turns in seconds of arc,
// scale in parts per million. Published by the national authorities as the EPSG dataset lists them; the comments have its codes or names.
const (
	toOSGB36 = "446.448,-125.157,542.06,0.15,0.247,0.842,-20.489"                                        // EPSG 1314
	toTM75   = "482.5,-130.6,564.6,-1.042,-0.214,-0.631,8.15"                                            // EPSG 1954
	toRD     = "565.4171,50.3319,465.5524,-0.398957388243134,0.343987817378283,-1.87740163998045,4.0725" // Amersfoort to WGS 84 (4)
	toBD72   = "-106.8686,52.2978,-103.7239,0.3366,-0.457,1.8422,-1.2747"                                // EPSG 15929
	toLUREF  = "-189.6806,18.3463,-42.7695,-0.33746,-3.09264,2.53861,0.4598"                             // EPSG 5485
	toDHDN   = "598.1,73.7,418.2,0.202,0.045,-2.455,6.7"                                                 // EPSG 1777
	toMGI    = "577.326,90.129,463.919,5.137,1.474,5.297,2.4232"                                         // EPSG 1618
	toCH1903 = "674.374,15.056,405.346"                                                                  // EPSG 1676
	toSJTSK  = "572.213,85.334,461.94,-4.9732,-1.529,-5.2484,3.5378"                                     // EPSG 5239, coordinate frame
	toHD72   = "52.17,-71.82,-14.9"                                                                      // EPSG 1242
	toRT90   = "414.1,41.3,603.1,-0.855,2.141,-7.023,0"                                                  // EPSG 1895
	toKKJ    = "-96.062,-82.428,-121.753,4.801,0.345,-1.376,1.496"                                       // EPSG 10098
	toMario  = "-104.1,-49.1,-9.9,0.971,-2.917,0.714,-11.68"                                             // EPSG 1660
	toGGRS87 = "-199.87,74.79,246.62"                                                                    // EPSG 1272
	toS42    = "2.329,-147.042,-92.08,0.309,-0.325,-0.497,5.69"                                          // EPSG 15995, coordinate frame
	toNTF    = "-168,-60,320"                                                                            // EPSG 1193
)

// Planes of Europe.
var europeanCodes = []entry{
	{Code{3034, "ETRS89-extended / LCC Europe", "Europe"},
		"conformal-conic-two; lon0=10; lat0=52; parallel1=35; parallel2=65; east=4000000; north=2800000; ellipsoid=GRS80"},
	{Code{3035, "ETRS89-extended / LAEA Europe", "Europe"},
		"azimuthal-equal-area; lon0=10; lat0=52; east=4321000; north=3210000; ellipsoid=GRS80"},
	{Code{27700, "OSGB36 / British National Grid", "Great Britain"},
		"transverse-mercator; lon0=-2; lat0=49; scale=0.9996012717; east=400000; north=-100000; ellipsoid=Airy1830; shift=" + toOSGB36},
	{Code{2157, "IRENET95 / Irish Transverse Mercator", "Ireland"},
		"transverse-mercator; lon0=-8; lat0=53.5; scale=0.99982; east=600000; north=750000; ellipsoid=GRS80"},
	{Code{29903, "TM75 / Irish Grid", "Ireland"},
		"transverse-mercator; lon0=-8; lat0=53.5; scale=1.000035; east=200000; north=250000; ellipsoid=AiryModified1849; shift=" + toTM75},
	{Code{28992, "Amersfoort / RD New", "Netherlands"},
		"oblique-stereographic; lon0=5.387638888888889; lat0=52.15616055555555; scale=0.9999079; east=155000; north=463000; ellipsoid=Bessel1841; shift=" + toRD},
	{Code{31370, "BD72 / Belgian Lambert 72", "Belgium"},
		"conformal-conic-two; lon0=4.367486666666666; lat0=90; parallel1=51.16666723333333; parallel2=49.8333339; east=150000.013; north=5400088.438; ellipsoid=International1924; shift=" + toBD72},
	{Code{3812, "ETRS89 / Belgian Lambert 2008", "Belgium"},
		"conformal-conic-two; lon0=4.359215833333333; lat0=50.797815; parallel1=49.83333333333334; parallel2=51.16666666666666; east=649328; north=665262; ellipsoid=GRS80"},
	{Code{2169, "LUREF / Luxembourg TM", "Luxembourg"},
		"transverse-mercator; lon0=6.166666666666667; lat0=49.83333333333334; scale=1; east=80000; north=100000; ellipsoid=International1924; shift=" + toLUREF},
	{Code{2154, "RGF93 v1 / Lambert-93", "France"},
		"conformal-conic-two; lon0=3; lat0=46.5; parallel1=49; parallel2=44; east=700000; north=6600000; ellipsoid=GRS80"},
	{Code{27572, "NTF (Paris) / Lambert zone II", "France"},
		"conformal-conic; lon0=2.33722917; lat0=46.8; scale=0.99987742; east=600000; north=2200000; ellipsoid=Clarke1880IGN; shift=" + toNTF},
	{Code{5243, "ETRS89 / LCC Germany (E-N)", "Germany"},
		"conformal-conic-two; lon0=10.5; lat0=51; parallel1=48.66666666666666; parallel2=53.66666666666666; ellipsoid=GRS80"},
	{Code{4839, "ETRS89 / LCC Germany (N-E)", "Germany"},
		"conformal-conic-two; lon0=10.5; lat0=51; parallel1=48.66666666666666; parallel2=53.66666666666666; ellipsoid=GRS80"},
	{Code{31287, "MGI / Austria Lambert", "Austria"},
		"conformal-conic-two; lon0=13.33333333333333; lat0=47.5; parallel1=49; parallel2=46; east=400000; north=400000; ellipsoid=Bessel1841; shift=" + toMGI},
	{Code{3416, "ETRS89 / Austria Lambert", "Austria"},
		"conformal-conic-two; lon0=13.33333333333333; lat0=47.5; parallel1=49; parallel2=46; east=400000; north=400000; ellipsoid=GRS80"},
	{Code{2056, "CH1903+ / LV95", "Switzerland, Liechtenstein"},
		"oblique-mercator; lon0=7.439583333333333; lat0=46.95240555555556; azimuth=90; scale=1; east=2600000; north=1200000; ellipsoid=Bessel1841; shift=" + toCH1903},
	{Code{21781, "CH1903 / LV03", "Switzerland, Liechtenstein"},
		"oblique-mercator; lon0=7.439583333333333; lat0=46.95240555555556; azimuth=90; scale=1; east=600000; north=200000; ellipsoid=Bessel1841; shift=" + toCH1903},
	{Code{3003, "Monte Mario / Italy zone 1", "Italy (west)"},
		"transverse-mercator; lon0=9; lat0=0; scale=0.9996; east=1500000; north=0; ellipsoid=International1924; shift=" + toMario},
	{Code{3004, "Monte Mario / Italy zone 2", "Italy (east)"},
		"transverse-mercator; lon0=15; lat0=0; scale=0.9996; east=2520000; north=0; ellipsoid=International1924; shift=" + toMario},
	{Code{3763, "ETRS89 / Portugal TM06", "Portugal"},
		"transverse-mercator; lon0=-8.133108333333334; lat0=39.66825833333334; scale=1; ellipsoid=GRS80"},
	{Code{3006, "SWEREF99 TM", "Sweden"},
		"transverse-mercator; lon0=15; lat0=0; scale=0.9996; east=500000; north=0; ellipsoid=GRS80"},
	{Code{3021, "RT90 2.5 gon V", "Sweden"},
		"transverse-mercator; lon0=15.80827777777778; lat0=0; scale=1; east=1500000; north=0; ellipsoid=Bessel1841; shift=" + toRT90},
	{Code{3067, "ETRS89 / TM35FIN(E,N)", "Finland"},
		"transverse-mercator; lon0=27; lat0=0; scale=0.9996; east=500000; north=0; ellipsoid=GRS80"},
	{Code{2393, "KKJ / Finland Uniform Coordinate System", "Finland"},
		"transverse-mercator; lon0=27; lat0=0; scale=1; east=3500000; north=0; ellipsoid=International1924; shift=" + toKKJ},
	{Code{3057, "ISN93 / Lambert 1993", "Iceland"},
		"conformal-conic-two; lon0=-19; lat0=65; parallel1=64.25; parallel2=65.75; east=500000; north=500000; ellipsoid=GRS80"},
	{Code{5325, "ISN2004 / Lambert 2004", "Iceland"},
		"conformal-conic-two; lon0=-19; lat0=65; parallel1=64.25; parallel2=65.75; east=1700000; north=300000; ellipsoid=GRS80"},
	{Code{8088, "ISN2016 / Lambert 2016", "Iceland"},
		"conformal-conic-two; lon0=-19; lat0=65; parallel1=64.25; parallel2=65.75; east=2700000; north=300000; ellipsoid=GRS80"},
	{Code{2180, "ETRF2000-PL / CS92", "Poland"},
		"transverse-mercator; lon0=19; lat0=0; scale=0.9993; east=500000; north=-5300000; ellipsoid=GRS80"},
	{Code{5514, "S-JTSK / Krovak East North", "Czechia; Slovakia to some metres"},
		"oblique-conic; lon0=24.83333333333333; lat0=49.5; axis=30.28813975277778; parallel=78.5; scale=0.9999; ellipsoid=Bessel1841; frame-shift=" + toSJTSK},
	{Code{23700, "HD72 / EOV", "Hungary"},
		"oblique-mercator; lon0=19.04857177777778; lat0=47.14439372222222; azimuth=90; scale=0.99993; east=650000; north=200000; ellipsoid=GRS67; shift=" + toHD72},
	{Code{3794, "Slovenia 1996 / Slovene National Grid", "Slovenia"},
		"transverse-mercator; lon0=15; lat0=0; scale=0.9999; east=500000; north=-5000000; ellipsoid=GRS80"},
	{Code{3765, "HTRS96 / Croatia TM", "Croatia"},
		"transverse-mercator; lon0=16.5; lat0=0; scale=0.9999; east=500000; north=0; ellipsoid=GRS80"},
	{Code{3844, "Pulkovo 1942(58) / Stereo70", "Romania"},
		"oblique-stereographic; lon0=25; lat0=46; scale=0.99975; east=500000; north=500000; ellipsoid=Krassovsky1940; frame-shift=" + toS42},
	{Code{7801, "BGS2005 / CCS2005", "Bulgaria"},
		"conformal-conic-two; lon0=25.5; lat0=42.66787568333333; parallel1=42; parallel2=43.33333333333334; east=500000; north=4725824.3591; ellipsoid=GRS80"},
	{Code{2100, "GGRS87 / Greek Grid", "Greece"},
		"transverse-mercator; lon0=24; lat0=0; scale=0.9996; east=500000; north=0; ellipsoid=GRS80; shift=" + toGGRS87},
	{Code{6870, "ETRS89 / Albania TM 2010", "Albania"},
		"transverse-mercator; lon0=20; lat0=0; scale=1; east=500000; north=0; ellipsoid=GRS80"},
	{Code{9141, "KOSOVAREF01 / Balkans zone 7", "Kosovo"},
		"transverse-mercator; lon0=21; lat0=0; scale=0.9999; east=7500000; north=0; ellipsoid=GRS80"},
	{Code{4026, "MOLDREF99 / Moldova TM", "Moldova"},
		"transverse-mercator; lon0=28.4; lat0=0; scale=0.99994; east=200000; north=-5000000; ellipsoid=GRS80"},
	{Code{3301, "Estonian Coordinate System of 1997", "Estonia"},
		"conformal-conic-two; lon0=24; lat0=57.51755393055556; parallel1=59.33333333333334; parallel2=58; east=500000; north=6375000; ellipsoid=GRS80"},
	{Code{3059, "LKS92 / Latvia TM", "Latvia"},
		"transverse-mercator; lon0=24; lat0=0; scale=0.9996; east=500000; north=-6000000; ellipsoid=GRS80"},
	{Code{3346, "LKS94 / Lithuania TM", "Lithuania"},
		"transverse-mercator; lon0=24; lat0=0; scale=0.9998; east=500000; north=0; ellipsoid=GRS80"},
}
