package demo

import (
	"math"
	"math/rand/v2"
	"strconv"
)

// Village is one village of the Vessal Banks. Coordinates are in degrees.
type Village struct {
	Name      string
	Lon, Lat  float64
	Residents int
	Cases     int // of one illness in one year
}

// The middle of the banks: the place in the ocean that is about the farthest from any land (from memory: 48.9 south,
// 123.4 west). Nobody lives there.
const middleLon, middleLat = -123.4, -48.9

// illness is the log of the cases per resident, over kilometres east and north of the middle.
var illness = field{level: math.Log(0.0028), bumps: []bump{
	{-22, 10, 1.2, 13},
	{30, -14, 0.7, 16},
	{8, 24, -0.8, 15},
	{-10, -25, -0.4, 14},
}}

// towns are where villages crowd, in kilometres from the middle.
var towns = [][2]float64{{-18, 6}, {12, -8}, {28, 16}}

// Rate is the number of cases per resident that the cases were drawn from.
func Rate(lon, lat float64) float64 {
	east, north := kilometres(lon, lat)
	return math.Exp(illness.at(east, north))
}

// kilometresPerDegree is along a meridian, on a globe of 40000 km round.
const kilometresPerDegree = 40000.0 / 360

func kilometres(lon, lat float64) (east, north float64) {
	return (lon - middleLon) * kilometresPerDegree * math.Cos(middleLat*math.Pi/180), (lat - middleLat) * kilometresPerDegree
}

// Villages lays out n villages and the cases among their residents. The same seed gives the same villages.
func Villages(seed uint64, n int) []Village {
	random := rand.New(rand.NewPCG(seed, 2))
	names := villageNames(random, n)
	villages := make([]Village, n)
	for i := range villages {
		east, north := onBanks(random)
		lon := middleLon + east/(kilometresPerDegree*math.Cos(middleLat*math.Pi/180))
		lat := middleLat + north/kilometresPerDegree
		v := Village{Name: names[i], Lon: round(lon, 4), Lat: round(lat, 4)}
		v.Residents = int(min(9000, max(40, math.Exp(math.Log(520)+0.9*random.NormFloat64()))))
		v.Cases = min(v.Residents, poisson(random, float64(v.Residents)*Rate(v.Lon, v.Lat)))
		villages[i] = v
	}
	return villages
}

// onBanks draws a place in kilometres from the middle: near a town, or anywhere on the banks.
func onBanks(random *rand.Rand) (east, north float64) {
	for {
		if random.Float64() < 0.4 {
			town := towns[random.IntN(len(towns))]
			east, north = town[0]+7*random.NormFloat64(), town[1]+7*random.NormFloat64()
		} else {
			east, north = 50*(2*random.Float64()-1), 36*(2*random.Float64()-1)
		}
		if math.Hypot(east/50, north/36) < 1 {
			return east, north
		}
	}
}

// villageNames makes n different names of syllables, in random order.
func villageNames(random *rand.Rand, n int) []string {
	first := []string{"Zour", "Quel", "Vorm", "Thry", "Ysk", "Oxa", "Jurv", "Kwim"}
	second := []string{"ab", "eno", "ifi", "ozza", "umm", "ewi"}
	third := []string{"dax", "lith", "mork", "ness", "pell", "vane"}
	var names []string
	for _, a := range first {
		for _, b := range second {
			for _, c := range third {
				names = append(names, a+b+c)
			}
		}
	}
	random.Shuffle(len(names), func(i, j int) { names[i], names[j] = names[j], names[i] })
	return names[:n]
}

// villageTable is the table of the villages, three of which cannot be used.
func villageTable(villages []Village) [][]string {
	table := [][]string{{"village", "lon", "lat", "residents", "cases"}}
	for _, v := range villages {
		table = append(table, []string{v.Name, decimal(v.Lon), decimal(v.Lat), strconv.Itoa(v.Residents), strconv.Itoa(v.Cases)})
	}
	table[57][3] = ""   // nobody knows how many live there
	table[144][3] = "0" // deserted
	table[198][4] = "?" // did not report
	return table
}
