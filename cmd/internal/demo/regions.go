package demo

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"

	"gonum.org/v1/gonum/stat/distuv"
)

// Post is one health post of the isles of Zarrowmund. Coordinates are in degrees.
type Post struct {
	District, Name string
	Lon, Lat       float64
	Residents      int // whom it looks after
	Cases          int // of one illness in one year
}

// district is one of the districts of Zarrowmund. It has the land about its town, in kilometres from the middle of the
// isles; borders are straight (a power diagram: Aurenhammer 1987, SIAM J. Comput. 16:78-96), so that the hulls of two
// districts never overlap.
type district struct {
	name        string
	east, north float64
	pull        float64 // in km2, on the squared distance from the town: the more, the more land it has
	posts       int
	scatter     float64 // theta of a negative-binomial distribution of the cases; 0 means poisson
}

// What the troubles of a survey are shown on, one district each.
const (
	careless = "Jurrowdale" // filled in some of its rows wrongly
	tiny     = "Farskerrow" // an islet with too few posts for a surface, and farther from the others than the plan's margin
	unnamed  = "Wexilorne"  // left out its name on some rows
)

// districts are those of Zarrowmund. One name has a slash in it, and two differ by case only: a town and the country
// about it.
var districts = []district{
	{name: "Thessarby", east: -127, north: 70, posts: 88},
	{name: "Quennozby", east: -90, north: 55, posts: 64},
	{name: unnamed, east: -122, north: 16, posts: 157},
	{name: "Glimmoth", east: -84, north: 24, posts: 118},
	{name: "Brunnoquay", east: -122, north: -36, posts: 231, scatter: 2},
	{name: "Ivvenshaw", east: -82, north: -24, posts: 174},
	{name: "Oxmereth", east: -46, north: 28, posts: 412},
	{name: "St. Ozzel / North", east: -28, north: 68, posts: 126},
	{name: "St. Ozzel", east: 10, north: 44, posts: 273},
	{name: "Marrow", east: -46, north: -21, posts: 247},
	{name: "marrow", east: -23, north: 0, pull: -420, posts: 72},
	{name: "Zelderwick", east: -24, north: -60, posts: 143, scatter: 3},
	{name: "Nurrowmere", east: 0, north: -6, pull: 100, posts: 193},
	{name: "Vornhallow", east: 27, north: -14, posts: 108},
	{name: careless, east: 57, north: 9, pull: 150, posts: 319},
	{name: "Mozzeldyke", east: 49, north: 42, pull: -200, posts: 57},
	{name: "Pellivorn", east: 66, north: 66, posts: 136},
	{name: "Yskaholm", east: 128, north: 70, posts: 45},
	{name: "Hexavale", east: 108, north: 44, posts: 97, scatter: 1.5},
	{name: "Tuvvenhope", east: 94, north: 2, posts: 84},
	{name: "Lorquith", east: 62, north: -30, pull: 200, posts: 596},
	{name: "Snurrowfell", east: 54, north: -63, posts: 165, scatter: 4},
	{name: "Umbraskew", east: 122, north: -50, pull: 400, posts: 141},
	{name: tiny, east: -146, north: -86, pull: -900, posts: 3},
}

// The middle of Zarrowmund lies in the same empty part of the ocean as the Vessal Banks, some 650 km from them.
const islesLon, islesLat = -131, -46

// isles is above 0 on land, apart from the small bays of the coast, over kilometres east and north of the middle.
var isles = field{level: -1, bumps: []bump{
	{-95, 22, 2.2, 38}, {-45, -12, 1.7, 38}, {20, 15, 2, 45}, {75, -5, 1.7, 38}, {105, 45, 1.6, 28}, {58, 55, 1.2, 25}, // the long isle
	{-28, 50, 1.2, 24}, {-105, -38, 1.4, 20}, {48, -52, 1.4, 22}, {-20, -58, 1.4, 20}, {132, 76, 1.8, 8}, {-132, 74, 1.6, 8}, // its capes
	{17, -42, -2.6, 14}, {8, -75, -1.5, 18}, {-62, 55, -1.8, 14}, {85, 75, -1.4, 15}, {-72, -48, -1.6, 13}, // gulfs
	{118, 8, -1.6, 14}, {16, 70, -1.6, 14}, {78, -45, -1.2, 10}, {100, -32, -1.6, 9},
	{-20, 10, -2.2, 7},                         // a lake
	{122, -50, 2.3, 17}, {-146, -86, 2.3, 6.5}, // the isle in the south-east and the islet in the south-west
}}

