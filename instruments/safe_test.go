package instruments

import (
	"context"
	"errors"
	"fmt"
	"slices"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"nightbench/instruments/si"
)

// night is a bench that keeps a record of what is asked of it. Each entry of
// ill says what befalls a call: an error, a panic, or silence until its context ends.
type night struct {
	Absent
	calls []string
	ill   map[string]func(context.Context) error

	volts float64 // at the supply's terminals
	on    bool
	load  float64 // V over the load
	decay float64 // V lost of load at each look
	code  int
	since time.Time
}

func (n *night) call(ctx context.Context, name string) error {
	n.calls = append(n.calls, name)
	if do := n.ill[name]; do != nil {
		return do(ctx)
	}
	return ctx.Err()
}

func (n *night) Off(ctx context.Context) error {
	if err := n.call(ctx, "off"); err != nil {
		return err
	}
	n.on, n.volts = false, 0
	return nil
}

func (n *night) SetOutput(ctx context.Context, on bool) error {
	if err := n.call(ctx, fmt.Sprint("output ", on)); err != nil {
		return err
	}
	n.on, n.volts = on, 0
	return nil
}

func (n *night) State(ctx context.Context) (SupplyState, error) {
	err := n.call(ctx, "state")
	return SupplyState{Output: n.on, Voltage: Sample{Value: n.volts, Unit: si.Volt, Outcome: Measured, Raw: "r"}}, err
}

func (n *night) Open(ctx context.Context) error { return n.call(ctx, "cutoff") }
func (n *night) SetCode(ctx context.Context, code int) error {
	if err := n.call(ctx, "park"); err != nil {
		return err
	}
	n.code = code
	return nil
}

// lens is the meter over the load.
type lens struct{ *night }

func (l lens) Configure(ctx context.Context, s MeterSettings) (MeterSettings, error) {
	return s, l.call(ctx, "configure")
}

func (l lens) Read(ctx context.Context) (Sample, error) {
	err := l.call(ctx, "read")
	l.load = max(l.load-l.decay, 0)
	return Sample{Value: l.load, Unit: si.Volt, Outcome: Measured}, err
}

func (n *night) bench() Bench {
	return Bench{
		Wiring: Wiring{
			Supply: SupplyWiring{MaxVoltage: 13},
			Meters: []MeterWiring{{Name: "motor", Reads: "motor_current"}, {Name: "average", Reads: "average_voltage"}},
			Pot:    &PotWiring{Codes: 257, Park: 256},
		},
		Supply: n, Meters: []Meter{NoMeter("motor_current"), lens{n}}, Pot: n, Cutoff: n,
	}
}

func energised() *night {
	return &night{volts: 9, on: true, ill: map[string]func(context.Context) error{}}
}

var errBroken = errors.New("broken")

func broken(context.Context) error { return errBroken }
func panics(context.Context) error { panic("a mistake in a driver") }
func silent(ctx context.Context) error {
	<-ctx.Done()
	return ctx.Err()
}

// after is broken for a while and then well.
func (n *night) after(d time.Duration, ill func(context.Context) error) func(context.Context) error {
	return func(ctx context.Context) error {
		if time.Since(n.since) < d {
			return ill(ctx)
		}
		return nil
	}
}

func inBubble(t *testing.T, name string, test func(t *testing.T)) {
	t.Run(name, func(t *testing.T) { synctest.Test(t, test) })
}

func TestMakeSafeKeepsTheOrder(t *testing.T) {
	inBubble(t, "AllWell", func(t *testing.T) {
		n := energised()
		r := MakeSafe(t.Context(), NewClock(1), n.bench(), SafeSpec{})
		if want := []string{"off", "cutoff", "output false", "state", "park", "read"}; !slices.Equal(n.calls, want) {
			t.Errorf("did %v, want %v", n.calls, want)
		}
		if !r.Confirmed || !r.Parked || n.code != 256 || r.Err != nil || *r.Voltage != 0 || r.Below != 0.5 {
			t.Errorf("%+v", r)
		}
		if !slices.Equal(r.By, []string{"supply", "meter average"}) {
			t.Errorf("witnesses %v", r.By)
		}
		if !strings.Contains(r.Words, "confirmed below 500\u00a0mV by supply and meter average") {
			t.Errorf("words %q", r.Words)
		}
	})
}

