package driver

import (
	"context"
	"math"
	"slices"
	"strings"
	"testing"
	"testing/synctest"
	"time"

	"nightbench/instruments"
	"nightbench/instruments/dialect"
	"nightbench/instruments/driver/drivertest"
	"nightbench/instruments/link"
	"nightbench/instruments/scpi"
	"nightbench/instruments/si"
)

func openSupply(t *testing.T, f *drivertest.Supply) (*Supply, []string) {
	t.Helper()
	conn, d := connect(t, &f.Listener, dialect.RoleSupply, "standard-supply")
	s, notes, err := OpenSupply(t.Context(), conn, d, SupplyOptions{Options: options("supply"), MaxVoltage: si.Volts(13), MaxCurrent: si.Amperes(1)})
	must(t, err)
	return s, notes
}

func TestSupply(t *testing.T) {
	inBubble(t, "FeedsTheBoard", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, notes := openSupply(t, f)
		if len(notes) > 0 || s.FoundOn() {
			t.Errorf("noticed %v about a supply that was off", notes)
		}
		must(t, s.Protect(t.Context(), si.Volts(14)))
		must(t, s.SetCurrentLimit(t.Context(), si.Amperes(0.5)))
		must(t, s.SetVoltage(t.Context(), si.Volts(9)))
		must(t, s.SetOutput(t.Context(), true))
		st, err := s.State(t.Context())
		must(t, err)
		if !st.Output || st.Limiting || st.Tripped || st.Voltage.Value != 9 || math.Abs(st.Current.Value-0.09) > 1e-9 {
			t.Errorf("state %+v", st)
		}
		// Keysight E364xA, page 192: readback 0.05 % + 5 mV and 0.15 % + 5 mA.
		if got := st.Voltage.Accuracy.Limit(9, 0); math.Abs(got-(0.0005*9+0.005)) > 1e-12 {
			t.Errorf("limit of error of the voltage %g V", got)
		}
		if got := st.Current.Accuracy.Limit(0.09, 0); math.Abs(got-(0.0015*0.09+0.005)) > 1e-12 {
			t.Errorf("limit of error of the current %g A", got)
		}
		if st.Voltage.Raw != "+9.00000000E+00" || st.Voltage.Unit != si.Volt {
			t.Errorf("sample %+v", st.Voltage)
		}
		must(t, s.SetOutput(t.Context(), false))
		if f.On() {
			t.Error("still on")
		}
	})
	inBubble(t, "SaysWhenItLimits", func(t *testing.T) {
		f := drivertest.NewSupply()
		f.Load = 5
		s, _ := openSupply(t, f)
		must(t, s.SetCurrentLimit(t.Context(), si.Amperes(0.1)))
		must(t, s.SetVoltage(t.Context(), si.Volts(9)))
		must(t, s.SetOutput(t.Context(), true))
		st, err := s.State(t.Context())
		must(t, err)
		if !st.Limiting || math.Abs(st.Voltage.Value-0.5) > 1e-9 {
			t.Errorf("state %+v; 0.1 A through 5 Ω is 0.5 V in constant current", st)
		}
	})
	inBubble(t, "FoundOnIsSaidAndLeft", func(t *testing.T) {
		f := drivertest.NewSupply()
		f.Leave(9, true)
		s, notes := openSupply(t, f)
		if !s.FoundOn() || !slices.Contains(notes, "its output was on already") {
			t.Errorf("notes %v", notes)
		}
		if !f.On() {
			t.Error("opening switched it")
		}
	})
	inBubble(t, "OldErrorsAreNotOurs", func(t *testing.T) {
		f := drivertest.NewSupply()
		f.Device.Push(scpi.NewFault(scpi.UndefinedHeader, "FOO"))
		_, notes := openSupply(t, f)
		if len(notes) != 1 || !strings.Contains(notes[0], "-113") {
			t.Errorf("notes %v", notes)
		}
	})
}

