package predict

import (
	"strings"
	"testing"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Means around the loop add up, whichever way the load hangs: from the supply over
// the meter's burden and the load to common.
func TestNodeMeansAddUp(t *testing.T) {
	onSupply := pump()
	onSupply.Driver = sweeps.Driver{Stage: sweeps.StageNone, Flyback: sweeps.Diode{Name: "1N5819"}}
	onSupply.Load.ToSupply = true
	onSupply.Load.Resistance = ohms(60)
	toGround := onSupply
	toGround.Load.ToSupply = false
	s := at9V(10e3)
	s.Burden = 2
	for name, b := range map[string]sweeps.Board{"nmos": pump(), "to the supply": onSupply, "to ground": toGround} {
		between := func(a, z instruments.Node) float64 {
			return mustAt(t, mustNew(t, b, Options{Average: instruments.Between{a, z}}), s)[sweeps.AverageVoltage]
		}
		top, bottom := instruments.NodeFlybackTop, instruments.NodeCommon
		plain := mustAt(t, mustNew(t, b, Options{}), s)
		near(t, name+" over the burden", between(top, instruments.NodeLoadHigh), 2*plain[sweeps.MotorCurrent], 1e-6)
		near(t, name+" over the load", between(instruments.NodeLoadHigh, instruments.NodeLoadLow), plain[sweeps.AverageVoltage], 1e-9)
		near(t, name+" in all", between(top, instruments.NodeLoadHigh)+between(instruments.NodeLoadHigh, instruments.NodeLoadLow)+between(instruments.NodeLoadLow, bottom),
			between(top, bottom), 1e-9)
	}
	_, err := New(pump(), Options{Average: instruments.Between{instruments.NodeCapacitor, instruments.NodeCommon}})
	if err == nil || !strings.Contains(err.Error(), "capacitor") || !strings.Contains(err.Error(), "timer_out") {
		t.Errorf("mean of the capacitor: %v", err)
	}
}
