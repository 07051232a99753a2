package schedule

import (
	"slices"
	"testing"

	"nightbench/instruments"
	"nightbench/sweeps"

	"github.com/google/go-cmp/cmp"
	"github.com/google/go-cmp/cmp/cmpopts"
	"pgregory.net/rapid"
)

var pot = &instruments.PotWiring{Codes: 257, EndToEnd: 100e3, Wiper: 75, Park: 256}

func plan(d sweeps.Direction) sweeps.Plan {
	return sweeps.Plan{Axes: []sweeps.Axis{
		{Set: sweeps.SetSupplyVoltage, Values: []float64{9, 12}},
		{Set: sweeps.SetPotResistance, Values: []float64{1e3, 10e3, 47e3}, Direction: d},
	}}
}

func TestBothWaysBelowEachSupply(t *testing.T) {
	got, err := Order(plan(sweeps.Both), pot, 1)
	if err != nil {
		t.Fatal(err)
	}
	type visit struct {
		V    float64
		Code int
		Way  sweeps.Direction
		Pass int
	}
	var visits []visit
	for i, s := range got {
		if s.Index != i {
			t.Errorf("setpoint %d has index %d", i, s.Index)
		}
		visits = append(visits, visit{s.Supply, s.PotCode, s.Direction, s.Pass})
	}
	// Codes by hand: D = (R − 75)/100k·256: 2.37, 25.4, 120.1.
	want := []visit{
		{9, 2, "up", 0}, {9, 25, "up", 0}, {9, 120, "up", 0}, {9, 120, "down", 1}, {9, 25, "down", 1}, {9, 2, "down", 1},
		{12, 2, "up", 2}, {12, 25, "up", 2}, {12, 120, "up", 2}, {12, 120, "down", 3}, {12, 25, "down", 3}, {12, 2, "down", 3},
	}
	if d := cmp.Diff(want, visits); d != "" {
		t.Error(d)
	}
}

func TestShuffledIsAPermutationFixedByItsSeed(t *testing.T) {
	up, _ := Order(plan(sweeps.Up), pot, 1)
	a, _ := Order(plan(sweeps.Shuffled), pot, 7)
	b, _ := Order(plan(sweeps.Shuffled), pot, 7)
	if d := cmp.Diff(a, b); d != "" {
		t.Errorf("the same seed gave another order: %s", d)
	}
	codes := func(s []sweeps.Setpoint) []int {
		var c []int
		for _, x := range s {
			c = append(c, x.PotCode)
		}
		slices.Sort(c)
		return c
	}
	if d := cmp.Diff(codes(up), codes(a)); d != "" {
		t.Errorf("shuffling lost or doubled a setpoint: %s", d)
	}
	for seed := range uint64(20) {
		c, _ := Order(plan(sweeps.Shuffled), pot, seed)
		if !cmp.Equal(a, c) {
			return
		}
	}
	t.Error("twenty seeds gave the same order")
}

func TestNeighbouringOhmsOnOneCodeAreVisitedOnce(t *testing.T) {
	p := plan(sweeps.Up)
	p.Axes[1].Values = []float64{1000, 1001, 1002, 5000}
	got, err := Order(p, pot, 0)
	if err != nil || len(got) != 4 {
		t.Errorf("got %d setpoints (%v), want 2 supplies × 2 codes", len(got), err)
	}
}

func TestAxisWithoutPotIsRefused(t *testing.T) {
	if _, err := Order(plan(sweeps.Up), nil, 0); err == nil {
		t.Error("a pot axis passed on a bench without a pot")
	}
}

// A resumed run must end with every setpoint exactly once, wherever it was cut.
func TestAnyCutIsFinishedExactlyOnce(t *testing.T) {
	rapid.Check(t, func(t *rapid.T) {
		dir := rapid.SampledFrom([]sweeps.Direction{sweeps.Up, sweeps.Down, sweeps.Both, sweeps.Shuffled}).Draw(t, "direction")
		seed := rapid.Uint64().Draw(t, "seed")
		order, err := Order(plan(dir), pot, seed)
		if err != nil {
			t.Fatal(err)
		}
		var points []sweeps.Point
		cut := rapid.IntRange(0, len(order)).Draw(t, "cut")
		for range cut {
			s, _ := Next(order, points)
			points = append(points, sweeps.Point{Setpoint: s})
		}
		again, _ := Order(plan(dir), pot, seed)
		for {
			s, ok := Next(again, points)
			if !ok {
				break
			}
			points = append(points, sweeps.Point{Setpoint: s})
		}
		seen := map[int]int{}
		for i, p := range points {
			seen[p.Setpoint.Index]++
			if p.Setpoint != order[i] {
				t.Fatalf("point %d is %+v, want %+v", i, p.Setpoint, order[i])
			}
		}
		if len(seen) != len(order) || len(points) != len(order) {
			t.Fatalf("%d points over %d setpoints, want %d", len(points), len(seen), len(order))
		}
	})
}

// Positions rise, codes fall: the code counts from terminal B, the share from A.
func TestPositionsAreSnappedToCodes(t *testing.T) {
	p := plan(sweeps.Both)
	p.Axes[0].Values = []float64{9}
	p.Axes[1] = sweeps.Axis{Set: sweeps.SetPotPosition, Values: []float64{0.35, 0.3501, 0.95, 1}, Direction: sweeps.Both}
	got, err := Order(p, pot, 1)
	if err != nil {
		t.Fatal(err)
	}
	// By hand, with 256 steps: (1 − 0.35)·256 = 166.4, (1 − 0.95)·256 = 12.8; 90/256 of 100 k is 35.15625 k.
	want := []sweeps.Setpoint{
		{Index: 0, Supply: 9, PotCode: 166, Position: 90. / 256, Pot: 35156.25, Direction: sweeps.Up},
		{Index: 1, Supply: 9, PotCode: 13, Position: 243. / 256, Pot: 94921.875, Direction: sweeps.Up},
		{Index: 2, Supply: 9, PotCode: 0, Position: 1, Pot: 100e3, Direction: sweeps.Up},
		{Index: 3, Supply: 9, PotCode: 0, Position: 1, Pot: 100e3, Direction: sweeps.Down, Pass: 1},
		{Index: 4, Supply: 9, PotCode: 13, Position: 243. / 256, Pot: 94921.875, Direction: sweeps.Down, Pass: 1},
		{Index: 5, Supply: 9, PotCode: 166, Position: 90. / 256, Pot: 35156.25, Direction: sweeps.Down, Pass: 1},
	}
	if d := cmp.Diff(want, got, cmpopts.EquateApprox(1e-12, 0)); d != "" {
		t.Error(d)
	}
}
