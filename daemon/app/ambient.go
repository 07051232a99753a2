package app

import (
	"fmt"

	"nightbench/sweeps"
	"nightbench/sweeps/predict"
)

// Ambient is the temperature about the board that a plan's run is predicted for, °C,
// and how it is known, in words.
func Ambient(plan sweeps.Plan) (celsius float64, words string) {
	if plan.Ambient == nil {
		return predict.Reference, fmt.Sprintf("Ambient not measured: %g\u00a0°C assumed.", predict.Reference)
	}
	celsius = plan.Ambient.SI()
	return celsius, fmt.Sprintf("Ambient %g\u00a0°C, as the plan says.", celsius)
}

// AmbientOf is how the ambient of a run is known, from its own copies of its files; empty where they can't be read.
func AmbientOf(run sweeps.Run) string {
	plan, _, err := filesOf(run)
	if err != nil {
		return ""
	}
	_, words := Ambient(plan)
	return words
}

// saidAmbient follows what the log says of a run's beginning.
func saidAmbient(plan sweeps.Plan) string {
	_, words := Ambient(plan)
	return " " + words
}
