// Package circuit is the practice bench's board: a timer, its timing network, a
// switch, a motor or resistor and the bench supply that feeds them, simulated
// in the time domain. It integrates the node equations and knows no closed form
// of any charging time, duty or average, so that what the instruments of the
// practice bench read is independent of any prediction.
//
// # How it works
//
// The state is the supply node, the timing capacitor, the load current, the
// rotor's speed and angle, and the winding's temperature; switches (the timer's
// flip-flop, the driver, the direction of the load current, the region of the
// supply) stay as they are during a step. Each step solves the linearised
// circuit exactly and corrects it to third order; it ends just where a
// comparator's level or the zero of a current is reached. A step is therefore
// fine enough by its own error estimate and never unstable, however stiff the
// circuit.
//
// Time moves only in [Sim.Advance] and [Sim.Run], so that a board can be left
// alone until an instrument looks. Where nobody looks and the board repeats
// itself, Advance leaps over whole periods and takes the slow states along at
// their mean rate; cogging and commutation ripple, which then average out, are
// left away; so too where a mean is taken over many teeth of the rotor. A Sim takes no locks and starts no goroutines: its owner
// serialises access.
//
// # How an instrument looks
//
// A meter with an aperture registers a [Mean] when it is triggered and reads it
// once the time has passed, whoever moves the time meanwhile. Means are exact
// over the aperture: one that is not a whole number of PWM periods beats, as on
// a real bench.
//
//	sim.Advance(now) // as far as the clock has come
//	m := circuit.NewMean(circuit.Between(circuit.LoadHi, circuit.LoadLo), now, now+0.1)
//	if err := sim.Watch(m); err != nil {
//		return err
//	}
//	// … at now + 0.1 s, when the reply is due:
//	sim.Advance(now + 0.1)
//	volts := m.Value()
//
// A scope registers a [Record] for the whole record, pre-trigger included, and
// looks for its trigger in the samples; the supply's own display is
// [Sim.Look]. An observer of another kind implements [Observer] and asks each
// [Segment] for what it needs.
//
// # Units and signs
//
// SI throughout: V, A, ohm, F, H, s, K, rad/s. A load current is positive from
// load_hi to load_lo, an output current when the timer sources it.
package circuit
