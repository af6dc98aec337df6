package demo

import "math"

// collection is a GeoJSON FeatureCollection (RFC 7946) of polygons, as far as the zones need one.
type collection struct {
	Type     string    `json:"type"`
	Features []feature `json:"features"`
}

type feature struct {
	Type       string            `json:"type"`
	Properties map[string]string `json:"properties"`
	Geometry   polygon           `json:"geometry"`
}

type polygon struct {
	Type        string         `json:"type"`
	Coordinates [][][2]float64 `json:"coordinates"`
}

// zones divides the island, a little inside its shore, into three that meet at its centre.
func zones() collection {
	names := []string{"Thravelow", "Osselwick", "Ivvermere"}
	borders := []float64{-2.2, 0.1, 1.9} // angles; the last zone ends where the first begins
	all := collection{Type: "FeatureCollection"}
	for i, name := range names {
		from, to := borders[i], borders[(i+1)%len(borders)]
		all.Features = append(all.Features, feature{
			Type:       "Feature",
			Properties: map[string]string{"zone": name},
			Geometry:   polygon{Type: "Polygon", Coordinates: [][][2]float64{sector(from, to)}},
		})
	}
	return all
}

// sector is the ring, anticlockwise, from the centre of the island to near its shore, along it between two angles, and
// back.
func sector(from, to float64) [][2]float64 {
	const steps = 24
	turn := to - from
	if turn < 0 {
		turn += 2 * math.Pi
	}
	ring := [][2]float64{{islandX, islandY}}
	for k := range steps + 1 {
		angle := from + turn*float64(k)/steps
		r := 0.9 * shore(angle)
		ring = append(ring, [2]float64{round(islandX+r*math.Cos(angle), 1), round(islandY+r*math.Sin(angle), 1)})
	}
	return append(ring, ring[0])
}
