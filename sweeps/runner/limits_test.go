package runner

import (
	"context"
	"errors"
	"fmt"
	"math"
	"strings"
	"sync"
	"testing"
	"time"

	"nightbench/sweeps"
)

func causeOf(r *Runner) error { return context.Cause(r.life) }

// A limit is passed for as long as every reading since has been above it.
func TestLimits(t *testing.T) {
	const ms = time.Millisecond
	type seen struct {
		at       time.Duration
		value    float64
		aperture time.Duration
		trips    bool
	}
	for name, readings := range map[string][]seen{
		"trips when it has lasted":            {{0, 0.9, 0, false}, {100 * ms, 0.9, 0, false}, {200 * ms, 0.9, 0, true}},
		"a dip starts it anew":                {{0, 0.9, 0, false}, {150 * ms, 0.7, 0, false}, {250 * ms, 0.9, 0, false}, {449 * ms, 0.9, 0, false}, {450 * ms, 0.9, 0, true}},
		"at the limit is not above":           {{0, 0.8, 0, false}, {time.Second, 0.8, 0, false}},
		"the sign does not matter":            {{0, -0.9, 0, false}, {200 * ms, -0.9, 0, true}},
		"a reading counts from its beginning": {{100 * ms, 0.9, 100 * ms, false}, {200 * ms, 0.9, 100 * ms, true}},
		"one that lasted trips by itself":     {{time.Second, 0.9, 200 * ms, true}},
		"no number is above nothing":          {{0, 0.9, 0, false}, {100 * ms, math.NaN(), 0, false}, {200 * ms, 0.9, 0, false}},
	} {
		l := newLimits([]sweeps.Trip{{Quantity: sweeps.SupplyCurrent, Limit: 5}, {Quantity: sweeps.MotorCurrent, Limit: 0.8, For: 200 * ms}})
		for _, s := range readings {
			got := l.observe(sweeps.MotorCurrent, s.value, "raw", s.at, s.aperture)
			if (got != nil) != s.trips {
				t.Errorf("%s: at %s: %v", name, s.at, got)
			}
			if got != nil && (got.Raw != "raw" || !strings.Contains(got.Reason, "motor_current")) {
				t.Errorf("%s: %+v", name, got)
			}
		}
	}
}

func TestLimitWithoutDuration(t *testing.T) {
	l := newLimits([]sweeps.Trip{{Quantity: sweeps.SupplyVoltage, Limit: 13}})
	if l.observe(sweeps.AverageVoltage, 20, "", 0, 0) != nil {
		t.Error("tripped on another quantity")
	}
	if l.observe(sweeps.SupplyVoltage, 13.1, "", 0, 0) == nil {
		t.Error("no trip at the first reading above")
	}
}

// While something is above, the next look comes when it would trip.
func TestPending(t *testing.T) {
	l := newLimits([]sweeps.Trip{{Quantity: sweeps.MotorCurrent, Limit: 1, For: 300 * time.Millisecond}})
	if _, any := l.pending(0); any {
		t.Error("pending before anything was seen")
	}
	l.observe(sweeps.MotorCurrent, 2, "", time.Second, 0)
	if d, any := l.pending(1100 * time.Millisecond); !any || d != 200*time.Millisecond {
		t.Errorf("%s, %v", d, any)
	}
	if d, _ := l.pending(time.Minute); d != 0 {
		t.Errorf("overdue by %s", d)
	}
	l.observe(sweeps.MotorCurrent, 0, "", 2*time.Second, 0)
	if _, any := l.pending(2 * time.Second); any {
		t.Error("still pending after it fell")
	}
}

// A strain trips only when it has lasted in time and in looks, without a break.
func TestStrain(t *testing.T) {
	var s strain
	var mu sync.Mutex
	for i, c := range []struct {
		at   float64
		yes  bool
		want bool
	}{{0, true, false}, {10, true, false}, {20, false, false}, {30, true, false}, {31, true, false}, {32.9, true, false}, {33, true, true}} {
		if got := s.limiting.see(seconds(c.at), c.yes, &mu); got != c.want {
			t.Errorf("look %d: %v", i, got)
		}
		if s.any() != c.yes {
			t.Errorf("look %d: waited out: %v", i, s.any())
		}
	}
}

// How each cause ends a run.
func TestEnding(t *testing.T) {
	for _, c := range []struct {
		cause error
		state sweeps.State
		words string
	}{
		{nil, sweeps.Done, "all setpoints measured"},
		{errDone, sweeps.Done, "all setpoints measured"},
		{&Trip{Reason: "too much"}, sweeps.Tripped, "too much"},
		{fmt.Errorf("measure: %w", &Trip{Reason: "too much"}), sweeps.Tripped, "too much"},
		{&Stop{Reason: "enough"}, sweeps.Stopped, "enough"},
		{context.Canceled, sweeps.Stopped, "the daemon was told to end"},
		{&journalFailed{errors.New("disk full")}, sweeps.Failed, "the journal can't be written: disk full"},
		{&panicked{where: "scope", value: "nil map"}, sweeps.Failed, "internal fault in the scope: nil map"},
		{errors.New("meter lost"), sweeps.Failed, "meter lost"},
		{context.DeadlineExceeded, sweeps.Failed, "context deadline exceeded"},
	} {
		if got := ending(c.cause); got.State != c.state || got.Reason != c.words {
			t.Errorf("%v: %s, %q", c.cause, got.State, got.Reason)
		}
	}
}
