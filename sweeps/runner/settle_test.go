package runner

import (
	"math"
	"strings"
	"testing"

	"nightbench/sweeps"
)

// falling is a value that comes down to 5 V with a time constant of 1 s, read ten times a second.
func falling(from, until float64) *settling {
	s := &settling{}
	for t := 0.0; t <= until; t += 0.1 {
		s.add(t, 5+from*math.Exp(-t))
	}
	return s
}

// The rule (BENCH-PRACTICE, "Settling"): over the last max(5 readings, 3 τ)
// |slope| × window below steady, standard error below a third of it.
func TestSteady(t *testing.T) {
	if falling(2, 2).steady(3, 0.01, 0) {
		t.Error("steady after two time constants, still 5 % away")
	}
	if !falling(2, 8).steady(3, 0.01, 0) {
		t.Error("not steady after eight time constants: the last three moved by 0.2 %")
	}
	few := falling(0, 0.35)
	if few.steady(0, 0.01, 0) {
		t.Errorf("steady on %d readings; five are the least", len(few.at))
	}
}

// A line of known slope: drift is slope × window, to rounding; what is left about it is nothing.
func TestDriftOfALine(t *testing.T) {
	s := &settling{}
	for i := range 11 {
		s.add(float64(i), 10+0.02*float64(i))
	}
	drift, se, mean, ok := s.drift(10)
	if !ok || math.Abs(drift-0.2) > 1e-12 || se > 1e-7 || math.Abs(mean-10.1) > 1e-12 {
		t.Errorf("drift %g, se %g, mean %g, %v; want 0.2, 0, 10.1", drift, se, mean, ok)
	}
	if drift, _, _, _ := s.drift(4); math.Abs(drift-0.08) > 1e-12 {
		t.Errorf("drift over the last 4 s: %g, want 0.08", drift)
	}
	if drift, _, _, _ := s.drift(1); math.Abs(drift-0.08) > 1e-12 {
		t.Errorf("drift over five readings at the least: %g, want 0.08", drift)
	}
}

// Scatter without drift is not steady while its standard error is above a third.
func TestScatterIsNotSteady(t *testing.T) {
	s := &settling{}
	for i := range 5 {
		s.add(float64(i), 5+[]float64{0.05, -0.05, 0, -0.05, 0.05}[i]) // no slope; s = 0.05
	}
	if s.steady(0, 0.01, 0) { // 0.0258 against 0.05/3
		t.Error("steady in spite of its scatter")
	}
	if !s.steady(0, 0.05, 0) {
		t.Error("not steady though the scatter is far below what is asked")
	}
	if !s.steady(0, 1e-9, 1) {
		t.Error("a change below what the meter resolves is none")
	}
}

// Readings taken at one instant have no slope: never steady, never a division by zero.
func TestSettlingAtOneInstant(t *testing.T) {
	s := &settling{}
	for range 6 {
		s.add(1, 5)
	}
	if s.steady(1, 0.01, 1) {
		t.Error("steady at one instant")
	}
}

func TestUnsettledWords(t *testing.T) {
	rule := sweeps.Settle{Watch: sweeps.AverageVoltage, Steady: 0.01, AtMost: 20e9}
	f := falling(2, 1).flag(rule, 3)
	for _, want := range []string{"not settled after 20s", "average_voltage", "1 % is asked"} {
		if f.Name != "unsettled" || !strings.Contains(f.Words, want) {
			t.Errorf("%+v lacks %q", f, want)
		}
	}
	if f := (&settling{}).flag(rule, 3); !strings.Contains(f.Words, "gave no value") {
		t.Errorf("%+v", f)
	}
}
