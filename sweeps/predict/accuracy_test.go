package predict

import (
	"fmt"
	"strings"
	"testing"
)

// TestAccuracy prints the accuracy table and holds it: the reference tables made
// by circuit simulation, boards integrated step by step here, and boards simulated
// live where the simulator is installed (in CI it must be).
func TestAccuracy(t *testing.T) {
	parts := []struct {
		name string
		run  func(*testing.T) []*accuracy
		rows []*accuracy
	}{
		{name: "timing.csv", run: timingTable}, {name: "motor.csv", run: motorTable}, {name: "board.csv", run: boardTable},
		{name: "integrated", run: integratedBoards}, {name: "networks", run: simulatedNetworks}, {name: "stages", run: simulatedStages},
	}
	t.Run("against", func(t *testing.T) {
		for i := range parts {
			t.Run(parts[i].name, func(t *testing.T) {
				t.Parallel()
				parts[i].rows = parts[i].run(t)
			})
		}
	})
	var b strings.Builder
	for _, p := range parts {
		for _, a := range p.rows {
			fmt.Fprintln(&b, a)
		}
	}
	t.Log("\n" + b.String())
}
