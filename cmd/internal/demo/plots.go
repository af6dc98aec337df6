package demo

import (
	"fmt"
	"math"
	"math/rand/v2"
	"strconv"

	"gonum.org/v1/gonum/stat/distuv"
)

// Plot is one plot on the island of Orrimay. Coordinates are in metres from a mark off its south-west.
type Plot struct {
	Name     string
	X, Y     float64
	Plants   int     // marshlight plants counted
	Hectares float64 // size of the plot
	Depth    float64 // of the peat, in centimetres
}

// The island is round about its centre, with bays; its shore is at centre + shore(angle) (cos, sin).
const islandX, islandY = 3200, 2600

func shore(angle float64) float64 {
	return 2300 + 250*math.Cos(2*angle+0.6) + 130*math.Cos(3*angle-1.1) + 60*math.Cos(7*angle)
}

// peat is the depth of the peat in centimetres, apart from what changes from step to step.
var peat = field{level: 45, bumps: []bump{
	{2300, 3300, 48, 900},
	{4300, 1900, 36, 800},
	{3300, 900, -15, 700},
}}

// ground is the log of plants per hectare where the peat is 60 cm deep.
var ground = field{level: math.Log(190), bumps: []bump{
	{1900, 2100, 0.9, 650},
	{4100, 3300, 1.1, 800},
	{3500, 1300, -0.7, 900},
	{2700, 4200, -0.5, 600},
}}

// peatEffect is the change of the log density with a centimetre of peat.
const peatEffect = -0.01

// Density is the number of plants per hectare that the plots were drawn from, at a place with peat of a depth.
func Density(x, y, depth float64) float64 {
	return math.Exp(ground.at(x, y) + peatEffect*(depth-60))
}

// Plots lays out n plots on the island and counts the plants on them. The same seed gives the same plots.
func Plots(seed uint64, n int) []Plot {
	random := rand.New(rand.NewPCG(seed, 1))
	sizes := []float64{0.02, 0.04, 0.0625}
	plots := make([]Plot, n)
	for i := range plots {
		x, y := onIsland(random)
		depth := max(3, peat.at(x, y)+8*random.NormFloat64())
		p := Plot{Name: fmt.Sprintf("P%03d", i+1), X: round(x, 1), Y: round(y, 1), Depth: round(depth, 0),
			Hectares: sizes[random.IntN(len(sizes))]}
		p.Plants = poisson(random, p.Hectares*Density(p.X, p.Y, p.Depth))
		plots[i] = p
	}
	return plots
}

// onIsland draws a place evenly over the island.
func onIsland(random *rand.Rand) (x, y float64) {
	for {
		dx, dy := 2750*(2*random.Float64()-1), 2750*(2*random.Float64()-1)
		if math.Hypot(dx, dy) < shore(math.Atan2(dy, dx)) {
			return islandX + dx, islandY + dy
		}
	}
}

// plotTable is the table of the plots, four of which did not go well in the field.
func plotTable(plots []Plot) [][]string {
	table := [][]string{{"plot", "x", "y", "plants", "plot_ha", "depth_cm"}}
	for _, p := range plots {
		table = append(table, []string{p.Name, decimal(p.X), decimal(p.Y), strconv.Itoa(p.Plants), decimal(p.Hectares), decimal(p.Depth)})
	}
	table[38][3] = ""      // not counted
	table[121][3] = "lost" // the sheet got wet
	table[207][4] = "0"    // never staked out
	table[263][2] = ""     // no position
	return table
}

func poisson(random *rand.Rand, mean float64) int {
	return int(distuv.Poisson{Lambda: mean, Src: random}.Rand())
}

// round rounds to a number of decimals.
func round(v float64, decimals int) float64 {
	scale := math.Pow10(decimals)
	return math.Round(v*scale) / scale
}

func decimal(v float64) string { return strconv.FormatFloat(v, 'f', -1, 64) }
