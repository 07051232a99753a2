package practice

import (
	"math"
	"strconv"
	"testing"

	"nightbench/instruments/practice/circuit"
)

// With the wiper in the network the code counts from terminal B, where the track
// discharges; the rest of the 100 k charges, and both shares make up one track.
func TestCodesOfAWiperCountFromTheDischargingEnd(t *testing.T) {
	board := timed()
	w := &board.Timing
	w.Network, w.Pot, w.Common, w.Up, w.Down, w.PotTrack, w.PotWiperOhms = circuit.Wiper, circuit.PotWiper, 10e3, 10e3, 10e3, 100e3, 75
	atDesk(t, board, func(d *desk) {
		d.on("9")
		for _, code := range []int{0, 64, 128, 192, 256} {
			d.tell("pot", "WIP "+strconv.Itoa(code))
			// Equal diodes lengthen both phases: 2 % of the duty is theirs at most.
			x := 1 - float64(code)/256
			up, down := 10e3+75+100e3*x+10e3, 75+100e3*(1-x)+10e3
			d.near("average at code "+strconv.Itoa(code), d.number("average", "READ?")/9, up/(up+down), 0.02)
			// One whole track a period, wherever the wiper: ln 2·R·C but for the diodes, whose
			// 0.5 to 0.6 V of 9 V make either phase longer by a seventh: ln(5.45/2.45) in place of ln 2.
			d.near("frequency at code "+strconv.Itoa(code), d.frequency(), 1/(math.Log(5.45/2.45)*(up+down)*22e-9), 20)
		}
	})
}
