package runner_test

import (
	"context"
	"errors"
	"fmt"
	"io"
	"strings"
	"testing"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/practice/circuit"
	"nightbench/instruments/si"
	"nightbench/sweeps"
	"nightbench/sweeps/runner"
)

// Each end of a run, however it comes about, leaves the bench off, confirmed by
// the supply's own log, and keeps what was measured.
func TestEveryEnd(t *testing.T) {
	for _, c := range []struct {
		name   string
		more   string         // of the plan
		before func(n *night) // changes the options
		during func(n *night) // after two points
		state  sweeps.State
		reason string
	}{
		{name: "motor current", more: `[trip]` + "\n" + `motor_current = { limit = "0.2 A", for = "200 ms" }`,
			during: func(n *night) { n.locked() }, state: sweeps.Tripped, reason: "motor_current"},
		{name: "supply current", more: `[trip]` + "\n" + `supply_current = { limit = "0.5 A", for = "200 ms" }`,
			during: func(n *night) {
				n.supplyReads(func(s *instruments.SupplyState) { s.Current.Value = 0.7; s.Current.Raw = "0.7000" })
			},
			state: sweeps.Tripped, reason: "supply_current"},
		{name: "supply voltage", more: `[trip]` + "\n" + `supply_voltage = { limit = "12.5 V", for = "200 ms" }`,
			during: func(n *night) {
				n.supplyReads(func(s *instruments.SupplyState) { s.Voltage.Value = 12.9; s.Voltage.Raw = "12.900" })
			},
			state: sweeps.Tripped, reason: "supply_voltage"},
		{name: "limiting", during: func(n *night) {
			n.alter(func(b *circuit.Board) {
				b.Timer.Quiescent = []circuit.Quiescent{{Volts: 5, Amps: 2}, {Volts: 15, Amps: 2}}
			})
		},
			state: sweeps.Tripped, reason: "limiting"},
		{name: "latch", during: func(n *night) { n.ask("supply", "VOLT:PROT 5") }, state: sweeps.Tripped, reason: "own protection"},
		{name: "blind", during: func(n *night) {
			n.cables["supply"].mute.Store(true)
			n.later(10*time.Second, func() { n.cables["supply"].mute.Store(false) })
		},
			state: sweeps.Tripped, reason: "blind"},
		{name: "lost supply", during: func(n *night) { n.cables["supply"].pull(); n.later(10*time.Second, n.cables["supply"].plug) },
			state: sweeps.Tripped, reason: "blind"},
		{name: "off at the panel", during: func(n *night) { n.ask("supply", "OUTP OFF") }, state: sweeps.Tripped, reason: "went off by itself"},
		{name: "off target", during: func(n *night) { n.ask("supply", "VOLT 8") }, state: sweeps.Tripped, reason: "off target"},
		{name: "never on target", before: func(n *night) {
			n.options.Bench.Supply = &supply{Supply: n.options.Bench.Supply, volts: func(context.Context, si.Voltage) error { return nil }}
		}, state: sweeps.Tripped, reason: "off target"},
		{name: "stop", during: func(n *night) { n.must(n.run.Command(runner.CmdStop, "Ada")) }, state: sweeps.Stopped, reason: "stopped by Ada"},
		{name: "outputs off", during: func(n *night) { n.must(n.run.Command(runner.CmdOff, "Ada")) }, state: sweeps.Stopped, reason: "outputs off, by Ada"},
		{name: "at most", before: func(n *night) { n.options.Plan.AtMost = 30 * time.Second }, state: sweeps.Stopped, reason: "limit of 30s"},
		{name: "safe by", before: func(n *night) { n.options.Plan.SafeBy, n.options.SafeBy = "07:00", n.clock.Now().Add(40*time.Second) },
			state: sweeps.Stopped, reason: "the time to be safe by"},
		{name: "journal", before: func(n *night) {
			n.options.Journal = journal(func(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) {
				if e.Kind == sweeps.KindPoint && e.Point.Setpoint.Index == 3 {
					return e, errors.New("the disk is full")
				}
				return n.store.Append(ctx, e)
			})
		}, state: sweeps.Failed, reason: "the disk is full"},
		{name: "journal before energising", before: func(n *night) {
			n.options.Journal = journal(func(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) {
				if e.Kind == sweeps.KindEnergising {
					return e, io.ErrShortWrite
				}
				return n.store.Append(ctx, e)
			})
		}, state: sweeps.Failed, reason: "short write"},
		{name: "energised record", before: func(n *night) { n.mark.fail = errors.New("read-only") }, state: sweeps.Failed, reason: "read-only"},
		{name: "panic in the journal", before: func(n *night) {
			n.options.Journal = journal(func(ctx context.Context, e sweeps.Entry) (sweeps.Entry, error) {
				if e.Kind == sweeps.KindPoint {
					panic("page torn")
				}
				return n.store.Append(ctx, e)
			})
		}, state: sweeps.Failed, reason: "page torn"},
		{name: "panic in a driver", before: func(n *night) { n.meterPanics(1, 5) }, state: sweeps.Failed, reason: "index out of range"},
		{name: "panic in the derivation", before: func(n *night) {
			n.options.Predict = panicking{n.options.Predict, n}
		}, state: sweeps.Failed, reason: "no such table"},
		{name: "lost meter", during: func(n *night) { n.cables["motor"].pull() }, state: sweeps.Failed, reason: "motor"},
		{name: "silent meter", during: func(n *night) { n.cables["average"].mute.Store(true) }, state: sweeps.Failed, reason: "average"},
		{name: "lost scope", during: func(n *night) { n.cables["scope"].pull() }, state: sweeps.Failed, reason: "scope"},
		{name: "lost pot", during: func(n *night) { n.cables["pot"].pull() }, state: sweeps.Failed, reason: "pot"},
		{name: "output found on", before: func(n *night) { n.ask("supply", "VOLT 3;OUTP ON") }, state: sweeps.Failed, reason: "was on already"},
	} {
		t.Run(c.name, func(t *testing.T) {
			inNight(t, short(c.more), func(n *night) {
				if c.before != nil {
					c.before(n)
				}
				done := n.begin()
				if c.during != nil {
					n.measured(2)
					c.during(n)
				}
				asked := n.clock.Elapsed()
				end := <-done
				n.safe(end, c.state, c.reason)
				n.journaled(end)
				if took := n.clock.Elapsed() - asked; took > 100*time.Second {
					t.Errorf("the end came after %s", took)
				}
				if points := n.points(); c.during != nil && len(points) < 2 {
					t.Errorf("%d points are kept; two were there", len(points))
				}
				t.Logf("output off %.2f s after it began, confirmed after %.1f s: %s", n.offAt()-asked.Seconds(), (n.clock.Elapsed() - asked).Seconds(), end.Reason)
			})
		})
	}
}