func TestSupplyRefuses(t *testing.T) {
	inBubble(t, "AboveTheBenchsLimit", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		wants(t, s.SetVoltage(t.Context(), si.Volts(13.1)), ErrLimit, "max_voltage", "13")
		wants(t, s.SetCurrentLimit(t.Context(), si.Amperes(1.01)), ErrLimit, "max_current")
		wants(t, s.SetVoltage(t.Context(), si.Volts(-1)), ErrLimit)
		wants(t, s.SetVoltage(t.Context(), si.Volts(math.NaN())), ErrLimit)
		if n := len(slices.DeleteFunc(f.Received(), func(m string) bool { return !strings.HasPrefix(m, "VOLT ") && !strings.HasPrefix(m, "CURR ") })); n > 0 {
			t.Errorf("sent %v", f.Received())
		}
	})
	inBubble(t, "WhatReadsBackOtherwise", func(t *testing.T) {
		f := drivertest.NewSupply()
		f.Fate = func(m string) drivertest.Fate {
			if m == "VOLT?" {
				return drivertest.Fate{Reply: "4.9000\n"}
			}
			return drivertest.Fate{}
		}
		s, _ := openSupply(t, f)
		wants(t, s.SetVoltage(t.Context(), si.Volts(5)), ErrRefused, "supply", "VOLT 5", "4.9", "read back")
	})
	inBubble(t, "WithTheInstrumentsOwnReason", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		wants(t, s.Protect(t.Context(), si.Volts(40)), ErrRefused, "-222", "VOLT:PROT 40")
	})
	inBubble(t, "OutputAfterATrip", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		f.Trip()
		err := s.SetOutput(t.Context(), true)
		wants(t, err, ErrTripped, "output off", "-221", "clearing")
		if f.Count("VOLT:PROT:CLE") > 0 {
			t.Error("the latch was cleared by itself")
		}
		st, err := s.State(t.Context())
		must(t, err)
		if !st.Tripped {
			t.Error("the trip is not in the state")
		}
	})
	inBubble(t, "OutputThatStaysOn", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		f.Leave(9, true)
		f.Refuses = true
		wants(t, s.SetOutput(t.Context(), false), ErrRefused, "OUTP OFF", "output on")
	})
}

func TestSupplyOff(t *testing.T) {
	inBubble(t, "IsSentInTheMiddleOfAnExchange", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		must(t, s.SetOutput(t.Context(), true))
		f.Fate = func(m string) drivertest.Fate {
			if m == "MEAS:VOLT?" {
				return drivertest.Fate{Delay: time.Second}
			}
			return drivertest.Fate{}
		}
		asked := make(chan error)
		go func() { _, err := s.State(t.Context()); asked <- err }()
		time.Sleep(500 * time.Millisecond)
		began := time.Now()
		must(t, s.Off(t.Context()))
		if took := time.Since(began); took > 10*time.Millisecond {
			t.Errorf("off waited %v", took)
		}
		if err := <-asked; err == nil {
			t.Error("a reply with a command in between was taken for good")
		}
		time.Sleep(time.Second)
		synctest.Wait()
		if f.On() {
			t.Error("still on")
		}
		f.Fate = nil
		st, err := s.State(t.Context())
		must(t, err)
		if st.Output {
			t.Error("state says on")
		}
	})
	inBubble(t, "IsSentAgainOnANewLink", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		must(t, s.SetOutput(t.Context(), true))
		f.Unplug()
		time.Sleep(time.Millisecond)
		must(t, s.Off(t.Context()))
		time.Sleep(time.Millisecond)
		if f.On() {
			t.Error("still on")
		}
	})
	inBubble(t, "FailsWhenNobodyIsThere", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		f.Unplug()
		f.Refuse = link.ErrMissing
		time.Sleep(time.Millisecond)
		wants(t, s.Off(t.Context()), link.ErrMissing, "supply", "OUTP OFF")
	})
}

func TestSupplyLateReplyIsNeverUsed(t *testing.T) {
	inBubble(t, "State", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		must(t, s.SetVoltage(t.Context(), si.Volts(5)))
		must(t, s.SetOutput(t.Context(), true))
		late := true
		f.Fate = func(m string) drivertest.Fate {
			if m == "MEAS:VOLT?" && late {
				late = false
				return drivertest.Fate{Delay: 3 * time.Second, Reply: "+1.11111111E+01\n"}
			}
			return drivertest.Fate{}
		}
		_, err := s.State(t.Context())
		wants(t, err, link.ErrTimeout, "supply", "MEAS:VOLT?", "is it on")
		st, err := s.State(t.Context())
		must(t, err)
		if st.Voltage.Value != 5 || st.Current.Value != 0.05 {
			t.Errorf("after a late reply: %v and %v", st.Voltage, st.Current)
		}
	})
}

func TestSupplyObeysItsContext(t *testing.T) {
	inBubble(t, "State", func(t *testing.T) {
		f := drivertest.NewSupply()
		s, _ := openSupply(t, f)
		f.Fate = func(string) drivertest.Fate { return drivertest.Fate{Drop: true} }
		ctx, cancel := context.WithTimeout(t.Context(), 300*time.Millisecond)
		defer cancel()
		began := time.Now()
		if _, err := s.State(ctx); err == nil {
			t.Error("a silent instrument has a state")
		}
		if took := time.Since(began); took > 400*time.Millisecond {
			t.Errorf("took %v", took)
		}
	})
}

func TestSupplyIdentify(t *testing.T) {
	inBubble(t, "Fields", func(t *testing.T) {
		s, _ := openSupply(t, drivertest.NewSupply())
		id, err := s.Identify(t.Context())
		must(t, err)
		if id != (instruments.Identity{Maker: "Nightbench", Model: "practice-supply", Serial: "T1", Firmware: "1.0", Raw: "Nightbench,practice-supply,T1,1.0"}) {
			t.Errorf("%+v", id)
		}
	})
}
