package circuit_test

import (
	"fmt"

	"nightbench/instruments/practice/circuit"
)

// A board with a resistor on it, a supply switched on, and a meter with an
// aperture of 20 ms across the load.
func ExampleSim_Watch() {
	sim, err := circuit.New(circuit.Board{
		Source: circuit.Source{Resistance: 0.05, Bulk: 100e-6},
		Timing: circuit.Timing{Network: circuit.Clocked, Period: 1e-3, Duty: 0.25},
		Timer:  circuit.Timer{Threshold: 2. / 3, Trigger: 0.5, MinSupply: 2},
		Driver: circuit.Driver{Stage: circuit.NMOS, Resistance: 0.05},
		Load:   circuit.Load{Kind: circuit.Resistor, Resistance: 100},
	})
	if err != nil {
		fmt.Println(err)
		return
	}
	_ = sim.SetSupply(9) // V
	_ = sim.SetLimit(1)  // A
	sim.SetOutput(true)
	sim.Advance(10e-3)

	meter := circuit.NewMean(circuit.Between(circuit.LoadHi, circuit.LoadLo), 10e-3, 30e-3)
	if err := sim.Watch(meter); err != nil {
		fmt.Println(err)
		return
	}
	sim.Advance(30e-3)
	fmt.Printf("%.3f V\n", meter.Value())
	// Output: 2.248 V
}
