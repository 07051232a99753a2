package circuit

import (
	"fmt"
	"testing"
)

var cards = map[string]*Diode{"1N4148": &signal, "schottky-a": &schottkyA, "schottky-b": &schottkyB}

// TestTimingAgainstTransientSimulation holds every network of timing.csv, a
// table made by a general circuit simulator (testdata/reference/README.md).
func TestTimingAgainstTransientSimulation(t *testing.T) {
	for k, r := range rows(t, "timing.csv") {
		t.Run(fmt.Sprintf("row%d-%s", k+1, r["network"]), func(t *testing.T) {
			n := func(key string) float64 { return number(t, r, key) }
			b := Timing{Common: n("r1"), Down: n("r2"), Capacitance: n("c")}
			d := cards[r["diode"]]
			switch r["network"] {
			case "plain":
				b.Network = Plain
			case "steered":
				b.Network, b.ChargeDiode, b.DischargeDiode = Steered, d, d
			case "wiper":
				b.Network, b.ChargeDiode, b.DischargeDiode = Wiper, d, d
				b.Pot, b.PotTrack, b.Down = PotWiper, n("pot"), 0
			}
			s := mustNew(t, bare(b, n("r_discharge_pin")), n("vcc"))
			if b.Pot == PotWiper {
				if err := s.SetPot(n("wiper") * n("pot")); err != nil {
					t.Fatal(err)
				}
			}
			th, tl := n("t_high"), n("t_low")
			s.Advance(5 * (th + tl))
			high, low := phases(t, s, 6*(th+tl))
			near(t, "t_high", high, th, 0.003)
			near(t, "t_low", low, tl, 0.003)
			t.Logf("t_high %+.4f %%, t_low %+.4f %%", 100*(high/th-1), 100*(low/tl-1))
		})
	}
}