// Every step failing in turn, in three ways: none holds up the others, and
// what confirms is only the supply's own read-back.
func TestMakeSafeWithOneStepFailing(t *testing.T) {
	for _, step := range []string{"off", "cutoff", "output false", "state", "park", "read"} {
		for how, ill := range map[string]func(context.Context) error{"Broken": broken, "Silent": silent, "Panics": panics} {
			inBubble(t, step+how, func(t *testing.T) {
				n := energised()
				n.ill[step] = ill
				ctx, cancel := context.WithTimeout(t.Context(), 40*time.Second)
				defer cancel()
				var said []string
				r := MakeSafe(ctx, NewClock(1), n.bench(), SafeSpec{Log: func(words string) { said = append(said, words) }})
				if want := step != "state"; r.Confirmed != want {
					t.Errorf("confirmed %v: %s", r.Confirmed, r.Words)
				}
				if n.on {
					t.Error("the output is on")
				}
				for _, other := range []string{"off", "cutoff", "output false", "state", "park"} {
					if !slices.Contains(n.calls, other) {
						t.Errorf("%s was never tried", other)
					}
				}
				if r.Err == nil || len(said) == 0 {
					t.Errorf("the failure is not told: %v, %v", r.Err, said)
				}
				if r.Parked != (step != "park") {
					t.Errorf("parked %v", r.Parked)
				}
				if step == "read" && slices.Contains(r.By, "meter average") {
					t.Error("a meter that can't be read is a witness")
				}
			})
		}
	}
}

func TestMakeSafeNeverGivesUp(t *testing.T) {
	inBubble(t, "WhileItsContextLives", func(t *testing.T) {
		n := energised()
		n.since = time.Now()
		for _, step := range []string{"off", "output false", "state"} {
			n.ill[step] = n.after(10*time.Minute, broken)
		}
		lines := 0
		r := MakeSafe(t.Context(), NewClock(1), n.bench(), SafeSpec{Log: func(string) { lines++ }})
		if !r.Confirmed || n.on {
			t.Errorf("%+v", r)
		}
		if took := time.Since(n.since); took < 10*time.Minute || took > 11*time.Minute {
			t.Errorf("took %v", took)
		}
		if lines != 3 {
			t.Errorf("%d lines for three failures that never changed", lines)
		}
	})
	inBubble(t, "UntilItEndsAndThenSaysWhatToTurn", func(t *testing.T) {
		n := energised()
		n.ill["state"], n.ill["off"], n.ill["output false"] = broken, broken, broken
		ctx, cancel := context.WithTimeout(t.Context(), time.Minute)
		defer cancel()
		r := MakeSafe(ctx, NewClock(1), n.bench(), SafeSpec{Words: "Turn S1 on the bench's left to 0."})
		if r.Confirmed || r.Voltage != nil {
			t.Errorf("%+v", r)
		}
		for _, part := range []string{"NOT CONFIRMED OFF", "can't be read", "energised", "Turn S1"} {
			if !strings.Contains(r.Words, part) {
				t.Errorf("%q does not say %q", r.Words, part)
			}
		}
		if !errors.Is(r.Err, errBroken) {
			t.Errorf("cause %v", r.Err)
		}
	})
}

func TestMakeSafeUnderACancelledContext(t *testing.T) {
	inBubble(t, "CutsPowerAllTheSame", func(t *testing.T) {
		n := energised()
		ctx, cancel := context.WithCancel(t.Context())
		cancel()
		r := MakeSafe(ctx, NewClock(1), n.bench(), SafeSpec{})
		if n.on || !r.Confirmed || n.code != 256 {
			t.Errorf("on %v, %+v", n.on, r)
		}
	})
}

