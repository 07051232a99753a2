package sweeps

import (
	"fmt"
	"math"
	"slices"

	"nightbench/instruments"
)

// Snap finds the pot codes nearest to resistances (Ω), in the order given, each
// code once, and says how many are left: "24 of 25". Check reachability first with Reaches.
func Snap(pot instruments.PotWiring, ohms []float64) (codes []int, words string) {
	for _, r := range ohms {
		if c := nearestCode(pot, r); !slices.Contains(codes, c) {
			codes = append(codes, c)
		}
	}
	return codes, fmt.Sprintf("%d of %d", len(codes), len(ohms))
}

// Reaches tells whether a pot has a code within half a step of a resistance, Ω.
func Reaches(pot instruments.PotWiring, ohms float64) bool {
	return math.Abs(pot.Ohms(nearestCode(pot, ohms)).SI()-ohms) <= potStep(pot)/2*(1+1e-9)
}

// potStep is the resistance of one code, Ω.
func potStep(pot instruments.PotWiring) float64 { return pot.EndToEnd / float64(pot.Codes-1) }

func nearestCode(pot instruments.PotWiring, ohms float64) int {
	c := math.Round((ohms - pot.Wiper) / potStep(pot))
	return int(math.Max(0, math.Min(float64(pot.Codes-1), c)))
}
