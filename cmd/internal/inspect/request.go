package inspect

import (
	"drumlin/cmd/internal/pipeline"
	"drumlin/io/observe"
	"drumlin/io/plan"
)

// Request is how a table is to be surveyed by what was said of its format and its coordinates.
func Request(said plan.Settings) (observe.SurveyRequest, error) {
	want := observe.SurveyRequest{Guess: GuessCoordinates}
	if said.X != nil && said.Y != nil {
		want.X, want.Y = *said.X, *said.Y
	}
	if said.Geometry != nil {
		want.Geometry = *said.Geometry
	}
	want.Format = pipeline.Format(said)
	var err error
	want.Axes, err = pipeline.Axes(said)
	return want, err
}
