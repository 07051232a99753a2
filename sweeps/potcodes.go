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

// SnapPositions finds the codes nearest to shares of the track in the charging path, in
// the order given, each code once. Check reachability first with ReachesPosition.
func SnapPositions(pot instruments.PotWiring, shares []float64) (codes []int) {
	for _, x := range shares {
		if c := positionCode(pot, x); !slices.Contains(codes, c) {
			codes = append(codes, c)
		}
	}
	return codes
}

// ReachesPosition tells whether a pot has a code within half a step of a share of its
// track. The wiper at the very end of the charging path, a share of none, is no
// setting: predicted curves run along ohms, on a logarithmic scale.
func ReachesPosition(pot instruments.PotWiring, share float64) bool {
	return math.Abs(pot.Position(positionCode(pot, share))-share) <= (1+1e-9)/float64(2*(pot.Codes-1))
}

// positionCode is the code nearest to a share: code = (1 − x)·(codes − 1).
func positionCode(pot instruments.PotWiring, share float64) int {
	c := math.Round((1 - share) * float64(pot.Codes-1))
	return int(math.Max(0, math.Min(float64(pot.Codes-2), c)))
}

// Turn puts the setpoint on a code of the pot: ohms between wiper and terminal B, or
// for a position the share toward A and the ohms of that share, the wiper's own apart.
func (s *Setpoint) Turn(pot instruments.PotWiring, code int, set Setting) {
	s.PotCode, s.Pot, s.Position = code, pot.Ohms(code).SI(), 0
	if set == SetPotPosition {
		s.Position = pot.Position(code)
		s.Pot = s.Position * pot.EndToEnd
	}
}

// potStep is the resistance of one code, Ω.
func potStep(pot instruments.PotWiring) float64 { return pot.EndToEnd / float64(pot.Codes-1) }

func nearestCode(pot instruments.PotWiring, ohms float64) int {
	c := math.Round((ohms - pot.Wiper) / potStep(pot))
	return int(math.Max(0, math.Min(float64(pot.Codes-1), c)))
}
