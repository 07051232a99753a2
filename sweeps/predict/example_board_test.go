package predict

import (
	"path/filepath"
	"testing"

	"nightbench/sweeps"
)

// exampleBench is what the example's bench file says of its pot and meter.
var exampleBench = Options{PotTolerance: 0.2, PotMaxCurrent: 2.5e-3, PotMaxVoltage: 16}

// The example boards are stressed below 70 % everywhere their plans go: from the
// first code to the whole track, at the lowest to the highest rated supply.
func TestExampleBoardsAreAtEase(t *testing.T) {
	for _, name := range []string{"pump-driver-a.toml", "pump-driver-b.toml"} {
		b, err := sweeps.ReadBoard(filepath.Join("..", "example", name))
		if err != nil {
			t.Fatal(err)
		}
		m := mustNew(t, b, exampleBench)
		for _, supply := range []float64{b.RatedSupply[0].SI(), 9, b.RatedSupply[1].SI()} {
			for _, pot := range []float64{75, 1e3, 10e3, 82e3, 100e3} {
				table, err := m.Stress(Setting{Supply: supply, Pot: pot, Temperature: Reference, Burden: 0.3})
				if err != nil {
					t.Fatal(err)
				}
				if len(table.Running) == 0 {
					t.Errorf("%s at %g V, %g ohm does not oscillate", name, supply, pot)
				}
				for _, s := range append(table.Running, table.Locked...) {
					if s.Share() >= Caution {
						t.Errorf("%s at %g V, %g ohm: %s", name, supply, pot, s)
					}
				}
			}
		}
	}
}

// At code 0 a pot of 75 ohm of wiper and no stop would carry tens of milliamperes as the discharge begins.
func TestPotNeedsItsStop(t *testing.T) {
	b := pump()
	b.Timer.Part = "ideal" // no resistance of its own to help
	b.Timing.Stop = ohms(0)
	wiper := func() Stress {
		table, err := mustNew(t, b, exampleBench).Stress(Setting{Supply: 12, Pot: 75, Temperature: Reference})
		if err != nil {
			t.Fatal(err)
		}
		for _, s := range table.Running {
			if s.Part == "pot" && s.What == "wiper current" {
				return s
			}
		}
		t.Fatal("no wiper current in the table")
		return Stress{}
	}
	between2(t, "without stop, A", wiper().Value, 0.08, 0.11)
	b.Timing.Stop = ohms(4.7e3)
	between2(t, "with stop, A", wiper().Value, 1e-3, 1.75e-3)
}