func TestMakeSafeSecondWitness(t *testing.T) {
	inBubble(t, "WaitsForACoastingMotor", func(t *testing.T) {
		n := energised()
		n.load, n.decay = 3, 0.1
		began := time.Now()
		r := MakeSafe(t.Context(), NewClock(1), n.bench(), SafeSpec{})
		if !r.Confirmed || time.Since(began) < 4*time.Second {
			t.Errorf("after %v: %+v", time.Since(began), r)
		}
	})
	inBubble(t, "ContradictsASupply", func(t *testing.T) {
		n := energised()
		n.load = 8.3
		ctx, cancel := context.WithTimeout(t.Context(), 30*time.Second)
		defer cancel()
		r := MakeSafe(ctx, NewClock(1), n.bench(), SafeSpec{})
		if r.Confirmed || !slices.Equal(r.By, []string{"supply"}) {
			t.Errorf("%+v", r)
		}
		for _, part := range []string{"meter average reads 8.3\u00a0V", "another source", "hands off"} {
			if !strings.Contains(r.Words, part) {
				t.Errorf("%q does not say %q", r.Words, part)
			}
		}
	})
	inBubble(t, "IsConfiguredWhereItHasToBe", func(t *testing.T) {
		n := energised()
		configured := false
		n.ill["configure"] = func(context.Context) error { configured = true; return nil }
		n.ill["read"] = func(context.Context) error {
			if !configured {
				return errBroken
			}
			return nil
		}
		r := MakeSafe(t.Context(), NewClock(1), n.bench(), SafeSpec{})
		if !slices.Contains(r.By, "meter average") {
			t.Errorf("witnesses %v", r.By)
		}
	})
	inBubble(t, "DoesNotReplaceTheSupply", func(t *testing.T) {
		n := energised() // the meter reads 0 V because the timer has stopped, and the supply is still on
		n.ill["off"], n.ill["output false"] = broken, broken
		ctx, cancel := context.WithTimeout(t.Context(), 20*time.Second)
		defer cancel()
		r := MakeSafe(ctx, NewClock(1), n.bench(), SafeSpec{})
		if r.Confirmed || *r.Voltage != 9 {
			t.Errorf("%+v", r)
		}
	})
}

func TestMakeSafeOfAnEmptyBench(t *testing.T) {
	inBubble(t, "IsUnconfirmed", func(t *testing.T) {
		ctx, cancel := context.WithTimeout(t.Context(), 3*time.Second)
		defer cancel()
		r := MakeSafe(ctx, NewClock(1), Bench{}, SafeSpec{})
		if r.Confirmed || !errors.Is(r.Err, ErrAbsent) {
			t.Errorf("%+v", r)
		}
	})
	inBubble(t, "OfASupplyAlone", func(t *testing.T) {
		n := energised()
		r := MakeSafe(t.Context(), NewClock(1), Bench{Supply: n, Pot: NoPot, Cutoff: NoCutoff, Scope: NoScope}, SafeSpec{})
		if !r.Confirmed || !r.Parked || r.Err != nil {
			t.Errorf("%+v", r)
		}
	})
}

func TestAbsentNamesTheKey(t *testing.T) {
	ctx := t.Context()
	for name, call := range map[string]func() error{
		"[supply]":                func() error { return NoSupply.SetOutput(ctx, true) },
		"[scope]":                 func() error { _, err := NoScope.Capture(ctx); return err },
		"[pot]":                   func() error { return NoPot.SetCode(ctx, 1) },
		"[cutoff]":                func() error { return NoCutoff.Feed(ctx) },
		`reads = "motor_current"`: func() error { _, err := NoMeter("motor_current").Read(ctx); return err },
	} {
		err := call()
		if !errors.Is(err, ErrAbsent) || !strings.Contains(err.Error(), name) {
			t.Errorf("%v does not name %s", err, name)
		}
	}
}
