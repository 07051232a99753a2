package circuit

import (
	"fmt"
	"strings"
)

// A Node is a place a probe can be put.
type Node uint8

// The nodes. flyback_top is where the load's supply comes in, before the
// current meter; load_hi and load_lo are the load's own terminals.
const (
	Common Node = iota
	Supply
	TimerOut
	Capacitor
	Discharge
	Control
	FlybackTop
	LoadHi
	LoadLo
	nodes
)

var nodeNames = [nodes]string{"common", "supply", "timer_out", "capacitor", "discharge", "control", "flyback_top", "load_hi", "load_lo"}

func (n Node) String() string {
	if n < nodes {
		return nodeNames[n]
	}
	return fmt.Sprintf("node %d", uint8(n))
}

// ParseNode gives the node of a name as bench files write it.
func ParseNode(name string) (Node, error) {
	for n, s := range nodeNames {
		if s == name {
			return Node(n), nil
		}
	}
	return 0, fmt.Errorf("circuit: unknown node %q; use one of %s", name, strings.Join(nodeNames[:], ", "))
}

// A Probe is what an instrument sees: a voltage between two nodes, a current,
// or the rotor's speed.
type Probe struct {
	hi, lo  Node
	current Current
}

// A Current is a place where the bench can measure current.
type Current uint8

const (
	noCurrent Current = iota
	// LoadCurrent is the motor's or resistor's, positive from load_hi to load_lo, A.
	LoadCurrent
	// SupplyCurrent is what the source delivers, A; never negative.
	SupplyCurrent
	// OutputCurrent is what the timer's output sources, A; negative when it sinks.
	OutputCurrent
	rotor
)

// Between is the voltage from lo up to hi, in V.
func Between(hi, lo Node) Probe { return Probe{hi: hi, lo: lo} }

// Through is a current, in A.
func Through(c Current) Probe { return Probe{current: c} }

// RotorSpeed is the motor's speed, in rad/s.
func RotorSpeed() Probe { return Probe{current: rotor} }