// onLand tells whether a place is on one of the isles.
func onLand(east, north float64) bool {
	height := isles.at(east, north)
	finer := 1.0
	for k := range 4 {
		turn := float64(k)
		height += 0.2 / finer * math.Sin((0.9*east+0.5*north)*finer/9+turn) * math.Sin((0.8*north-0.6*east)*finer/8+2*turn)
		finer *= 1.9
	}
	return height > 0
}

// fever is the log of the cases per resident, over kilometres east and north of the middle: one landscape that knows
// nothing of districts.
var fever = field{level: math.Log(0.0042), bumps: []bump{
	{-70, 5, 1.1, 24}, {-118, 62, -0.7, 30}, {-125, -20, -0.5, 25}, {-30, -52, 0.5, 18}, {-22, 48, -0.9, 26},
	{20, 8, 0.5, 22}, {62, -38, 0.9, 17}, {52, 56, 0.7, 20}, {88, 18, -0.8, 24}, {128, 62, 0.6, 22}, {120, -55, -0.5, 20},
	{-48, 32, 0.7, 9}, {-44, 14, -0.4, 8}, {6, 40, 0.8, 9}, {58, 6, 0.5, 10}, {-84, -30, 0.6, 10}, {-115, -44, 0.8, 10}, // near towns
}}

// FeverRate is the number of cases per resident that the cases of Zarrowmund were drawn from, apart from the scatter that
// some districts have besides.
func FeverRate(lon, lat float64) float64 {
	return math.Exp(fever.at(fromIsles(lon, lat)))
}

func fromIsles(lon, lat float64) (east, north float64) {
	return (lon - islesLon) * kilometresPerDegree * math.Cos(islesLat*math.Pi/180), (lat - islesLat) * kilometresPerDegree
}

// Posts lays out the health posts of all districts, in their order, and the cases among their residents. The same seed
// gives the same posts.
func Posts(seed uint64) []Post {
	var posts []Post
	for i := range districts {
		random := rand.New(rand.NewPCG(seed, 100+uint64(i)))
		for _, place := range spread(random, i) {
			p := Post{District: districts[i].name, Name: fmt.Sprintf("Z%04d", len(posts)+1)}
			p.Lon = round(islesLon+place[0]/(kilometresPerDegree*math.Cos(islesLat*math.Pi/180)), 4)
			p.Lat = round(islesLat+place[1]/kilometresPerDegree, 4)
			p.Residents = int(min(9000, max(40, math.Exp(math.Log(560)+0.8*random.NormFloat64()))))
			mean := float64(p.Residents) * FeverRate(p.Lon, p.Lat)
			if theta := districts[i].scatter; theta > 0 {
				mean *= distuv.Gamma{Alpha: theta, Beta: theta, Src: random}.Rand()
			}
			p.Cases = min(p.Residents, poisson(random, mean))
			posts = append(posts, p)
		}
	}
	return posts
}

// spread draws the places of a district's posts, in kilometres from the middle. One in five is near the town; each of the
// others is the one of four places that keeps farthest from those before (best candidates: Mitchell 1991, Computer
// Graphics 25:157-164), as nobody builds two posts side by side.
func spread(random *rand.Rand, i int) [][2]float64 {
	var places [][2]float64
	for range districts[i].posts {
		if random.IntN(5) == 0 {
			places = append(places, nearTown(random, i))
			continue
		}
		var best [2]float64
		farthest := -1.0
		for range 4 {
			place := inDistrict(random, i)
			if apart := apart(place, places); apart > farthest {
				best, farthest = place, apart
			}
		}
		places = append(places, best)
	}
	return places
}

// inDistrict draws a place evenly over a district.
func inDistrict(random *rand.Rand, i int) [2]float64 {
	for {
		east, north := 165*(2*random.Float64()-1), 110*(2*random.Float64()-1)
		if districtAt(east, north) == i && onLand(east, north) {
			return [2]float64{east, north}
		}
	}
}

// nearTown draws a place of a district near its town, within some kilometres.
func nearTown(random *rand.Rand, i int) [2]float64 {
	for {
		east, north := districts[i].east+5*random.NormFloat64(), districts[i].north+5*random.NormFloat64()
		if districtAt(east, north) == i && onLand(east, north) {
			return [2]float64{east, north}
		}
	}
}

// apart is the distance in kilometres of a place from the nearest of some others; infinite if there are none.
func apart(place [2]float64, others [][2]float64) float64 {
	nearest := math.Inf(1)
	for _, o := range others {
		nearest = min(nearest, math.Hypot(place[0]-o[0], place[1]-o[1]))
	}
	return nearest
}

