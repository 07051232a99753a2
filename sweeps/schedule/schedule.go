// Package schedule says which setpoint comes next. It is a pure function of the
// plan, the pot, the seed and the points so far: a live run and a resumed one
// call the same function and get the same answer.
package schedule

import (
	"fmt"
	"math"
	"math/rand/v2"
	"slices"

	"nightbench/instruments"
	"nightbench/sweeps"
)

// Order is every setpoint of the plan in the order of visit, indexed from 0. The
// first axis of the plan is the outermost. pot may be nil where no axis turns it.
// Pot values are snapped to reachable codes and duplicates dropped.
func Order(plan sweeps.Plan, pot *instruments.PotWiring, seed uint64) ([]sweeps.Setpoint, error) {
	steps := make([][]step, len(plan.Axes))
	for i, a := range plan.Axes {
		s, err := axisSteps(a, pot, rand.New(rand.NewPCG(seed, uint64(i))))
		if err != nil {
			return nil, err
		}
		steps[i] = s
	}
	var o order
	o.start(pot)
	o.nest(steps)
	return o.visited, nil
}

// Next is the first setpoint of the order that has no point yet; false when all have.
func Next(order []sweeps.Setpoint, points []sweeps.Point) (sweeps.Setpoint, bool) {
	done := make(map[int]bool, len(points))
	for _, p := range points {
		done[p.Setpoint.Index] = true
	}
	for _, s := range order {
		if !done[s.Index] {
			return s, true
		}
	}
	return sweeps.Setpoint{}, false
}

// step is one value of one axis, applied to a setpoint; turn is true where a new pass along the axis begins.
type step struct {
	apply func(*sweeps.Setpoint)
	way   sweeps.Direction
	turn  bool
}

// order walks the axes, outermost first, and collects what is visited.
type order struct {
	now     sweeps.Setpoint
	pass    int
	visited []sweeps.Setpoint
}

func (o *order) start(pot *instruments.PotWiring) {
	o.pass = -1
	if pot != nil {
		o.now.Turn(*pot, pot.Park, sweeps.SetPotCode)
	}
}

func (o *order) nest(axes [][]step) {
	if len(axes) == 0 {
		o.now.Index = len(o.visited)
		o.visited = append(o.visited, o.now)
		return
	}
	for _, s := range axes[0] {
		s.apply(&o.now)
		if len(axes) == 1 {
			if s.turn {
				o.pass++
			}
			o.now.Direction, o.now.Pass = s.way, o.pass
		}
		o.nest(axes[1:])
	}
}

// axisSteps lays an axis out in the order of travel.
func axisSteps(a sweeps.Axis, pot *instruments.PotWiring, r *rand.Rand) ([]step, error) {
	var up []step
	switch a.Set {
	case sweeps.SetSupplyVoltage:
		for _, v := range a.Values {
			up = append(up, step{apply: func(s *sweeps.Setpoint) { s.Supply = v }, way: sweeps.Up})
		}
	case sweeps.SetPotResistance, sweeps.SetPotCode, sweeps.SetPotPosition:
		codes, err := Codes(a, pot)
		if err != nil {
			return nil, err
		}
		for _, c := range codes {
			up = append(up, step{apply: func(s *sweeps.Setpoint) { s.Turn(*pot, c, a.Set) }, way: sweeps.Up})
		}
	default:
		return nil, fmt.Errorf("axis %q: this version can't step it; it steps supply_voltage, pot_resistance, pot_code and pot_position", a.Set)
	}
	return travel(up, a.Direction, r), nil
}

// travel puts the steps of an axis, given upward, in the order of its direction.
func travel(up []step, d sweeps.Direction, r *rand.Rand) []step {
	down := slices.Clone(up)
	slices.Reverse(down)
	for i := range down {
		down[i].way = sweeps.Down
	}
	var all []step
	switch d {
	case sweeps.Down:
		all = down
	case sweeps.Both:
		if len(down) > 0 {
			down[0].turn = true
		}
		all = append(up, down...)
	case sweeps.Shuffled:
		all = up
		r.Shuffle(len(all), func(i, j int) { all[i], all[j] = all[j], all[i] })
		for i := range all {
			all[i].way = sweeps.Shuffled
		}
	default:
		all = up
	}
	if len(all) > 0 {
		all[0].turn = true
	}
	return all
}

// Codes are the pot codes nearest to an axis's values, in the order written, duplicates dropped.
func Codes(a sweeps.Axis, pot *instruments.PotWiring) ([]int, error) {
	if pot == nil {
		return nil, fmt.Errorf("axis %q: this bench has no pot; add [pot] to the bench file", a.Set)
	}
	switch a.Set {
	case sweeps.SetPotResistance:
		codes, _ := sweeps.Snap(*pot, a.Values)
		return codes, nil
	case sweeps.SetPotPosition:
		return sweeps.SnapPositions(*pot, a.Values), nil
	}
	var codes []int
	for _, v := range a.Values {
		c := int(math.Round(v))
		if c < 0 || c >= pot.Codes {
			return nil, fmt.Errorf("axis %q: code %d is none of 0 to %d", a.Set, c, pot.Codes-1)
		}
		if !slices.Contains(codes, c) {
			codes = append(codes, c)
		}
	}
	return codes, nil
}
