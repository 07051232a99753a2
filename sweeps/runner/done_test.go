package runner_test

import (
	"testing"

	"nightbench/sweeps"
	"nightbench/sweeps/example"
)

func TestSampleNight(t *testing.T) {
	inNight(t, example.Text(example.Sample), func(n *night) {
		end := n.conduct()
		n.safe(end, sweeps.Done, "all setpoints measured")
		n.journaled(end)
		if got, want := len(n.points()), len(n.options.Order); got != want {
			t.Errorf("%d points of %d", got, want)
		}
		for _, p := range n.points() {
			for _, r := range p.Readings {
				if len(r.Flags) > 0 {
					t.Log(p.Setpoint.Index, r.Quantity, r.Flags)
				}
			}
		}
		t.Log(n.clock.Elapsed())
	})
}