// districtAt is the index of the district that a place belongs to, on land or off.
func districtAt(east, north float64) int {
	at, least := 0, math.Inf(1)
	for i, d := range districts {
		dx, dy := east-d.east, north-d.north
		if power := dx*dx + dy*dy - d.pull; power < least {
			at, least = i, power
		}
	}
	return at
}

// slip is what a district wrote into one cell of its rows instead of what belongs there.
type slip struct {
	district    string
	row, column int // of the district, from 0; of the table
	text        string
}

var slips = []slip{
	{careless, 17, 5, ""},           // not reported
	{careless, 41, 4, "about 700"},  // guessed
	{careless, 66, 5, "-3"},         // corrected last year's report
	{careless, 103, 5, "2 or 3"},    // not sure
	{careless, 128, 4, ""},          // not counted
	{careless, 150, 2, ""},          // no position
	{careless, 177, 5, "see below"}, // told elsewhere
	{careless, 204, 4, "0"},         // closed
	{careless, 239, 3, "south"},     // no latitude
	{careless, 262, 5, "?"},
	{careless, 301, 5, "-1"},
	{tiny, 1, 5, ""}, // leaves two, which no surface goes through
	{unnamed, 12, 0, ""}, {unnamed, 13, 0, ""}, {unnamed, 77, 0, ""}, {unnamed, 120, 0, ""},
}

// postTable is the table of all posts, slips included.
func postTable(posts []Post) [][]string {
	table := [][]string{{"district", "post", "lon", "lat", "residents", "cases"}}
	first := map[string]int{}
	for _, p := range posts {
		if _, seen := first[p.District]; !seen {
			first[p.District] = len(table)
		}
		table = append(table, []string{p.District, p.Name, decimal(p.Lon), decimal(p.Lat), strconv.Itoa(p.Residents), strconv.Itoa(p.Cases)})
	}
	for _, s := range slips {
		table[first[s.district]+s.row][s.column] = s.text
	}
	return table
}

// batchPlan is plan.toml.
const batchPlan = `# A plan: the same map for every district of Zarrowmund, which does not exist. All names and numbers are invented.
#
#   drumlin batch plan.toml --out maps --check    says what would run
#   drumlin batch plan.toml --out maps            runs it; the same again goes on where it was interrupted
#
# A line that begins with # is a comment. Text stands in double quotes, numbers and lists do not. Paths are relative to
# this file. The words are the flags of drumlin map, with underscores: "drumlin map --help" explains them.

# What all districts have in common.
[defaults]
response = "cases"        # the column that is mapped: cases of the illness in a year
people = "residents"      # the column with the number of people whom the cases occurred among
per = 1000                # report cases per 1000 residents
threshold = 5             # and the chance that there are more than 5 of them
unit_label = "cases per 1000 residents"
title = "Illness in the isles of Zarrowmund"
cells_across = 40         # cells along the longer side of a district: coarse, and soon done
max_knots = 60            # how detailed a map may become; the data decide how much of that is used
write = ["csv", "pictures"]

# Where the districts come from: one table, divided by a column. Every name in that column is a district, written as it
# stands there: Marrow and marrow are two. Rows without a district are reported and belong to none.
# With a file for each district, it would be: files = "data/*.csv"
[regions]
file = "data/posts.csv"
split_by = "district"
margin = "10 km"          # posts of the neighbours this near help with the fit, so that maps agree better at borders

# Colours mean the same on the maps of all districts, so that they can be compared: "own" would give each its own.
[pictures]
scale = "shared"

# What is different in one district. The name stands in double quotes if it has anything but letters, digits, - and _.
[region."St. Ozzel / North"]
title = "Illness in St. Ozzel, northern part"
cells_across = 60         # finer than the others
`

// BatchCommands returns the commands of the demonstration of many regions, in their order.
func BatchCommands() []Command {
	with := func(flags ...string) []string {
		return append([]string{"batch", "plan.toml", "--out", "maps"}, flags...)
	}
	return []Command{
		{"Read the plan and the data, and say what would run", with("--check")},
		{"Map all districts. " + tiny + " fails, as it has too few posts for a surface; that stops none of the others", with()},
		{"The same again: what is done stays as it is", with()},
		{"Put together what the districts came to, as after a run spread over several machines", with("--gather")},
	}
}

// WriteBatch writes the data of 24 invented regions, plan.toml and commands.txt to the folder dir, which must exist.
func WriteBatch(dir string) error {
	posts, err := table(postTable(Posts(seed)))
	if err != nil {
		return err
	}
	return files{
		{"data/posts.csv", posts},
		{"plan.toml", []byte(batchPlan)},
		{"commands.txt", []byte(Script(BatchCommands()))},
	}.write(dir)
}