// The daemon's own end is a stop, even where the context was over from the start.
func TestContextEnded(t *testing.T) {
	for _, cause := range []error{nil, &runner.Stop{Reason: "the daemon was told to end: terminated"}} {
		inNight(t, short(""), func(n *night) {
			ctx, cancel := context.WithCancelCause(n.Context())
			cancel(cause)
			n.safe(n.conductIn(ctx), sweeps.Stopped, "the daemon was told to end")
			if _, times := n.output(); times != 0 {
				t.Error("the output went on")
			}
		})
		inNight(t, short(""), func(n *night) {
			ctx, cancel := context.WithCancelCause(n.Context())
			n.later(20*time.Second, func() { cancel(cause) })
			end := n.conductIn(ctx)
			n.safe(end, sweeps.Stopped, "the daemon was told to end")
			n.journaled(end)
		})
	}
}

// offAt is when the output went off by the supply's own log, s of bench time.
func (n *night) offAt() (at float64) {
	for _, l := range n.supplyLog() {
		if l.Output != nil && !*l.Output {
			at = l.Bench
		}
	}
	return at
}

// locked blocks the rotor: its torque is beyond what the winding gives.
func (n *night) locked() {
	n.alter(func(b *circuit.Board) { b.Load.StaticTorque, b.Load.CoulombTorque = 1, 1 })
}

// ask says a message to a practice instrument on a second cable, as a hand at the panel would.
func (n *night) ask(instrument, message string) {
	n.Helper()
	c := &cable{to: n.cables[instrument].to}
	s, err := c.dial()
	n.must(err)
	_, err = s.Write([]byte(message + "\n*OPC?\n"))
	n.must(err)
	buf := make([]byte, 16)
	_, err = s.Read(buf)
	n.must(err)
	n.must(s.Close())
}

// later does something after d of bench time.
func (n *night) later(d time.Duration, f func()) {
	go func() { time.Sleep(d); f() }()
}

// supplyReads lies about the supply's state, until it is switched off.
func (n *night) supplyReads(lie func(*instruments.SupplyState)) {
	n.lie.Store(&lie)
}

// meterPanics lets a driver fail as only a bug can, at the k-th reading.
func (n *night) meterPanics(which, k int) {
	m := meter{Meter: n.options.Bench.Meters[which]}
	m.read = func(ctx context.Context) (sample, error) {
		if k--; k == 0 {
			var none []int
			_ = none[which]
		}
		return m.Meter.Read(ctx)
	}
	n.options.Bench.Meters[which] = &m
}

// panicking predicts until two points were measured.
type panicking struct {
	runner.Predictor
	n *night
}

func (p panicking) At(supply, pot float64) (map[sweeps.Quantity]sweeps.Prediction, []sweeps.Flag) {
	if p.n.run.Vitals().Measured >= 2 {
		panic("no such table")
	}
	return p.Predictor.At(supply, pot)
}

// A trip tells its raw reading, and the log of a run tells things in their order.
func TestTripIsToldInOrder(t *testing.T) {
	inNight(t, short("[trip]\nmotor_current = { limit = \"0.2 A\", for = \"200 ms\" }"), func(n *night) {
		done := n.begin()
		n.measured(1)
		n.locked()
		<-done
		var order []string
		for _, e := range n.entries() {
			order = append(order, fmt.Sprint(e.Kind, " ", e.State))
			if e.Kind == sweeps.KindTrip && !strings.Contains(e.Words, "as received") {
				t.Errorf("no raw reading: %q", e.Words)
			}
		}
		want := "state making_safe,trip ,off ,ended tripped"
		if got := strings.Join(order, ","); !strings.HasSuffix(got, want) {
			t.Errorf("entries end with %s; want %s", got, want)
		}
	})
}
